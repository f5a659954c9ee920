"""The planner against the independent reference: same cants, statuses, bounds, speeds and today's verdict."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from reference.cases import Case, cases, random_case
from reference.planner import plan as reference_plan

from cant.model.traffic import Traffic
from cant.planning import Plan, plan_line

SEEDS = 700
GROUP = 100
FIGURES = (
    "speed_kmh",
    "run_speed_kmh",
    "equilibrium_cant_mm",
    "deficiency_mm",
    "excess_mm",
    "unbalanced_acceleration_ms2",
    "felt_acceleration_ms2",
    "permissible_speed_kmh",
    "permissible_speed_normal_kmh",
    "lowest_speed_kmh",
)


def alike(mine: float | None, theirs: float | None, tolerance: float = 1e-6) -> bool:
    if mine is None or theirs is None:
        return mine is theirs
    return math.isclose(mine, theirs, rel_tol=1e-9, abs_tol=tolerance)


def same_governor(mine: dict[str, Any] | None, theirs: list[dict[str, Any] | None]) -> bool:
    """Several limits may give the same bound: any of them may be named."""
    if mine is None:
        return not [one for one in theirs if one]
    keys = ("quantity", "clause", "class")
    named = {key: mine[key] for key in keys}
    return any(
        one is not None
        and one["quantity"] == named["quantity"]
        and (one.get("class") is None or named["class"] is None or one["class"] == named["class"])
        for one in theirs
    )


def differences(mine: dict[str, Any], theirs: dict[str, Any]) -> list[str]:
    """Tell in which keys a record differs from the reference's."""
    wrong = []
    if mine["status"] != theirs["status"]:
        wrong.append(f"status {mine['status']} / {theirs['status']}")
    if mine["today"]["status"] != theirs["today"]["status"]:
        wrong.append(f"today {mine['today']['status']} / {theirs['today']['status']}")
    if mine["shares_transition_with_next"] != theirs["shares_transition_with_next"]:
        wrong.append("shares")
    if theirs["status"] == "not assessed":
        return wrong
    # The reference counts a broken demand of the site as a limit passed; the rules leave that open.
    if any(quantity.startswith("cant at") for _, quantity in theirs["passed"]):
        return wrong
    wrong += [
        f"{key} {mine[key]} / {theirs[key]}"
        for key in ("recommended_cant_mm", "lower_mm", "upper_mm", "rms_speed_kmh", "equilibrium_speed_kmh")
        if not alike(mine[key], theirs[key])
    ]
    for side in ("lower", "upper"):
        if not same_governor(mine[f"{side}_by"], theirs[f"{side}_ties"]):
            wrong.append(f"{side}_by {mine[f'{side}_by']} / {theirs[f'{side}_ties']}")
    mine_by_class = {figures["class"]: figures for figures in mine["classes"]}
    for figures in theirs["classes"]:
        own = mine_by_class.pop(figures["class"])
        wrong += [
            f"{figures['class']} {key} {own[key]} / {figures[key]}"
            for key in FIGURES
            if not alike(own[key], figures[key])
        ]
    return wrong + [f"class {name} too many" for name in mine_by_class]


def compare(case: Case) -> None:
    plan = plan_line(*case)
    theirs = reference_plan(*case)
    for index, expected in enumerate(theirs):
        if not case[0].rejected[index]:
            found = differences(plan.record(index), expected)
            assert not found, f"{case[0].curve[index]}: {found}"


@pytest.mark.parametrize("first", range(0, SEEDS, GROUP))
def test_seeded_lines(first: int) -> None:
    for seed in range(first, first + GROUP):
        try:
            compare(random_case(seed))
        except AssertionError as error:
            message = f"seed {seed}: {error}"
            raise AssertionError(message) from error


@given(cases())
@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
def test_drawn_lines(case: Case) -> None:
    compare(case)


def faster(case: Case) -> Case:
    """Give a line with wider curves whose trains are planned at up to 480 km/h."""
    curves, traffic, *rest = case

    def raised(speed: Any) -> Any:
        return np.where(speed < 0, speed, np.minimum(3.4 * speed, 480.0))

    rows = [
        row if row.speed_kmh is None else row.model_copy(update={"speed_kmh": float(raised(row.speed_kmh))})
        for row in traffic.rows
    ]
    wider = replace(
        curves,
        radius_m=curves.radius_m * 3.4**2,
        speed_kmh=raised(curves.speed_kmh),
        class_speeds={name: raised(speed) for name, speed in curves.class_speeds.items()},
    )
    return (wider, Traffic.of(rows), *rest)


def test_planned_speeds_above_those_that_are_tried() -> None:
    """Permissible speeds are searched to 400 km/h; a planned speed above that is asked about as it is."""
    for seed in range(60):
        compare(faster(random_case(seed)))


def test_block_of_records_equals_single_records() -> None:
    case = random_case(3)
    plan = plan_line(*case)
    assert isinstance(plan, Plan)
    for index, record in zip(plan.assessed, plan.records(), strict=True):
        assert record == plan.record(int(index))
    assert np.isfinite(plan.proposed_mm[plan.outcome.planned]).all()
