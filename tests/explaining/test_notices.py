"""Each kind of finding on a curve made for it, with its number checked by hand; none repeated row by row."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

import pytest

from cant.explaining import Explanation, explain
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.plan import Finding
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.model.turnouts import Turnout
from cant.planning import Plan, plan_line

C = 11.8
ROWS = (
    LimitRow(quantity="cant", normal=150, unit="mm", clause="D"),
    LimitRow(quantity="cant deficiency", normal=100, unit="mm", clause="I"),
    LimitRow(quantity="cant excess", normal=110, unit="mm", clause="E"),
    LimitRow(quantity="cant gradient", normal=2, unit="mm/m", clause="G"),
)
FAST = TrainClass(name="Fast", category="passenger", speed_kmh=120, trains_per_day=20, mass_t=400)
SLOW = TrainClass(name="Slow", category="freight", speed_kmh=60, trains_per_day=30, mass_t=1500)
STANDS = TrainClass(name="Stands", category="freight", speed_kmh=0, trains_per_day=1, mass_t=1500)


def plan(
    rows: Sequence[dict[str, Any]],
    trains: tuple[TrainClass, ...] = (FAST, SLOW),
    limits: tuple[LimitRow, ...] = ROWS,
    turnouts: tuple[Turnout, ...] = (),
    **settings: Any,
) -> Plan:
    given = [
        {"curve": str(i), "row": i + 2, "hand": "L", "start_km": 2.0 * i, "end_km": 2.0 * i + 0.3, **row}
        for i, row in enumerate(rows)
    ]
    made = Settings(equilibrium_constant=C, **settings)
    return plan_line(
        CurveList.from_rows(given),
        Traffic.of(trains),
        LimitSet(name="invented", rows=limits),
        made,
        turnouts=turnouts,
    )


def words(*args: Any, **more: Any) -> Explanation:
    return explain(plan(*args, **more))


def one(explanation: Explanation, code: str, curve: int = 0) -> Finding:
    found = [f for f in explanation.findings(curve) if f.code == code]
    assert len(found) == 1, [f.code for f in explanation.findings(curve)]
    return found[0]


def codes(explanation: Explanation, curve: int = 0) -> list[str]:
    return [f.code for f in explanation.findings(curve)]


def test_most_tonnes_in_excess() -> None:
    """R 1500: balance of Slow 28.3 mm; 60 mm by the site give it 31.7 mm; 45,000 of 53,000 t a day."""
    said = one(words([{"radius_m": 1500, "cant_at_least_mm": 60.0}]), "most-tonnes-in-excess")
    assert said.text.startswith("85 % of the tonnes")
    assert "Slow with 31.7 mm" in said.text
    assert "most-tonnes-in-excess" not in codes(words([{"radius_m": 1500, "cant_at_most_mm": 30.0}]))


def test_trains_that_stand_on_high_cant() -> None:
    low = words([{"radius_m": 700, "cant_at_least_mm": 100.0, "cant_at_most_mm": 105.0}], (FAST, STANDS))
    said = one(low, "stands-on-high-cant")
    assert said.text == "Stands stands on 105 mm of cant, all of it excess."
    assert said.clause == "E"


def test_cant_that_comes_down_is_told_with_the_order_of_work() -> None:
    explanation = words([{"radius_m": 1500, "cant_mm": 145.0}])
    down = 145 - explanation._plan.proposed_mm[0]
    assert (
        one(explanation, "cant-comes-down").text == f"Cant comes down by {down:.0f} mm: speed before track."
    )


def test_todays_cant_over_a_limit_with_value_and_limit() -> None:
    said = one(words([{"radius_m": 1500, "cant_mm": 145.0}]), "today-breaks-limits")
    assert said.text == ("Today's cant breaks cant excess of Slow: 116.7 mm against 110.0 mm."), (
        "145 - 11.8 x 3600 / 1500"
    )


def test_a_transition_not_known_is_not_checked_and_the_reason_says_what_it_needs() -> None:
    explanation = words([{"radius_m": 900, "transition_out_m": 80.0}], (FAST,))
    assert one(explanation, "transition-not-known").text == (
        "Transition in not known: its rates are not checked."
    )
    cant = explanation._plan.proposed_mm[0]
    assert f"the transition in, not known, needs {cant / 2:.0f} m" in explanation.reason(0)


def test_a_restricted_train_in_excess() -> None:
    """The class is slowed for the abrupt change of its deficiency and has excess at the low speed."""
    rows = (*ROWS, LimitRow(quantity="abrupt change of cant deficiency", normal=40, unit="mm", clause="A"))
    curve = {"radius_m": 600, "transition_in_m": 0.0, "transition_out_m": 0.0, "cant_at_least_mm": 100.0}
    explanation = words([curve], (FAST,), rows)
    record = explanation._plan.record(0)
    run = record["classes"][0]["run_speed_kmh"]
    assert run == 45.0, "sqrt(40 x 600 / 11.8) = 45.1"
    excess = record["recommended_cant_mm"] - C * 45**2 / 600
    said = one(explanation, "restricted-train-in-excess")
    assert said.text == f"Fast, restricted to 45 km/h, has {excess:.1f} mm excess against 110.0 mm."
    assert said.severity == "advice"


def test_movement_at_platform_and_contact_wire() -> None:
    """20 mm up: 20 x 0.915 / 1.5 = 12.2 mm at the platform; 20 x 5 / 1.5 = 66.7 mm at the wire."""
    curve = {"radius_m": 900, "cant_mm": 80.0, "cant_at_least_mm": 100.0, "cant_at_most_mm": 100.0}
    explanation = words([{**curve, "situations": ("platform",)}])
    assert one(explanation, "movement-at-platform").text.endswith(": 12 mm inwards.")
    assert one(explanation, "movement-at-contact-wire").text.endswith(": 67 mm inwards.")
    down = words([{**curve, "cant_mm": 120.0}])
    assert one(down, "movement-at-contact-wire").text.endswith(": 67 mm outwards.")
    assert "movement-at-platform" not in codes(down)


def test_different_cant_on_the_track_beside() -> None:
    rows = [
        {"radius_m": 900, "track": "1", "cant_mm": 100.0, "cant_fixed": True, "start_km": 1.0, "end_km": 1.3},
        {"radius_m": 904, "track": "2", "cant_mm": 70.0, "cant_fixed": True, "start_km": 1.2, "end_km": 1.5},
        {"radius_m": 904, "track": "2", "cant_mm": 70.0, "cant_fixed": True, "start_km": 3.2, "end_km": 3.5},
    ]
    explanation = words(rows)
    assert (
        one(explanation, "cant-differs-beside", 0).text == "30 mm different from curve 1, track 2 beside it."
    )
    assert (
        one(explanation, "cant-differs-beside", 1).text == "30 mm different from curve 0, track 1 beside it."
    )
    assert "cant-differs-beside" not in codes(explanation, 2)


def test_a_turnout_whose_branch_is_not_known() -> None:
    rows = [{"radius_m": 900, "situations": ("turnout",)}]
    assert one(words(rows), "branch-not-checked").severity == "warning"
    turnout = Turnout(name="T7", curve="0", radius_m=300, hand="R", branch_speed_kmh=25)
    known = words(rows, turnouts=(turnout,))
    assert "branch-not-checked" not in codes(known)
    lies = known._plan.proposed_mm[0]
    lacks = C * 625 * (1 / 300 - 1 / 900) + lies
    assert one(known, "branch").text == (
        f"Branch of turnout T7 at 25 km/h: on {lies:.0f} mm of negative cant, "
        f"{lacks:.1f} mm deficiency of 100.0 mm."
    )


def test_a_ceiling_without_an_allowance_is_said_once_for_the_plan() -> None:
    rows = (LimitRow(quantity="cant", normal=160, unit="mm", kind="ceiling", clause="4.2"), *ROWS[1:])
    found = [f for f in words([{"radius_m": 900}], limits=rows).plan_findings if "ceiling" in f.code]
    assert len(found) == 1
    assert "4.2" in found[0].text
    kept = words([{"radius_m": 900}], limits=rows, maintenance_allowance_mm=10.0)
    assert not [f for f in kept.plan_findings if "ceiling" in f.code]


def test_jerk_that_excess_makes() -> None:
    """120 mm over 30 m at 60 km/h: excess 101.1 mm (R 2250) grows at 101.1 x 60 / (3.6 x 30) = 56 mm/s."""
    rows = (*ROWS[:3], LimitRow(quantity="rate of change of cant deficiency", normal=50, unit="mm/s"))
    curve = {"radius_m": 2250, "cant_mm": 120.0, "cant_fixed": True, "transition_in_m": 30.0}
    said = one(words([curve], (SLOW,), rows), "jerk-of-excess")
    assert "56.2 mm/s" in said.text
    assert "50.0 mm/s" in said.text


def test_a_ramp_on_the_straight_makes_excess_there() -> None:
    curve = {"radius_m": 700, "transition_in_m": 0.0, "cant_at_least_mm": 115.0, "cant_at_most_mm": 115.0}
    said = one(words([curve], (FAST,)), "excess-on-straight")
    assert "its 115 mm are excess, over the 110.0 mm of Fast" in said.text
    assert said.clause == "E"


def test_a_curve_passed_too_quickly() -> None:
    rows = (*ROWS, LimitRow(quantity="curve length", normal=3, unit="s", clause="L"))
    said = one(
        words([{"radius_m": 900, "length_m": 50.0, "end_km": 0.05}], (FAST,), rows), "curve-short-in-time"
    )
    assert said.text == "Fast passes the arc of 50 m in 1.50 s, less than 3.00 s."
    assert said.clause == "L"


def test_a_transition_shorter_than_needed() -> None:
    explanation = words([{"radius_m": 900, "transition_in_m": 30.0}], (FAST,))
    assert explanation._plan.status == ["restrict"]
    assert explanation._plan.proposed_mm[0] == 60.0
    rows = (*ROWS, LimitRow(quantity="rate of change of cant deficiency", normal=50, unit="mm/s"))
    short = one(words([{"radius_m": 900, "transition_in_m": 30.0}], (FAST,), rows), "transition-short")
    # 188.8 - 60 = 128.8 mm at 120 km/h and 50 mm/s: 85.9 m.
    assert short.text == "Transition in: 30 m, at planned speeds 85.9 m needed."


def test_a_ramp_with_too_little_straight() -> None:
    """Two curves 60 m apart, no transition between: half of the way each; 100 mm need 50 m at 2 mm/m."""
    fixed = {
        "radius_m": 900,
        "cant_mm": 100.0,
        "cant_fixed": True,
        "transition_out_m": 0.0,
        "transition_in_m": 0.0,
    }
    rows = [{**fixed, "start_km": 1.0, "end_km": 1.3}, {**fixed, "start_km": 1.36, "end_km": 1.6}]
    said = one(words(rows, (FAST,)), "ramp-room-short")
    assert said.text == "Cant ramp on the straight out: 30 m, at planned speeds 50 m needed."


def test_findings_of_many_curves_are_summed_up_once() -> None:
    rows = [{"radius_m": 1500 + i, "cant_mm": 145.0} for i in range(40)]
    explanation = words(rows)
    summaries = [f for f in explanation.plan_findings if f.code == "cant-comes-down"]
    assert len(summaries) == 1
    assert summaries[0].text.startswith("On 40 curves cant comes down")
    assert summaries[0].severity == "warning"
    assert all(len(f.text) < 130 for i in range(40) for f in explanation.findings(i))


def test_a_gap_on_many_curves_is_summed_up_once() -> None:
    rows = (*ROWS[:3], LimitRow(quantity="cant gradient", normal=2, unit="mm/m", radius_over_m=5000))
    curves = [{"radius_m": 900 + i, "transition_in_m": 80.0} for i in range(3)]
    explanation = words(curves, limits=rows)
    found = [f for f in explanation.plan_findings if f.code == "gap-in-limits"]
    assert [f.text for f in found] == ["3 curves are not assessed because the limits have a gap there."]
    assert explanation.reason(0).startswith("The limits have a gap")


@pytest.mark.parametrize("units", ["metric", "us"])
def test_findings_keep_to_the_units_of_the_page(units: str) -> None:
    rows = [
        {"radius_m": 900, "cant_mm": 145.0, "transition_in_m": 0.0, "situations": ("platform",)},
        {"radius_m": 900, "cant_mm": 145.0, "transition_out_m": 10.0},
    ]
    explanation = words(rows, (FAST, SLOW, STANDS), units=units)
    texts = [f.text for i in (0, 1) for f in explanation.findings(i)]
    texts += [f.text for f in explanation.plan_findings] + [explanation.reason(i) for i in (0, 1)]
    texts += [o["text"] for i in (0, 1) for o in explanation.options(i)]
    foreign = r"\d (mm|km/h|m|mm/s|km|t)\b" if units == "us" else r"\d (in|mph|ft|in/s|mi)\b"
    own = r"\d (in|mph|ft)\b" if units == "us" else r"\d (mm|km/h|m)\b"
    assert not [text for text in texts if re.search(foreign, text)]
    assert len([text for text in texts if re.search(own, text)]) > 10
