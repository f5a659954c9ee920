"""One sentence a curve, with class, quantity, value, limit, clause and margin; and the numbers behind it."""

from __future__ import annotations

from typing import Any

import pytest
from reference.cases import random_case

from cant.explaining import explain
from cant.limit_sets import load
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line
from cant.units import INCH_MM, MILE_KM

C = 11.8
ROWS = (
    LimitRow(quantity="cant", normal=150, unit="mm", clause="D1"),
    LimitRow(quantity="cant deficiency", normal=75, exceptional=90, unit="mm", clause="I1"),
    LimitRow(quantity="cant excess", normal=50, exceptional=60, unit="mm", clause="E1"),
)
FAST = TrainClass(name="Fast", category="passenger", speed_kmh=90, trains_per_day=20, mass_t=400)
SLOW = TrainClass(name="Slow", category="freight", speed_kmh=45, trains_per_day=30, mass_t=1500)


def plan(radius: float, rows: tuple[LimitRow, ...] = ROWS, settings: Any = None, **row: Any) -> Plan:
    curve = {"curve": "1", "radius_m": radius, "hand": "L", "transition_in_m": 90.0, "transition_out_m": 90.0}
    made = Settings(equilibrium_constant=C, **(settings or {}))
    return plan_line(
        CurveList.from_rows([{**curve, **row}]), Traffic.of([FAST, SLOW]), LimitSet(name="x", rows=rows), made
    )


def reason(*args: Any, **more: Any) -> str:
    return explain(plan(*args, **more)).reason(0)


def test_the_reason_of_a_curve_in_a_narrow_interval() -> None:
    """R 600: 11.8 x 8100 / 600 - 75 = 84.3; 11.8 x 2025 / 600 + 50 = 89.8."""
    said = reason(600, cant_mm=70.0)
    assert said.startswith("85 mm (today 70 mm): ")
    assert "84.3 mm (cant deficiency of Fast at most 75.0 mm, I1)" in said
    assert "closest to its limit is Fast, cant deficiency 74.3 mm, 0.7 mm under 75.0 mm (99 %, I1)" in said
    assert said.endswith(".")
    assert said.count("84.3") == 1


def test_the_numbers_behind_it() -> None:
    numbers = explain(plan(600)).because(0)
    assert numbers is not None
    assert numbers["room_mm"] == pytest.approx(89.825 - 84.3)
    assert [b["quantity"] for b in numbers["lower"]] == ["cant deficiency", "cant deficiency"]
    assert [b["class"] for b in numbers["lower"]] == ["Fast", "Slow"], "what would bind next comes second"
    assert [b["quantity"] for b in numbers["upper"]] == ["cant excess", "cant"]
    assert numbers["upper"][1]["mm"] == 150
    nearest = numbers["closest_to_its_limit"]
    assert nearest["class"] == "Fast"
    assert nearest["share"] == pytest.approx(74.3 / 75)
    assert nearest["margin"] == pytest.approx(0.7)


def test_where_the_target_is_within_reach_it_says_so() -> None:
    said = reason(1500)
    target = C * (20 * 400 * 8100 + 30 * 1500 * 2025) / (20 * 400 + 30 * 1500) / 1500
    assert f"the multiple of 5 mm nearest to the {target:.1f} mm of the rms speed" in said


def test_where_nothing_fits_both_limits_are_named_with_the_shortfall() -> None:
    """R 500: 116.16 needed, 97.79 allowed: 18.4 short; the mix needs 11.8 (8100 - 2025) / 125 = 573 m."""
    said = reason(500)
    assert "at least 116.2 mm (cant deficiency of Fast at most 75.0 mm, I1) is needed" in said
    assert "at most 97.8 mm (cant excess of Slow at most 50.0 mm, E1) allowed, 18.4 mm short" in said
    assert "no cant at all serves Fast and Slow together below a radius of 573 m" in said
    assert "restricted: Fast to 80 km/h instead of 90 km/h (cant deficiency, I1)" in said, (
        "95 mm permit sqrt(170 x 500 / 11.8) = 84.9"
    )
    assert "a day lost over the curve alone" in said


def test_an_exceptional_value_is_named_with_value_and_limit() -> None:
    said = reason(520, settings={"tiers": ("normal", "exceptional")})
    assert "needs approval: " in said
    assert "against 50.0 mm, E1" in said or "against 75.0 mm, I1" in said


def test_a_cant_fixed_that_cannot_be_kept() -> None:
    said = reason(600, cant_mm=120.0, cant_fixed=True)
    assert "the cant bound to this site breaks cant excess of Slow 80.2 mm against 50.0 mm, E1" in said


def test_every_reason_of_random_lines_is_one_sentence_with_its_cant() -> None:
    for seed in range(60):
        made = plan_line(*random_case(seed))
        words = explain(made)
        for index in made.assessed.tolist():
            said = words.reason(index)
            assert said.endswith(".")
            assert "nan" not in said
            assert "None" not in said
            if made.status[index] != "not assessed":
                assert said[0].isdigit()
                assert len(said) < 1200
            else:
                assert words.because(index) is None


# -- United States customary units through and through ------------------------------------------------------


def us_plan() -> Plan:
    limits = load("us-49-cfr-213")
    settings = Settings(units="us").with_standard(limits.rail_spacing_mm, limits.equilibrium_constant)
    trains = [
        TrainClass(
            name="Passenger", category="passenger", speed_kmh=79 * MILE_KM, trains_per_day=12, mass_t=500
        ),
        TrainClass(
            name="Freight", category="freight", speed_kmh=50 * MILE_KM, trains_per_day=20, mass_t=6000
        ),
    ]
    curve = {"curve": "1", "radius_m": 5729.65 * 0.3048 / 2, "hand": "L", "cant_mm": 2 * INCH_MM}
    return plan_line(CurveList.from_rows([curve]), Traffic.of(trains), limits, settings)


def test_a_plan_in_inches_has_its_grid_and_words_in_them() -> None:
    """49 CFR 213.57: V = sqrt((Ea + Eu) / (0.0007 D)); 2 degrees, 79 mph: 8.74 in, less 3 in: 5.74 in."""
    made = us_plan()
    words = explain(made)
    said = words.reason(0)
    assert " in" in said
    assert "km/h" not in said
    assert "mm" not in said
    numbers = words.because(0)
    assert numbers is not None
    assert numbers["lower"][0]["mm"] / INCH_MM == pytest.approx(0.0007 * 79**2 * 2 - 3, abs=0.01)
    cant_in = made.proposed_mm[0] / INCH_MM
    step_in = made.outcome.grid.step_mm[0] / INCH_MM
    assert cant_in / step_in == pytest.approx(round(cant_in / step_in), abs=1e-9)


def test_options_in_us_units_are_round_in_them() -> None:
    made = us_plan()
    limits = made.limits.model_copy(
        update={"rows": (*made.limits.rows, LimitRow(quantity="cant excess", normal=1, unit="in"))}
    )
    tight = plan_line(made.curves, made.traffic, limits, made.settings)
    assert tight.status == ["restrict"]
    found = {o["kind"]: o for o in explain(tight).options(0)}
    for option in found.values():
        assert "mm" not in option["text"]
        assert "km/h" not in option["text"]
    speeds = [f["to_kmh"] / MILE_KM for f in found["lower speed"]["facts"]["speeds"]]
    step = 5 if tight.limits.of("speed step") else 5 / MILE_KM
    assert [v / step for v in speeds] == pytest.approx([round(v / step) for v in speeds])
    if "flatter curve" in found:
        assert "degrees" in found["flatter curve"]["text"]
        feet = found["flatter curve"]["facts"]["to_m"] / 0.3048
        assert feet / 50 == pytest.approx(round(feet / 50))
