"""A cant held by hand is planned as a fixed cant of that height would be, today's cant apart."""

from __future__ import annotations

import numpy as np
import pytest
from reference.cases import Case, random_case

from cant.errors import InputError
from cant.explaining import Decision, Inputs, apply, explain, read_decision
from cant.explaining.decisions import CantHeld, CurveKey
from cant.planning import Plan, plan_line


def hold(case: Case, index: int, cant_mm: float, because: str = "") -> Plan:
    curves, traffic, limits, settings = case
    change = CantHeld(on=CurveKey.of(curves, index), cant_mm=cant_mm, because=because)
    read_back = read_decision(Decision(changes=(change,)).as_json())
    changed = apply(read_back, Inputs(curves, traffic, limits, settings))
    assert curves.held_mm is None
    return plan_line(changed.curves, changed.traffic, changed.limits, changed.settings)


def fix(case: Case, index: int, cant_mm: float) -> Plan:
    curves, traffic, limits, settings = case
    changed = curves.take(np.arange(len(curves)))
    changed.cant_mm[index], changed.cant_fixed[index] = cant_mm, True
    return plan_line(changed, traffic, limits, settings)


@pytest.mark.parametrize("first", range(0, 120, 40))
def test_held_cant_is_planned_like_a_fixed_one(first: int) -> None:
    held_and_planned = 0
    for seed in range(first, first + 40):
        case = random_case(seed)
        curves = case[0]
        if case[3].keep_within_mm > 0:
            continue
        for index in range(len(curves)):
            cant = float((seed * 7 + index * 25) % 160)
            mine, fixed = hold(case, index, cant), fix(case, index, cant)
            assert np.array_equal(mine.proposed_mm, fixed.proposed_mm, equal_nan=True), seed
            if not mine.outcome.planned[index]:
                continue
            held_and_planned += 1
            assert mine.proposed_mm[index] == cant
            record, like = mine.record(index), fixed.record(index)
            assert record["classes"] == like["classes"], seed
            assert record["limits_passed"] == like["limits_passed"], seed
            assert record["cant_held"] == {"cant_mm": cant, "because": ""}
            before = plan_line(*case).record(index)
            assert record["today"] == before["today"], seed
            assert record["existing_cant_mm"] == before["existing_cant_mm"]
            if like["status"] == "kept":
                same = record["existing_cant_mm"] == cant
                assert record["status"] == ("kept" if same else "change")
            else:
                assert record["status"] == like["status"], seed
    assert held_and_planned > 25


def test_held_cant_is_never_exchanged_for_todays() -> None:
    case = next(
        c for c in map(random_case, range(500)) if np.isfinite(c[0].cant_mm[0]) and not c[0].rejected[0]
    )
    wide = case._replace(settings=case[3].model_copy(update={"keep_within_mm": 300.0}))
    today = float(case[0].cant_mm[0])
    other = today + 5.0 if today < 200 else today - 5.0
    plan = hold(wide, 0, other)
    assert plan.outcome.planned[0]
    assert plan.proposed_mm[0] == other


def test_reason_says_who_holds_it_and_why() -> None:
    case = random_case(3)
    index = int(np.flatnonzero(plan_line(*case).outcome.planned)[0])
    plan = hold(case, index, 35.0, "ballast clearance under the bridge.")
    said = explain(plan).reason(index)
    assert "held by hand (ballast clearance under the bridge)" in said
    assert said.startswith("35 mm")


@pytest.mark.parametrize("cant", [-5.0, 305.0, float("nan")])
def test_cant_off_the_scale_is_refused(cant: float) -> None:
    case = random_case(3)
    key = CurveKey.of(case[0], 0).model_dump()
    with pytest.raises(InputError, match="cant_mm"):
        read_decision({"changes": [{"what": "cant held", "on": key, "cant_mm": cant}]})
