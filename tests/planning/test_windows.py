"""The tools of the choice against their plain meaning: windows, pair lists, grids, order of measures."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt
import pytest
from reference.cases import random_case

from cant.planning.grid import Grid
from cant.planning.levels import Levels
from cant.planning.lexicographic import distinct_rows, first_best, least_of_groups, not_above
from cant.planning.line import Line
from cant.planning.meetings import make_pair_list
from cant.planning.neighbours import chains_of
from cant.planning.nodes import make_nodes
from cant.planning.outcome import Outcome, plan_arrays
from cant.planning.permissible import Permitted, first_alike, permitted_alone, speed_steps
from cant.planning.permissible_shared import permitted_shared
from cant.planning.reach import spread_ranges
from cant.planning.shared import Meeting, SharedAsked, hard_values, shared_values, speed_values
from cant.planning.windows import allowed_after, hard_window, speed_windows

FloatArray = npt.NDArray[np.float64]

SEEDS = range(6000, 6060)
CANTS = np.arange(0.0, 305.0, 5.0)


def meetings() -> Iterator[tuple[int, Outcome, Meeting]]:
    """Yield the shared transitions of random lines."""
    for seed in SEEDS:
        outcome = plan_arrays(*random_case(seed))
        if len(outcome.pairs):
            yield seed, outcome, Meeting.of(outcome.line, outcome.pairs)


def random_speeds(meeting: Meeting, seed: int) -> FloatArray:
    drawn = np.random.default_rng(seed).uniform(0.2, 1.0, meeting.both.shape)
    return np.asarray(np.nan_to_num(meeting.planned_kmh) * drawn)


def test_windows_allow_what_the_rules_keep() -> None:
    before, after = CANTS[:, None, None, None], CANTS[None, :, None, None]
    cells = kept_cells = 0
    for seed, _, meeting in meetings():
        for exceptional in (False, True):
            asked = SharedAsked(meeting, random_speeds(meeting, seed), exceptional)
            kept = np.ones((len(CANTS), len(CANTS), len(meeting)), dtype=bool)
            for found in shared_values(asked, before, after):
                kept &= np.broadcast_to(found.kept(), (*kept.shape, meeting.both.shape[1])).all(axis=-1)
            window = allowed_after(
                asked, np.broadcast_to(CANTS[:, None, None], (len(CANTS), len(meeting), 1))
            )
            held = window.holds(np.broadcast_to(CANTS[:, None], (len(CANTS), len(meeting))))
            np.testing.assert_array_equal(held, kept, err_msg=f"seed {seed}")
            cells, kept_cells = cells + kept.size, kept_cells + int(kept.sum())
    assert 0.02 < kept_cells / cells < 0.98


def test_windows_of_speed_and_the_others_apart() -> None:
    before, after = CANTS[:, None, None, None], CANTS[None, :, None, None]
    for seed, _, meeting in meetings():
        asked = SharedAsked(meeting, random_speeds(meeting, seed), True)
        own = np.broadcast_to(CANTS[:, None, None], (len(CANTS), len(meeting), 1))
        cants = np.broadcast_to(CANTS[:, None], (len(CANTS), len(meeting)))
        shape = (len(CANTS), len(CANTS), *meeting.both.shape)
        hard, by_class = np.ones(shape[:-1], dtype=bool), np.ones(shape, dtype=bool)
        for found in hard_values(asked, before, after):
            hard &= np.broadcast_to(found.kept(), shape).all(axis=-1)
        for found in speed_values(asked, before, after):
            by_class &= found.kept()
        np.testing.assert_array_equal(hard_window(asked, own).holds(cants), hard, err_msg=f"seed {seed}")
        window = speed_windows(asked, own)
        held = window.holds(np.broadcast_to(cants[:, :, None], window.low.shape))
        np.testing.assert_array_equal(held, by_class, err_msg=f"seed {seed}")


def chain_levels(outcome: Outcome, exceptional: bool) -> tuple[Line, Meeting, Levels]:
    """Give the levels of all curves in chains, chain after chain."""
    chains = chains_of(outcome.pairs)
    curves = np.concatenate(chains)
    number = np.repeat(np.arange(len(chains)), [len(chain) for chain in chains])
    line = outcome.line.take(curves).with_bands()
    nodes = make_nodes(line, outcome.grid.take(curves), outcome.target, exceptional)
    levels = Levels.of(line, nodes, number, exceptional)
    after = outcome.pairs.after(len(outcome.line))[curves[levels.begins]]
    return line, Meeting.of(outcome.line, outcome.pairs.take(after)), levels


@pytest.mark.parametrize("exceptional", [False, True])
def test_pairs_permit_what_the_search_by_multiples_finds(exceptional: bool) -> None:
    """All pairs by windows against each pair by the evaluation of the finished plan, at full length."""
    slowed = 0
    for seed, outcome, _ in meetings():
        line, meeting, levels = chain_levels(outcome, exceptional)
        listed = make_pair_list(meeting, levels, exceptional, also_broken=True)
        assert len(listed) == sum(
            int(((levels.table[:, i] >= 0).sum()) * (levels.table[:, i + 1] >= 0).sum())
            for i in levels.begins
        )
        sides = []
        for number in (listed.before, listed.after):
            part, cant = line.take(levels.curve[number]), levels.cant_mm[number][:, None]
            sides.append((part, cant, permitted_alone(part, cant, speed_steps(part), exceptional)))
        (before, cant_before, own_before), (after, cant_after, own_after) = sides
        found = permitted_shared(
            meeting.take(listed.transition),
            (cant_before, cant_after),
            (own_before, own_after),
            (speed_steps(before), speed_steps(after)),
            exceptional,
        )
        for part, own, mine, theirs in (
            (before, own_before, listed.on_before, found[0]),
            (after, own_after, listed.on_after, found[1]),
        ):
            runs = [
                Permitted(np.minimum(own.up_to_kmh, one.up_to_kmh), own.planned & one.planned).run_speed(
                    part.planned_kmh
                )[part.runs]
                for one in (mine, theirs)
            ]
            np.testing.assert_allclose(runs[0], runs[1], err_msg=f"seed {seed}")
            slowed += int((runs[1] < own.run_speed(part.planned_kmh)[part.runs] - 1e-9).sum())
    assert slowed > 100


def test_pairs_left_out_are_those_that_no_speed_can_mend() -> None:
    for seed, outcome, _ in meetings():
        _, meeting, levels = chain_levels(outcome, True)
        every = make_pair_list(meeting, levels, True, also_broken=True)
        kept = make_pair_list(meeting, levels, True, also_broken=False)
        good = every.broken == 0
        assert (every.overrun[good] == 0).all()
        assert (every.overrun[~good] > 0).all()
        np.testing.assert_array_equal(every.before[good], kept.before, err_msg=f"seed {seed}")
        np.testing.assert_array_equal(every.after[good], kept.after, err_msg=f"seed {seed}")


def test_classes_alike_have_the_same_permissible_speeds() -> None:
    found = 0
    for seed in SEEDS:
        line = plan_arrays(*random_case(seed)).line
        first = first_alike(line)
        steps = speed_steps(line)
        for cant in (0.0, 60.0, 140.0):
            permitted = permitted_alone(line, np.full((len(line), 1), cant), steps, True)
            same = np.take_along_axis(permitted.up_to_kmh, first, axis=1)
            np.testing.assert_array_equal(permitted.up_to_kmh[line.runs], same[line.runs])
        found += int((first != np.arange(first.shape[1])).sum())
    assert found > 0


def test_ranges_one_after_the_other() -> None:
    owner, number = spread_ranges(np.array([3, 7, 7, 1]), np.array([5, 7, 10, 2]))
    assert owner.tolist() == [0, 0, 2, 2, 2, 3]
    assert number.tolist() == [3, 4, 7, 8, 9, 1]


# -- grids ---------------------------------------------------------------------------------------------------


def random_grid(rng: np.random.Generator, n: int) -> Grid:
    step = rng.choice([1.0, 2.5, 5.0, 6.35, 10.0], n)
    fixed = np.where(rng.random(n) < 0.2, rng.integers(-2, 60, n) * 2.5, np.nan)
    smallest = rng.integers(1, 6, n)
    return Grid(step, smallest, np.floor(300.0 / step + 1e-9).astype(np.int64), fixed)


def test_grid_between_and_nearest_against_all_levels() -> None:
    rng = np.random.default_rng(3)
    for _ in range(40):
        grid = random_grid(rng, 30)
        low = np.where(rng.random(30) < 0.2, -np.inf, rng.uniform(-20.0, 150.0, 30))
        high = np.where(rng.random(30) < 0.2, np.inf, low + rng.uniform(-5.0, 120.0, 30))
        high = np.where(np.isnan(high), rng.uniform(0.0, 300.0, 30), high)
        target = rng.uniform(-10.0, 320.0, 30)
        between, nearest = grid.between(low, high), grid.nearest(target, low, high)
        for j, levels in enumerate(grid.levels().T):
            inside = levels[(levels >= low[j]) & (levels <= high[j])]
            mine = between[:, j][~np.isnan(between[:, j])]
            np.testing.assert_allclose(mine, inside)
            if not len(inside):
                assert np.isnan(nearest[j])
                continue
            best = inside[np.argmin(np.round(np.abs(inside - target[j]), 9))]
            assert nearest[j] == pytest.approx(best)


def test_grid_takes_the_lower_of_two_as_near() -> None:
    grid = Grid(np.array([5.0]), np.array([4]), np.array([60]), np.array([np.nan]))
    free = (np.array([-np.inf]), np.array([np.inf]))
    assert grid.nearest(np.array([62.5]), *free)[0] == 60.0
    assert grid.nearest(np.array([10.0]), *free)[0] == 0.0
    assert grid.nearest(np.array([10.1]), *free)[0] == 20.0


# -- measures in their order ---------------------------------------------------------------------------------


def test_first_best_takes_the_first_of_the_least() -> None:
    rng = np.random.default_rng(4)
    measures = rng.integers(0, 3, (3, 7, 200)).astype(float)
    allowed = rng.random((7, 200)) < 0.6
    chosen, any_allowed = first_best(list(measures), allowed, axis=0)
    for j in range(200):
        rows = np.flatnonzero(allowed[:, j])
        assert any_allowed[j] == bool(len(rows))
        if len(rows):
            assert chosen[j] == min(rows, key=lambda i, j=j: (*measures[:, i, j], i))


def test_least_of_groups_goes_by_measure_after_measure() -> None:
    rng = np.random.default_rng(5)
    group = np.sort(rng.integers(0, 40, 150))
    measures = rng.integers(0, 4, (150, 3)).astype(float)
    groups, least, best = least_of_groups(measures, group)
    assert groups.tolist() == sorted(set(group.tolist()))
    for g, values, row in zip(groups, least, best, strict=True):
        rows = np.flatnonzero(group == g)
        expected = min(rows, key=lambda i: (*measures[i], i))
        assert row == expected
        np.testing.assert_array_equal(values, measures[expected])


def test_distinct_rows_are_the_first_of_their_kind() -> None:
    rng = np.random.default_rng(6)
    rows = rng.choice([0.0, 1.5, np.nan], (300, 4))
    first, place = distinct_rows(rows)
    seen: dict[str, int] = {}
    for i, row in enumerate(rows):
        assert first[place[i]] == seen.setdefault(str(row), i)
    assert len(first) == len(seen)


def test_rows_not_above_others_in_the_order_of_measures() -> None:
    low = np.array([[0.0, 5.0], [1.0, 0.0], [0.0, 3.0], [0.0, 4.0 + 1e-12]])
    ceiling = np.tile([0.0, 4.0], (4, 1))
    assert not_above(low, ceiling).tolist() == [False, False, True, True]
    assert not_above(low, np.full((4, 2), np.inf)).all()
