"""A curve at any cant: the plan's own record at its cant, and that of a plan with all its chain held."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from reference.cases import Case, random_case

from cant.planning import Plan, levels_of, plan_at, plan_line

SAME = (
    "radius_m",
    "existing_cant_mm",
    "recommended_cant_mm",
    "status",
    "tier",
    "lower_mm",
    "upper_mm",
    "lower_by",
    "upper_by",
    "equilibrium_speed_kmh",
    "running_time_lost_s",
    "shares_transition_with_next",
    "classes",
    "limits_passed",
    "transitions",
    "today",
    "as_read",
)


def differ(mine: dict[str, Any], theirs: dict[str, Any], keys: tuple[str, ...] = SAME) -> list[str]:
    return [key for key in keys if mine[key] != theirs[key]]


def planned(plan: Plan) -> list[int]:
    return [int(i) for i in np.flatnonzero(plan.outcome.planned)]


def all_held(case: Case, plan: Plan, index: int, cant_mm: float) -> Plan:
    """Plan the same list with every cant held where it is, one curve's elsewhere."""
    curves = case[0].take(np.arange(len(case[0])))
    for other in planned(plan):
        curves.hold(other, float(plan.proposed_mm[other]), "")
    curves.hold(index, cant_mm, "")
    settings = case[3].model_copy(update={"keep_within_mm": 0.0})
    return plan_line(curves, case[1], case[2], settings)


@pytest.mark.parametrize("first", range(0, 60, 20))
def test_at_its_own_cant_a_curve_is_as_the_plan_has_it(first: int) -> None:
    for seed in range(first, first + 20):
        plan = plan_line(*random_case(seed))
        for index in planned(plan):
            copies, at = plan_at(plan, index, [40.0, plan.proposed_mm[index], 0.0])
            assert differ(copies.record(int(at[1])), plan.record(index)) == [], (seed, index)


@pytest.mark.parametrize("first", range(0, 60, 20))
def test_at_another_cant_it_is_as_a_plan_with_all_cants_held(first: int) -> None:
    """Statuses are left out: where two held cants clash over a transition a plan blames both."""
    keys = tuple(key for key in SAME if key not in ("status",))
    for seed in range(first, first + 20):
        case = random_case(seed)
        plan = plan_line(*case)
        for index in planned(plan)[:2]:
            levels = levels_of(plan, index)
            cants = levels[(seed % 5) :: 11]
            copies, at = plan_at(plan, index, cants)
            for cant, position in zip(cants, at, strict=True):
                mine = copies.record(int(position))
                held = all_held(case, plan, index, float(cant)).record(index)
                assert differ(mine, held, keys) == [], (seed, index, cant)
                if held["status"] != "not compliant":
                    assert mine["status"] == held["status"]
                else:
                    assert mine["status"] == "not compliant"


def test_levels_are_those_of_the_grid() -> None:
    for seed in range(30):
        plan = plan_line(*random_case(seed))
        grid = plan.outcome.grid
        table = grid.levels()
        for index in planned(plan):
            if np.isnan(grid.fixed_mm[index]):
                column = table[:, index]
                assert levels_of(plan, index).tolist() == column[~np.isnan(column)].tolist()


def test_curve_without_a_plan_is_refused() -> None:
    plan = next(
        p
        for p in (plan_line(*random_case(seed)) for seed in range(200))
        if not p.outcome.planned.all() and len(p.curves)
    )
    index = int(np.flatnonzero(~plan.outcome.planned)[0])
    with pytest.raises(KeyError):
        plan_at(plan, index, [0.0])
