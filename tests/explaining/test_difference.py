"""The difference of two plans against their records, and of two revisions of a list."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from reference.cases import random_case

from cant.explaining.decisions import CantHeld, CurveKey, Decision, Inputs, apply
from cant.explaining.difference import Difference
from cant.planning import Plan, plan_line


def held(plan: Plan, index: int, cant_mm: float) -> Plan:
    change = CantHeld(on=CurveKey.of(plan.curves, index), cant_mm=cant_mm, because="site")
    inputs = apply(Decision(changes=(change,)), Inputs(plan.curves, plan.traffic, plan.limits, plan.settings))
    return plan_line(inputs.curves, inputs.traffic, inputs.limits, inputs.settings)


def speeds(record: dict[str, Any]) -> dict[str, float]:
    return {c["class"]: c["run_speed_kmh"] for c in record["classes"]}


@pytest.mark.parametrize("seed", range(40))
def test_rows_are_the_curves_whose_records_differ(seed: int) -> None:
    before = plan_line(*random_case(seed))
    planned = np.flatnonzero(before.outcome.planned)
    if not len(planned):
        return
    after = held(before, int(planned[0]), 100.0 if before.proposed_mm[planned[0]] != 100.0 else 50.0)
    found = Difference(before, after)
    rows = {pair[0]: found.row(*pair) for pair in found.rows}
    assert found.only_before == found.only_after == []
    seconds = [0.0, 0.0]
    for index in before.assessed.tolist():
        records = (before.record(index), after.record(index))
        for side, record in enumerate(records):
            seconds[side] += record.get("running_time_lost_s") or 0.0
        same = (
            records[0]["status"] == records[1]["status"]
            and records[0]["recommended_cant_mm"] == records[1]["recommended_cant_mm"]
            and speeds(records[0]) == speeds(records[1])
        )
        if index not in rows:
            assert same, index
            continue
        row = rows[index]
        assert row.status == (records[0]["status"], records[1]["status"])
        assert row.cant_mm == tuple(r["recommended_cant_mm"] for r in records)
        mine, theirs = map(speeds, records)
        assert row.run_speed_kmh == {
            name: (mine[name], theirs[name]) for name in mine if abs(mine[name] - theirs[name]) > 1e-6
        }
    assert rows[int(planned[0])].inputs == ("cant held",)
    totals = found.totals()
    assert totals["seconds_lost_a_day"] == pytest.approx(seconds)
    assert sum(pair[1] for pair in totals["counts"].values()) == len(after.assessed)


def test_plan_does_not_differ_from_itself() -> None:
    plan = plan_line(*random_case(11))
    totals = Difference(plan, plan).totals()
    assert (totals["differ"], totals["verdict"], totals["cant"], totals["speed"]) == (0, 0, 0, 0)
    assert totals["approvals"][0] == totals["approvals"][1]


def test_revisions_pair_by_names_whatever_the_order() -> None:
    case = next(c for c in map(random_case, range(99)) if len(c[0]) >= 3 and not c[0].rejected.any())
    curves = case[0]
    names = [f"C{i}" for i in range(len(curves))]
    curves.curve[:] = names
    before = plan_line(*case)
    third = curves.take([2, 0, 1])
    third.curve[2] = "X1"
    third.radius_m[0] += 150.0
    after = plan_line(third, *case[1:])
    found = Difference(before, after)
    assert found.pairs.tolist() == [[2, 0], [0, 1]]
    assert [before.curves.curve[i] for i in found.only_before] == names[1:2] + names[3:]
    assert [after.curves.curve[i] for i in found.only_after] == ["X1"]
    assert "radius" in found.row(2, 0).inputs
    assert found.row(None, 2).status[0] is None
    assert found.row(1, None).status[1] is None
