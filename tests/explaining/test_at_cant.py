"""The chain planned around a held cant is that of the whole line planned with it."""

from __future__ import annotations

import numpy as np
import pytest
from reference.cases import random_case

from cant.explaining import CantHeld, CurveKey, Decision, Difference, Inputs, apply, chain_around, records_at
from cant.planning import plan_line


@pytest.mark.parametrize("first", range(0, 40, 20))
def test_chain_is_as_the_whole_line_planned_anew(first: int) -> None:
    for seed in range(first, first + 20):
        plan = plan_line(*random_case(seed))
        for index in map(int, np.flatnonzero(plan.outcome.planned)[:2]):
            cant = float(10 * (seed % 14))
            change = CantHeld(on=CurveKey.of(plan.curves, index), cant_mm=cant)
            changed = apply(
                Decision(changes=(change,)), Inputs(plan.curves, plan.traffic, plan.limits, plan.settings)
            )
            whole = plan_line(changed.curves, changed.traffic, changed.limits, changed.settings)
            every = np.stack([np.arange(len(plan.curves))] * 2, axis=1)
            expected = Difference(plan, whole, every)
            found = chain_around(plan, index, cant)
            assert any(one.before == index for one in found)
            for one in found:
                assert one.before is not None
                full = expected.row(one.before, one.before)
                assert (one.status, one.cant_mm, one.run_speed_kmh) == (
                    full.status,
                    full.cant_mm,
                    full.run_speed_kmh,
                ), (seed, index)
                assert one.approvals == full.approvals
            told = {one.before for one in found}
            others = {i for i, _ in expected.rows} - told
            assert not others, (seed, index, others)


def test_records_at_carry_loads_and_limits() -> None:
    plan = plan_line(*random_case(3))
    index = int(np.flatnonzero(plan.outcome.planned)[0])
    records = records_at(plan, index, [0.0, 50.0, 100.0])
    assert [record["recommended_cant_mm"] for record in records] == [0.0, 50.0, 100.0]
    for record in records:
        for entry in record["classes"]:
            assert {"wheel_load_shift", "deficiency_limit_mm", "excess_limit_mm"} <= set(entry)
