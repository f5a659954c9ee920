"""The choice of cants: every short cut against the general way, single curves against trying every cant.

The lines are the random ones of the reference planner's tests, which has its own word on them elsewhere; here
the planner is held against itself, made to take the long way.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from reference.cases import Case, random_case

import cant.planning.choose as choosing
from cant.model.curves import CurveList
from cant.planning.assess import hard_kept, line_speeds, passed_alone
from cant.planning.bounds import Bounds, bounds_at
from cant.planning.grid import Grid
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes
from cant.planning.outcome import Outcome, plan_arrays
from cant.planning.running_time import Services

BoolArray = npt.NDArray[np.bool_]
FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

# The first two: a planned speed above all multiples that are tried, and one between two of them.
SEEDS = (72, 895, *range(5000, 5080))
NO_KEEPING: dict[str, Any] = {"keep_within_mm": 0.0}


def lone_and_chained(outcome: Outcome) -> tuple[IntArray, IntArray]:
    """Tell the curves by themselves from those in chains."""
    chained = np.union1d(outcome.pairs.first, outcome.pairs.second)
    return np.setdiff1d(np.arange(len(outcome.line)), chained), chained


def nothing_settled(line: Line) -> Bounds:
    """Stand in for the closed form: no cant is known to be within normal limits."""
    bounds = bounds_at(line, line.planned_kmh)
    return replace(bounds, kept=np.zeros_like(bounds.kept))


def none_within_normal(
    line: Line, grid: Grid, pairs: Pairs, chains: list[IntArray], bounds: object, target: object
) -> tuple[FloatArray, list[IntArray]]:
    """Stand in for the shortest path within normal limits: it settles nothing."""
    return np.full(len(line), np.nan), list(chains)


def none_unslowed(
    line: Line, pairs: Pairs, nodes: Nodes, chains: list[IntArray], exceptional: bool
) -> tuple[FloatArray, list[IntArray]]:
    """Stand in for the shortest path at the speeds of the curves by themselves: it settles nothing."""
    return np.full(len(line), np.nan), list(chains)


def everywhere(line: Line, pairs: Pairs, cant: FloatArray) -> BoolArray:
    """Stand in for the check that nearest cants stand together: none do."""
    clashes = np.zeros(len(line), dtype=np.bool_)
    clashes[pairs.first] = True
    return clashes


@pytest.mark.parametrize(
    "long_way",
    [
        {"_clashes": everywhere},
        {"_clashes": everywhere, "settle_within_normal": none_within_normal},
        {"normal_bounds": nothing_settled},
        {"normal_bounds": nothing_settled, "settle_unslowed": none_unslowed},
    ],
    ids=["paths-within-normal", "unslowed-paths", "every-level-weighed", "search-of-everything"],
)
def test_short_cuts_give_what_the_long_way_gives(
    long_way: dict[str, Callable[..., Any]], monkeypatch: pytest.MonkeyPatch
) -> None:
    cases = [random_case(seed) for seed in SEEDS]
    short = [plan_arrays(*case) for case in cases]
    calls = dict.fromkeys(long_way, 0)
    for name, stand_in in long_way.items():

        def counted(
            *given: Any, _name: str = name, _stand_in: Callable[..., Any] = stand_in, **named: Any
        ) -> Any:
            calls[_name] += 1
            return _stand_in(*given, **named)

        monkeypatch.setattr(choosing, name, counted)
    for seed, case, quick in zip(SEEDS, cases, short, strict=True):
        slow = plan_arrays(*case)
        np.testing.assert_allclose(slow.cant_mm, quick.cant_mm, atol=1e-9, err_msg=f"seed {seed}")
        assert slow.status == quick.status, seed
        np.testing.assert_allclose(slow.proposed.run_kmh, quick.proposed.run_kmh, err_msg=f"seed {seed}")
    assert all(count > 0 for count in calls.values()), calls


def test_the_random_lines_reach_every_step(monkeypatch: pytest.MonkeyPatch) -> None:
    """The comparisons above mean something only where each step has work of its own."""
    settled = {"settle_within_normal": 0, "settle_unslowed": 0, "search_chains": 0, "best_alone": 0}
    for name in settled:
        real = getattr(choosing, name)

        def counted(*given: Any, _name: str = name, _real: Any = real, **named: Any) -> Any:
            found = _real(*given, **named)
            cants = found if _name == "best_alone" else found[1 if _name == "search_chains" else 0]
            settled[_name] += int((~np.isnan(cants)).sum())
            return found

        monkeypatch.setattr(choosing, name, counted)
    for seed in SEEDS:
        plan_arrays(*random_case(seed))
    assert min(settled.values()) >= 10, settled


def least(left: list[int], worth: Callable[[int], float]) -> list[int]:
    """Keep what is least, equal within rounding."""
    lowest = min(worth(i) for i in left)
    return [i for i in left if worth(i) <= lowest + 1e-9 * max(1.0, abs(lowest))]


def best_by_trying(outcome: Outcome, curve: int, exceptional: bool) -> float:
    """Weigh every cant of the grid of a curve by itself, one after the other; nan where none may be taken."""
    line, grid = outcome.line.take([curve]), outcome.grid.take([curve])
    nothing = Pairs(*(np.zeros(0, dtype=np.int64),) * 2, *(np.zeros(0),) * 3)
    services = Services.of(line)
    found = []
    for cant in grid.levels()[:, 0]:
        at = np.array([cant])
        if np.isnan(cant) or not hard_kept(line, at[:, None], exceptional)[0]:
            continue
        run = line_speeds(line, nothing, at, exceptional).run_kmh
        passed = passed_alone(line, at[:, None], run)
        square = (cant - outcome.target(line, run)[0, 0]) ** 2
        found.append(
            (
                services.stopped(run)[0],
                services.lost_s(run)[0],
                passed.count[0],
                passed.total[0],
                square,
                cant,
            )
        )
    left = list(range(len(found)))
    for j in range(6 if found else 0):
        left = least(left, lambda i, j=j: float(found[i][j]))
    return float(found[left[0]][-1]) if found else np.nan


def test_single_curves_against_trying_every_cant() -> None:
    tried = 0
    for seed in SEEDS:
        case = random_case(seed)
        case = case._replace(settings=case.settings.model_copy(update=NO_KEEPING))
        outcome = plan_arrays(*case)
        for curve in lone_and_chained(outcome)[0]:
            if not outcome.planned[curve] or outcome.not_compliant[curve]:
                continue
            best = best_by_trying(outcome, int(curve), case.settings.allows_exceptional)
            assert outcome.cant_mm[curve] == pytest.approx(best), (seed, curve)
            tried += 1
    assert tried > 60


# -- what must not matter ------------------------------------------------------------------------------------


def mirrored(curves: CurveList) -> CurveList:
    """Give the line seen in a mirror."""
    return replace(curves, hand=-curves.hand)


def turned_round(curves: CurveList) -> CurveList:
    """Give the line walked from the other end, rows in the new order."""
    return replace(
        curves,
        start_km=100.0 - curves.end_km,
        end_km=100.0 - curves.start_km,
        hand=-curves.hand,
        transition_in_m=curves.transition_out_m,
        transition_out_m=curves.transition_in_m,
        ramp_in_m=curves.ramp_out_m,
        ramp_out_m=curves.ramp_in_m,
    ).take(np.arange(len(curves))[::-1])


def test_mirrored_lines_get_the_same_plan() -> None:
    for seed in SEEDS:
        case = random_case(seed)
        one, other = plan_arrays(*case), plan_arrays(mirrored(case.curves), *case[1:])
        np.testing.assert_array_equal(one.cant_mm, other.cant_mm, err_msg=f"seed {seed}")
        assert one.status == other.status, seed


def test_shuffled_rows_get_the_same_plan() -> None:
    for seed in SEEDS:
        case = random_case(seed)
        order = np.random.default_rng(seed).permutation(len(case.curves))
        one, other = plan_arrays(*case), plan_arrays(case.curves.take(order), *case[1:])
        np.testing.assert_allclose(one.cant_mm[order], other.cant_mm, err_msg=f"seed {seed}")
        assert [one.status[i] for i in order] == other.status, seed


def worth(outcome: Outcome) -> list[float]:
    """Sum up what a plan costs, over the curves that do not break what must be kept."""
    proposed = outcome.proposed
    good = outcome.planned & ~outcome.not_compliant
    between = proposed.passed_between.count
    return [
        float(proposed.stopped[good].sum()),
        float(proposed.lost_s[good].sum()),
        float(proposed.passed.count[good].sum()) + float(np.sum(between)),
    ]


def test_lines_walked_from_the_other_end_get_a_plan_of_the_same_worth() -> None:
    """Of equals the lower cant at the smaller chainage is taken, so the cants themselves may differ then."""
    same = 0
    for seed in SEEDS:
        case = _not_alike(random_case(seed))
        one, other = plan_arrays(*case), plan_arrays(turned_round(case.curves), *case[1:])
        if one.not_compliant.any():
            continue
        assert worth(one) == pytest.approx(worth(other)), seed
        same += int(np.array_equal(one.cant_mm, other.cant_mm[::-1], equal_nan=True))
    assert same > len(SEEDS) // 2


def _not_alike(case: Case) -> Case:
    """Make lengths differ: of curves of one length the first slows, which the other direction turns round."""
    curves = case.curves
    length = np.abs(curves.end_km - curves.start_km) * 1000.0 + 0.01 * np.arange(len(curves))
    # The order of rows is that of chainage: a list against the chainage would be turned round itself.
    order = np.lexsort((curves.start_km, curves.track))
    return case._replace(
        curves=replace(curves, length_m=length).take(order),
        settings=case.settings.model_copy(update=NO_KEEPING),
    )
