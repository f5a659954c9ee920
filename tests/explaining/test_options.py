"""Every option, planned as it stands, does what it says: on random lines, and against closed forms."""

from __future__ import annotations

import json
import math
from typing import Any

import pytest
from reference.cases import random_case

from cant.errors import InputError
from cant.explaining import Decision, Inputs, apply, explain
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.plan import STATUSES
from cant.model.reading import Reading
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line
from cant.planning.neighbours import chains_of
from cant.service import make_plan, plan_option

C = 11.8
HELPED = ("restrict", "not compliant", "exceptional")


def replanned(plan: Plan, option: dict[str, Any]) -> Plan:
    """Plan the whole line with an option taken, its decision having been through JSON."""
    decision = Decision.model_validate(json.loads(json.dumps(option["decision"])))
    outcome = plan.outcome
    inputs = apply(
        decision,
        Inputs(plan.curves, plan.traffic, plan.limits, plan.settings, tuple(outcome.turnouts)),
    )
    return plan_line(inputs.curves, inputs.traffic, inputs.limits, inputs.settings, turnouts=inputs.turnouts)


def chain_of(plan: Plan, index: int) -> list[int]:
    chains = chains_of(plan.outcome.pairs)
    return next(([int(i) for i in chain] for chain in chains if index in chain), [index])


def check_option(plan: Plan, index: int, option: dict[str, Any]) -> None:
    after = replanned(plan, option)
    allowed = {"kept", "change"}
    if plan.status[index] != "exceptional" and (
        option["kind"] == "exceptional value" or plan.settings.allows_exceptional
    ):
        allowed.add("exceptional")
    assert after.status[index] in allowed, option["text"]
    assert after.status[index] == option["status"]
    assert after.proposed_mm[index] == pytest.approx(option["cant_mm"])
    for other in range(len(plan.curves)):
        if other == index:
            continue
        if not plan.status[other]:
            continue
        # A curve that moves takes room from its neighbours: they may change, and must not become worse.
        touched = other in chain_of(plan, index) or "flatter" in option["kind"] or "longer" in option["kind"]
        if touched:
            assert STATUSES.index(after.status[other]) >= STATUSES.index(plan.status[other]), option["text"]
        else:
            assert after.status[other] == plan.status[other], option["text"]


@pytest.mark.parametrize("first", range(0, 90, 15))
def test_options_of_random_lines_really_fit(first: int) -> None:
    offered = needed = 0
    for seed in range(first, first + 15):
        plan = plan_line(*random_case(seed))
        words = explain(plan)
        words.prepare([int(i) for i in plan.assessed])
        for index in plan.assessed.tolist():
            options = words.options(index)
            if plan.status[index] not in HELPED:
                assert options == []
                continue
            needed += 1
            offered += bool(options)
            departures = [option["departure"] for option in options]
            assert departures == sorted(departures)
            for option in options:
                check_option(plan, index, option)
    assert offered > 0.6 * needed > 0


@pytest.mark.parametrize("seed", [5, 17, 44])
def test_options_asked_for_one_by_one_are_the_same(seed: int) -> None:
    plan = plan_line(*random_case(seed))
    together, alone = explain(plan), explain(plan)
    together.prepare([int(i) for i in plan.assessed])
    for index in plan.assessed.tolist():
        both = ([(o["text"], o["decision"]) for o in words.options(index)] for words in (together, alone))
        assert next(both) == next(both)


# -- closed forms ------------------------------------------------------------------------------------------

ROWS = (
    LimitRow(quantity="cant", normal=150, exceptional=180, unit="mm", clause="D"),
    LimitRow(quantity="cant deficiency", normal=100, exceptional=130, unit="mm", clause="I"),
    LimitRow(quantity="cant excess", normal=70, exceptional=90, unit="mm", clause="E"),
    LimitRow(quantity="cant gradient", normal=2, unit="mm/m", clause="G"),
    LimitRow(quantity="rate of change of cant", normal=50, unit="mm/s", clause="TD"),
    LimitRow(quantity="rate of change of cant deficiency", normal=50, unit="mm/s", clause="TI"),
)
FAST = TrainClass(name="Fast", category="passenger", speed_kmh=120, trains_per_day=20, mass_t=400)
SLOW = TrainClass(name="Slow", category="freight", speed_kmh=50, trains_per_day=30, mass_t=1500)


def planned(
    radius: float, trains: tuple[TrainClass, ...] = (FAST, SLOW), settings: Settings | None = None, **row: Any
) -> Plan:
    curve = {"curve": "1", "row": 2, "radius_m": radius, "hand": "L", "start_km": 1.0, "end_km": 1.4, **row}
    curves = CurveList.from_rows([{"transition_in_m": 200.0, "transition_out_m": 200.0, **curve}])
    limits = LimitSet(name="invented", rows=ROWS)
    return plan_line(curves, Traffic.of(trains), limits, settings or Settings(equilibrium_constant=C))


@pytest.fixture(autouse=True)
def every_option(monkeypatch: pytest.MonkeyPatch) -> None:
    """Show all that fits, not the best four alone."""
    monkeypatch.setattr("cant.explaining.options.MOST", 9)


def options(plan: Plan) -> dict[str, dict[str, Any]]:
    return {option["kind"]: option for option in explain(plan).options(0)}


def test_a_mix_that_no_cant_serves() -> None:
    """R 720: Fast needs 236 - 100 = 136 mm, Slow allows 40.97 + 70 = 110.97: 25.03 mm short.

    Radius of the mix: 11.8 (120^2 - 50^2) / 170 = 826.
    """
    plan = planned(720)
    assert plan.status == ["restrict"]
    numbers = explain(plan).because(0)
    assert numbers is not None
    assert numbers["shortfall_mm"] == pytest.approx(136 - (C * 2500 / 720 + 70))
    assert numbers["smallest_radius_for_mix_m"] == pytest.approx(C * (14400 - 2500) / 170)
    found = options(plan)
    assert set(found) == {
        "lower speed",
        "exceptional value",
        "flatter curve",
        "faster slow class",
        "excess waived",
    }
    lower = found["lower speed"]["facts"]["speeds"]
    # V = sqrt(R (D + I) / C) at the largest grid cant, 110: 113.2, down to 110 km/h.
    assert [(f["class"], f["to_kmh"]) for f in lower] == [("Fast", 110.0)]
    lost = 20 * 400 * (1 / 110 - 1 / 120) * 3.6
    assert found["lower speed"]["seconds_lost_a_day"] == pytest.approx(lost)
    # The first multiple of 5 m from which a multiple of 5 mm lies between the two bounds.
    wanted = found["flatter curve"]["facts"]["to_m"]
    assert wanted >= 826
    assert wanted % 5 == 0
    turn = (400 + 200) / 720
    offset = (wanted - 720) * (1 / math.cos(turn / 2) - 1)
    assert found["flatter curve"]["facts"]["offset_m"] == pytest.approx(offset)


def test_the_slow_class_faster() -> None:
    """R 800: Fast needs 212.4 - 100 mm, so 115; Slow needs D_EQ >= 45: sqrt(800 x 45 / 11.8) = 55.2."""
    found = options(planned(800))
    assert found["faster slow class"]["facts"]["speeds"] == [
        {"class": "Slow", "from_kmh": 50.0, "to_kmh": 60.0}
    ]


def test_the_excess_waived() -> None:
    """A train that stands cannot be sped up: R 600, Fast at 100 km/h needs 196.67 - 100, so 100 mm."""
    stands = SLOW.model_copy(update={"speed_kmh": 0.0, "name": "Stands"})
    plan = planned(600, (FAST.model_copy(update={"speed_kmh": 100.0}), stands))
    found = options(plan)
    assert found["excess waived"]["facts"]["excesses"] == [
        {"class": "Stands", "excess_mm": 100.0, "limit_mm": 70.0}
    ]
    assert "faster slow class" not in found
    after = replanned(plan, found["excess waived"]).record(0)
    assert after["classes"][1]["regular"] is False
    assert after["classes"][1]["excess_mm"] == after["recommended_cant_mm"] >= 100


def test_a_longer_transition_and_its_shift() -> None:
    """Only Fast: R 900 needs 188.8 - 100 = 88.8 mm; 90 mm at 2 mm/m take 45 m, at 50 mm/s and 120 km/h 60 m.

    The deficiency of 98.8 mm at 50 mm/s takes 65.9 m. Longer cants shorten the one and lengthen the other:
    of the multiples of 5 m, 65 m serve 95 mm (63.3 and 62.5 m).
    """
    plan = planned(900, (FAST,), transition_in_m=40.0, transition_out_m=200.0)
    longer = options(plan)["longer transition"]["facts"]["transitions"]
    assert [f["end"] for f in longer] == ["in"]
    assert longer[0]["from_m"] == 40.0
    assert longer[0]["to_m"] in (65.0, 70.0)
    assert longer[0]["shift_m"] == pytest.approx((longer[0]["to_m"] ** 2 - 40**2) / (24 * 900))


def test_no_more_than_four_are_shown(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("cant.explaining.options.MOST", 4)
    assert len(explain(planned(720)).options(0)) == 4


def test_no_transition_at_all_gets_one() -> None:
    rows = (*ROWS, LimitRow(quantity="abrupt change of cant deficiency", normal=50, unit="mm"))
    curve = {"curve": "1", "row": 2, "radius_m": 900.0, "hand": "L", "start_km": 1.0, "end_km": 1.4}
    curves = CurveList.from_rows([{**curve, "transition_in_m": 0.0, "transition_out_m": 200.0}])
    plan = plan_line(
        curves, Traffic.of([FAST]), LimitSet(name="x", rows=rows), Settings(equilibrium_constant=C)
    )
    assert plan.status == ["restrict"]
    assert options(plan)["longer transition"]["facts"]["transitions"][0]["from_m"] == 0.0


def test_a_site_bound_that_does_not_allow_enough() -> None:
    plan = planned(900, (FAST,), cant_at_most_mm=60.0)
    found = options(plan)
    assert found["site bound"]["facts"]["at_most_mm"][0] == 60.0
    assert found["site bound"]["facts"]["at_most_mm"][1] >= 88.8


def test_a_fixed_cant_that_breaks_the_excess_limit() -> None:
    plan = planned(1500, cant_mm=140.0, cant_fixed=True)
    assert plan.status == ["not compliant"]
    found = options(plan)
    assert found["site bound"]["facts"]["fixed_mm"] == 140.0
    assert replanned(plan, found["site bound"]).status == ["change"]


def test_one_approval_fewer_and_the_seconds_that_it_costs() -> None:
    plan = planned(720, settings=Settings(equilibrium_constant=C, tiers=("normal", "exceptional")))
    assert plan.status == ["exceptional"]
    fewer = options(plan)["fewer approvals"]
    assert fewer["seconds_lost_a_day"] == pytest.approx(20 * 400 * (1 / 110 - 1 / 120) * 3.6)
    assert fewer["approvals"] == []


def test_an_exceptional_value_names_what_is_to_be_approved() -> None:
    option = options(planned(720))["exceptional value"]
    assert option["status"] == "exceptional"
    assert {p["quantity"] for p in option["approvals"]} <= {"cant deficiency", "cant excess", "cant"}
    for approval in option["approvals"]:
        assert approval["limit"] < approval["value"] <= approval["exceptional_limit"] + 1e-3
        assert approval["clause"] in option["text"]


def test_exceptional_values_on_one_curve_leave_the_others_normal() -> None:
    rows = [
        {
            "curve": str(i),
            "row": i,
            "radius_m": 720.0,
            "hand": "L",
            "start_km": 2.0 * i,
            "end_km": 2.0 * i + 0.4,
        }
        for i in (1, 2)
    ]
    curves = CurveList.from_rows(rows)
    plan = plan_line(
        curves, Traffic.of([FAST, SLOW]), LimitSet(name="x", rows=ROWS), Settings(equilibrium_constant=C)
    )
    assert plan.status == ["restrict", "restrict"]
    option = {o["kind"]: o for o in explain(plan).options(0)}["exceptional value"]
    after = replanned(plan, option)
    assert after.status == ["exceptional", "restrict"]
    assert after.record(1)["recommended_cant_mm"] == plan.record(1)["recommended_cant_mm"]


def test_a_decision_of_another_list_is_refused() -> None:
    plan = planned(720)
    decision = Decision.model_validate(
        {"changes": [{"what": "radius", "on": {"sheet": "Elsewhere", "row": 9}, "radius_m": 900}]}
    )
    with pytest.raises(InputError, match="row 9 on sheet 'Elsewhere'"):
        apply(decision, Inputs(plan.curves, plan.traffic, plan.limits, plan.settings))


def test_applying_a_decision_leaves_the_tables_as_they_are() -> None:
    plan = planned(720)
    before = plan.curves.take([0])
    for option in explain(plan).options(0):
        replanned(plan, option)
    assert plan.curves.as_read(0) == before.as_read(0)
    assert plan.curves.class_speeds == {}
    assert plan.settings.tiers == ("normal",)


def test_the_service_plans_an_option_in_one_action() -> None:
    given = planned(720)
    reading = Reading("list.xlsx", given.curves, given.traffic, given.limits, given.settings)
    line = make_plan(reading)
    for option in line.record(0)["options"]:
        after = plan_option(line, json.loads(json.dumps(option["decision"])))
        assert after.record(0)["status"] == option["status"]
        assert after.record(0)["recommended_cant_mm"] == option["cant_mm"]
    with pytest.raises(InputError, match="no decision of a plan: changes"):
        plan_option(line, {"changes": []})


def test_two_curves_of_one_row_are_told_apart() -> None:
    """Lists with blocks side by side: one row holds a curve of either track."""
    curve = {"curve": "1", "row": 2, "radius_m": 720.0, "hand": "L", "start_km": 1.0, "end_km": 1.4}
    curves = CurveList.from_rows([{**curve, "track": "up"}, {**curve, "track": "down"}])
    plan = plan_line(
        curves, Traffic.of([FAST, SLOW]), LimitSet(name="x", rows=ROWS), Settings(equilibrium_constant=C)
    )
    option = explain(plan).options(1)[0]
    assert replanned(plan, option).status == ["restrict", option["status"]]
