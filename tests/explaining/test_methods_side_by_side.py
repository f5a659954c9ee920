"""The methods side by side: each entry is the plan with that method, asked for one curve or for all."""

from __future__ import annotations

import pytest
from reference.cases import random_case

from cant.explaining import explain
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import METHODS, Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line

C = 11.8
TRAFFIC = Traffic.of(
    [
        TrainClass(name="Fast", category="passenger", speed_kmh=120, trains_per_day=20, mass_t=400),
        TrainClass(name="Slow", category="freight", speed_kmh=70, trains_per_day=30, mass_t=1500),
    ]
)
LIMITS = LimitSet(
    name="x",
    rows=(
        LimitRow(quantity="cant", normal=150, unit="mm"),
        LimitRow(quantity="cant deficiency", normal=130, unit="mm"),
        LimitRow(quantity="cant excess", normal=110, unit="mm"),
    ),
)


def plan(radii: list[float], **settings: object) -> Plan:
    curves = CurveList.from_rows(
        [{"curve": str(i), "row": i + 2, "radius_m": r, "hand": "L"} for i, r in enumerate(radii)]
    )
    return plan_line(
        curves, TRAFFIC, LIMITS, Settings.model_validate({"equilibrium_constant": C, **settings})
    )


def test_what_each_method_does_to_each_class() -> None:
    words = explain(plan([1500.0]))
    entries = {entry["method"]: entry for entry in words.methods(0)}
    assert list(entries) == list(METHODS)
    assert [m for m, e in entries.items() if e["chosen"]] == ["rms"]
    for entry in entries.values():
        for train in TRAFFIC.rows:
            unbalance = C * (train.speed_kmh or 0) ** 2 / 1500 - entry["cant_mm"]
            assert entry["unbalance_mm"][train.name] == pytest.approx(unbalance, abs=0.006)
            acceleration = unbalance * 9.81 / (C * 12.96 * 9.81)
            assert entry["unbalanced_acceleration_ms2"][train.name] == pytest.approx(acceleration, abs=1e-4)
    assert entries["least"]["cant_mm"] == 0
    assert entries["least"]["tonnes_in_excess_a_day"] == 0
    assert entries["fraction"]["tonnes_in_excess_a_day"] == 30 * 1500
    assert "from 0 mm (least)" in words.methods_verdict(0)
    assert words.methods_verdict(0).endswith("a real choice between them.")


def test_where_the_limits_leave_one_cant_all_methods_agree() -> None:
    """R 720: 236 - 130 = 106 at least; 110 at most by the site."""
    curves = CurveList.from_rows([{"curve": "1", "radius_m": 720.0, "hand": "L", "cant_at_most_mm": 110.0}])
    words = explain(plan_line(curves, TRAFFIC, LIMITS, Settings(equilibrium_constant=C)))
    assert words.methods_verdict(0) == "All methods give 110 mm."


def test_within_a_step_they_agree() -> None:
    curves = CurveList.from_rows([{"curve": "1", "radius_m": 720.0, "hand": "L", "cant_at_most_mm": 115.0}])
    words = explain(plan_line(curves, TRAFFIC, LIMITS, Settings(equilibrium_constant=C)))
    assert words.methods_verdict(0) == "All methods agree within a step: 110 mm to 115 mm."


def test_few_curves_and_the_whole_line_give_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    made = plan([600.0 + 37 * i for i in range(40)])
    whole, apart = explain(made), explain(made)
    whole.prepare(list(range(40)))
    monkeypatch.setattr("cant.explaining.methods.SHORT_LINE", 0)
    apart.prepare([0, 7, 39])
    assert not apart._methods._whole
    for index in (0, 7, 39, 12):
        assert whole.methods(index) == apart.methods(index)


@pytest.mark.parametrize("seed", [3, 11, 28])
def test_each_entry_is_the_plan_with_that_method(seed: int) -> None:
    case = random_case(seed)
    made = plan_line(*case)
    words = explain(made)
    for method in METHODS:
        other = plan_line(
            case.curves, case.traffic, case.limits, case.settings.model_copy(update={"method": method})
        )
        for index in made.assessed.tolist():
            entries = words.methods(index)
            if made.status[index] == "not assessed":
                assert entries == []
                continue
            entry = next(e for e in entries if e["method"] == method)
            assert entry["cant_mm"] == pytest.approx(other.proposed_mm[index])
            record = other.record(index)
            assert entry["target_mm"] == pytest.approx(record["target_cant_mm"])
            site = [p for p in record["limits_passed"] if not p["quantity"].startswith("cant at")]
            places = {(p["place"], p["quantity"]) for p in site if p["place"] != "between"}
            between = [p for p in site if p["place"] == "between"]
            assert entry["limits_passed"] == len(places) + len(between)
