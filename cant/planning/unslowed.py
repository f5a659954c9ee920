"""Chains whose transitions slow no train further: a shortest path over the cants that cost least time.

Where every curve can have a cant that costs it as little time as any, and the transitions allow such cants
side by side at the speeds then run, no path loses less time; approvals, overrun and the distance from the
target decide among them. On those cants a curve nearly always runs the same speeds, so what its transitions
allow are windows (:mod:`cant.planning.windows`). A chain with a curve of which that is not so is left.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_shared
from cant.planning.chain_choice import Stage, best_paths, by_length
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes
from cant.planning.permissible import Permitted, first_alike, next_multiple, speed_steps
from cant.planning.permissible_shared import shared_gap, slows_after
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import Window, hard_window, speed_windows

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

TOGETHER = 100
"""Chains that step together: keeps the arrays of a step within the processor's cache."""
_SLACK = 1e-9


@dataclass
class _Cheap:
    """The levels of q curves that cost least time: arrays (a, q), speeds (q, k).

    ``own`` is what the curve by itself permits at all of them, ``alike`` whether it is the same at all.
    """

    possible: BoolArray
    cant_mm: FloatArray
    measures: list[FloatArray]
    own: Permitted
    run_kmh: FloatArray
    alike: BoolArray

    @classmethod
    def of(cls, nodes: Nodes, curves: IntArray) -> _Cheap:
        cheap = nodes.cheapest[:, curves]
        order = np.argsort(~cheap, axis=0, kind="stable")[: int(cheap.sum(axis=0).max(initial=0))]
        possible = np.take_along_axis(cheap, order, axis=0)
        count, overrun, square, cant = (
            np.where(possible, measure[order, curves], 0.0)
            for measure in (nodes.count, nodes.overrun, nodes.square, nodes.cant_mm)
        )
        run = np.nan_to_num(nodes.run_kmh[order, curves])
        planned = nodes.alone.planned[order, curves]
        same = ((run == run[0]) & (planned == planned[0])).all(axis=-1)
        own = Permitted(nodes.alone.up_to_kmh[order[0], curves], planned[0])
        alike = (same | ~possible).all(axis=0)
        return cls(possible, cant, [count, overrun, square, cant], own, run[0], alike)


def settle_unslowed(
    line: Line, pairs: Pairs, nodes: Nodes, chains: Sequence[IntArray], exceptional: bool
) -> tuple[FloatArray, list[IntArray]]:
    """Find the best cants of as many chains as lose no more time than their curves by themselves.

    Parameters
    ----------
    line : Line
        n curves, with their limits in bands.
    pairs : Pairs
    nodes : Nodes
        Of the same curves.
    chains : sequence of ndarray of int
        Each in order of chainage.
    exceptional : bool
        Last tier allowed.

    Returns
    -------
    cant_mm : ndarray, shape (n,)
        nan where not settled here.
    left : list of ndarray of int
        Chains that have no such path, or of which it is not known.
    """
    cant = np.full(len(line), np.nan)
    after = pairs.after(len(line))
    left: list[IntArray] = []
    for curves in by_length(chains, TOGETHER):
        cheap = [_Cheap.of(nodes, column) for column in curves.T]
        stages = [Stage(curve.measures, curve.possible) for curve in cheap]
        known = np.logical_and.reduce([curve.alike for curve in cheap])
        for i, column in enumerate(curves.T[:-1]):
            meeting = Meeting.of(line, pairs.take(after[column]))
            known &= _meet(stages[i], meeting, cheap[i], cheap[i + 1], exceptional)
        level, found = best_paths(stages)
        found &= known
        every = np.arange(len(curves))
        best = np.stack([c.cant_mm[at, every] for c, at in zip(cheap, level.T, strict=True)], axis=1)
        cant[curves[found]] = best[found]
        left += list(curves[~found])
    return cant, left


def _meet(stage: Stage, meeting: Meeting, before: _Cheap, after: _Cheap, exceptional: bool) -> BoolArray:
    """Enter into a stage which pairs its transitions allow, and what these pass at normal values.

    Returns
    -------
    ndarray of bool, shape (q,)
        Whether these are surely all pairs that slow no train.
    """
    run = np.minimum(before.run_kmh, after.run_kmh)
    cants = before.cant_mm[:, :, None]
    at_run = speed_windows(SharedAsked(meeting, run, exceptional), cants)
    # A train that stands, or that may not run at all, is not slowed further.
    at_run = Window(np.where(run > 0, at_run.low, -np.inf), np.where(run > 0, at_run.high, np.inf))
    below, sure = _below_run_speed(meeting, before, after, at_run, exceptional)
    window = hard_window(SharedAsked(meeting, meeting.planned_kmh, exceptional), cants)
    window = window.within(at_run.over_classes()).within(below)
    allowed = window.holds(after.cant_mm) & stage.possible[:, None, :] & after.possible
    stage.pair_allowed = allowed
    stage.pair_measures = [None, None, None, None]
    passing, at, column = _passing(meeting, run, cants, window, after)
    if len(passing):
        cants_after = after.cant_mm[None]
        passed = passed_shared(
            meeting.unfold(at, column),
            (cants[:, None, at], cants_after[:, :, at, None]),
            run[at, column][:, None],
        ).gathered(np.searchsorted(at, passing))
        count, total = np.zeros(allowed.shape), np.zeros(allowed.shape)
        count[:, :, passing], total[:, :, passing] = passed.count, passed.total
        stage.pair_measures = [count, total, None, None]
    return sure


def _passing(
    meeting: Meeting, run_kmh: FloatArray, cants_mm: FloatArray, window: Window, after: _Cheap
) -> tuple[IntArray, IntArray, IntArray]:
    """Find the transitions over which an allowed pair may pass a normal limit, and for which classes.

    Returns
    -------
    passing : ndarray of int
        Transitions.
    at, column : ndarray of int
        Transitions again, with a class each: of those treated alike one. One class where none runs on both.
    """
    low = np.maximum(window.low, np.where(after.possible, after.cant_mm, np.inf).min(axis=0))
    high = np.minimum(window.high, np.where(after.possible, after.cant_mm, -np.inf).max(axis=0))
    asked = SharedAsked(meeting, run_kmh, False)
    hard, each = hard_window(asked, cants_mm), speed_windows(asked, cants_mm)
    outside_hard = ((low <= high) & ((hard.low > low) | (hard.high < high))).any(axis=0)
    low, high = low[:, :, None], high[:, :, None]
    outside = ((low <= high) & ((each.low > low) | (each.high < high))).any(axis=0)
    both = meeting.both
    danger = both & (outside | outside_hard[:, None])
    danger[:, 0] |= outside_hard & ~both.any(axis=1)
    at, column = np.nonzero(danger & (first_alike(meeting.before, meeting.after) == np.arange(both.shape[1])))
    return np.unique(at), at, column


def _below_run_speed(
    meeting: Meeting, before: _Cheap, after: _Cheap, at_run: Window, exceptional: bool
) -> tuple[Window, BoolArray]:
    """Give what the multiples of the speed step ask of trains that do not run at a permissible planned speed.

    Such a train, on the curve where it is the slower, must find all in order at every multiple up to its
    speed. A planned speed that is no multiple is another matter: it is run where all is in order at it, or
    else at every multiple up to the next above. Where the second does not imply the first (``sure`` is then
    False), what is allowed is no interval.
    """
    shape = before.cant_mm.shape
    window, sure = Window(np.full(shape, -np.inf), np.full(shape, np.inf)), np.ones(shape[1], dtype=np.bool_)
    runs = np.stack([before.run_kmh, after.run_kmh])
    on_after = slows_after(meeting, (before.run_kmh, after.run_kmh))
    own, other = np.where(on_after, runs[::-1], runs)
    planned = np.where(on_after, meeting.after.planned_kmh, meeting.before.planned_kmh)
    step = np.where(on_after, speed_steps(meeting.after), speed_steps(meeting.before))
    held = np.where(on_after, after.own.planned, before.own.planned)
    top = next_multiple(own, step)
    uneven = np.abs(top - own) > _SLACK
    at, column = np.nonzero(meeting.both & (own > 0) & (uneven | ~held))
    if not len(at):
        return window, sure
    other, planned, step, top = (x[at, column][:, None] for x in (other, planned, step, top))
    on_after, held, uneven = on_after[at, column][:, None], held[at, column], uneven[at, column]
    multiple = np.arange(1.0, np.rint((top / step).max()) + 1)[:, None, None, None] * step
    trial = np.minimum(np.minimum(multiple, top), other)
    part = meeting.unfold(at, column)
    each = speed_windows(SharedAsked(part, trial, exceptional), before.cant_mm[:, at, None])
    gap = shared_gap(part, trial, on_after, exceptional) & (trial > planned + _SLACK)
    low = np.where(gap, np.inf, each.low).max(axis=0)[..., 0]
    high = each.high.min(axis=0)[..., 0]
    slow = ~held
    np.maximum.at(window.low.T, at[slow], low.T[slow])
    np.minimum.at(window.high.T, at[slow], high.T[slow])
    inside = (low > high) | ((low >= at_run.low[:, at, column]) & (high <= at_run.high[:, at, column]))
    sure[at[~inside.all(axis=0) & uneven]] = False
    return window, sure
