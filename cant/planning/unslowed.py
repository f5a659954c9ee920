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
from cant.planning.multiples import Kinds, Multiples
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes, best_alone
from cant.planning.permissible import Permitted, first_alike, next_multiple, speed_steps
from cant.planning.permissible_shared import slows_after
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import Window, hard_window, speed_windows

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

TOGETHER = 200
"""Transitions looked at together: keeps their arrays within the processor's cache."""
FEW_TOGETHER = 2000
"""The same where each curve has but one level."""
_SLACK = 1e-9
_EDGE_MM = 1e-6
"""A cant this close to the edge of a window is evaluated, not taken from it."""


@dataclass
class _Cheap:
    """The levels of c curves that cost least time: arrays (a, c), speeds (c, k).

    ``own`` is what the curve by itself permits at all of them, ``alike`` whether it is the same at all.
    """

    possible: BoolArray
    cant_mm: FloatArray
    measures: list[FloatArray]
    own: Permitted
    run_kmh: FloatArray
    alike: BoolArray

    @classmethod
    def of(cls, nodes: Nodes, cheapest: BoolArray, curves: IntArray) -> _Cheap:
        cheap = cheapest[:, curves]
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

    def part(self, curves: slice) -> _Cheap:
        """Give some consecutive curves."""
        return _Cheap(
            self.possible[:, curves],
            self.cant_mm[:, curves],
            [measure[:, curves] for measure in self.measures],
            Permitted(self.own.up_to_kmh[curves], self.own.planned[curves]),
            self.run_kmh[curves],
            self.alike[curves],
        )


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
    every, n = nodes.cheapest, len(line)
    best = np.zeros_like(every)
    best[best_alone(nodes), np.arange(n)] = True
    # Where the best of each curve by itself stand side by side and pass nothing there, none is better.
    cant, left = _settle(line, pairs, nodes, best & every, chains, exceptional, passing=False)
    further, left = _settle(line, pairs, nodes, every, left, exceptional, passing=True)
    return np.where(np.isnan(cant), further, cant), left


def _settle(
    line: Line,
    pairs: Pairs,
    nodes: Nodes,
    levels: BoolArray,
    chains: Sequence[IntArray],
    exceptional: bool,
    *,
    passing: bool,
) -> tuple[FloatArray, list[IntArray]]:
    """Find the best cants among some of the cheapest levels (levels, n).

    ``passing``: also over transitions that pass a limit at its normal value.
    """
    cant, after = np.full(len(line), np.nan), pairs.after(len(line))
    left: list[IntArray] = []
    together = TOGETHER if passing else FEW_TOGETHER
    for curves in by_length(chains, together):
        # Position by position, so that a transition leads from a curve to the one q further on.
        q, members = len(curves), curves.T.ravel()
        cheap = _Cheap.of(nodes, levels, members)
        crossings = []
        for begin in range(0, len(members) - q, together):
            some = slice(begin, min(begin + together, len(members) - q))
            meeting = Meeting.of(line, pairs.take(after[members[some]]))
            ahead = slice(some.start + q, some.stop + q)
            crossings.append(_cross(meeting, cheap.part(some), cheap.part(ahead), exceptional))
        crossing = _Crossing.join(crossings)
        if not passing and crossing.passed[0] is not None:
            crossing.allowed &= crossing.passed[0] == 0
        level, found = best_paths(_stages(cheap, crossing, q))
        found &= cheap.alike.reshape(-1, q).all(axis=0)
        found &= crossing.sure.reshape(-1, q).all(axis=0)
        best = cheap.cant_mm[level.T.ravel(), np.arange(len(members))].reshape(-1, q).T
        cant[curves[found]] = best[found]
        left += list(curves[~found])
    return cant, left


def _stages(cheap: _Cheap, crossing: _Crossing, q: int) -> list[Stage]:
    """Cut curves and transitions into those of each position of q chains."""
    stages = []
    for begin in range(0, len(cheap.alike), q):
        here = cheap.part(slice(begin, begin + q))
        stages.append(Stage(here.measures, here.possible))
        if begin + q < len(cheap.alike):
            stages[-1].pair_allowed = crossing.allowed[:, :, begin : begin + q]
            passed = [None if part is None else part[:, :, begin : begin + q] for part in crossing.passed]
            stages[-1].pair_measures = [*passed, None, None]
    return stages


@dataclass
class _Crossing:
    """The pairs of levels over m transitions: arrays (a, b, m).

    ``allowed`` tells which slow no train, ``passed`` count and overrun of what these pass at normal values
    (None: nothing), ``sure`` (m,) whether the allowed ones are surely all.
    """

    allowed: BoolArray
    passed: tuple[FloatArray, FloatArray] | tuple[None, None]
    sure: BoolArray

    @classmethod
    def join(cls, parts: Sequence[_Crossing]) -> _Crossing:
        allowed = np.concatenate([part.allowed for part in parts], axis=-1)
        sure = np.concatenate([part.sure for part in parts])
        if all(part.passed[0] is None for part in parts):
            return cls(allowed, (None, None), sure)
        count, overrun = (
            np.concatenate(
                [np.zeros(p.allowed.shape) if p.passed[j] is None else p.passed[j] for p in parts], axis=-1
            )
            for j in (0, 1)
        )
        return cls(allowed, (count, overrun), sure)


def _cross(meeting: Meeting, before: _Cheap, after: _Cheap, exceptional: bool) -> _Crossing:
    """Find which pairs some transitions allow, and what these pass at normal values."""
    run = np.minimum(before.run_kmh, after.run_kmh)
    cants = before.cant_mm[:, :, None]
    at_run = speed_windows(SharedAsked(meeting, run, exceptional), cants)
    # A train that stands, or that may not run at all, is not slowed further.
    at_run = Window(np.where(run > 0, at_run.low, -np.inf), np.where(run > 0, at_run.high, np.inf))
    one = first_alike(meeting.before, meeting.after) == np.arange(run.shape[1])
    below, sure = _below_run_speed(meeting, before, after, at_run, one, exceptional)
    window = hard_window(SharedAsked(meeting, meeting.planned_kmh, exceptional), cants)
    window = window.within(at_run.over_classes()).within(below)
    allowed = window.holds(after.cant_mm) & before.possible[:, None, :] & after.possible
    return _Crossing(allowed, _passed(meeting, run, (before, after), allowed, one), sure)


def _passed(
    meeting: Meeting,
    run_kmh: FloatArray,
    curves: tuple[_Cheap, _Cheap],
    allowed: BoolArray,
    one_of_alike: BoolArray,
) -> tuple[FloatArray, FloatArray] | tuple[None, None]:
    """Give number and overrun of the normal limits that allowed pairs pass, (a, b, m) each; None for nothing.

    Windows tell which pairs may pass anything, and by which of the classes treated alike one: only these
    are evaluated.
    """
    asked, before, after = SharedAsked(meeting, run_kmh, False), curves[0].cant_mm, curves[1].cant_mm
    hard, each = hard_window(asked, before[:, :, None]), speed_windows(asked, before[:, :, None])
    both = meeting.both & one_of_alike
    # Where no class runs on both curves, the gradient speaks of none: one column stands for it.
    both[:, 0] |= ~meeting.both.any(axis=1)
    within = Window(
        np.where(both, np.maximum(each.low, hard.low[:, :, None]) + _EDGE_MM, -np.inf),
        np.where(both, np.minimum(each.high, hard.high[:, :, None]) - _EDGE_MM, np.inf),
    )
    row, ahead, at = np.nonzero(allowed & ~within.over_classes().holds(after))
    if not len(at):
        return None, None
    cant = after[ahead, at][:, None]
    which, column = np.nonzero((cant < within.low[row, at]) | (cant > within.high[row, at]))
    row, ahead, at = row[which], ahead[which], at[which]
    pair = np.ravel_multi_index((row, ahead, at), allowed.shape)
    passed = passed_shared(
        meeting.unfold(at, column),
        (before[row, at][:, None], after[ahead, at][:, None]),
        run_kmh[at, column][:, None],
    )
    begin = np.flatnonzero(np.diff(pair, prepend=-1))
    passed = passed.gathered(begin)
    count, total = np.zeros((2, *allowed.shape))
    count.ravel()[pair[begin]], total.ravel()[pair[begin]] = passed.count, passed.total
    return count, total


def _below_run_speed(
    meeting: Meeting,
    before: _Cheap,
    after: _Cheap,
    at_run: Window,
    one_of_alike: BoolArray,
    exceptional: bool,
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
    step = np.where(on_after, speed_steps(meeting.after), speed_steps(meeting.before))
    held = np.where(on_after, after.own.planned, before.own.planned)
    top = next_multiple(own, step)
    uneven = np.abs(top - own) > _SLACK
    at, column = np.nonzero(meeting.both & one_of_alike & (own > 0) & (uneven | ~held))
    if not len(at):
        return window, sure
    other, step, top = (speed[at, column] for speed in (other, step, top))
    on_after, held, uneven = (which[at, column] for which in (on_after, held, uneven))
    each = _up_to(
        meeting, before.cant_mm, Kinds.of(meeting, at, column), (top, other, step), on_after, exceptional
    )
    slow = ~held
    np.maximum.at(window.low.T, at[slow], each.low.T[slow])
    np.minimum.at(window.high.T, at[slow], each.high.T[slow])
    inside = (each.low >= at_run.low[:, at, column]) & (each.high <= at_run.high[:, at, column])
    inside |= each.low > each.high
    sure[at[~inside.all(axis=0) & uneven]] = False
    return window, sure


def _up_to(
    meeting: Meeting,
    cant_before_mm: FloatArray,
    kinds: Kinds,
    speeds_kmh: tuple[FloatArray, FloatArray, FloatArray],
    on_after: BoolArray,
    exceptional: bool,
) -> Window:
    """Give what all multiples up to a top one allow to c cases, shape (a, c).

    Trains run no faster over the transition than on the other curve. ``speeds_kmh``: the top multiple, the
    speed on the other curve and the step, (c,) each.
    """
    top, other, step = speeds_kmh
    last = np.floor(np.minimum(top, other) / step + _SLACK)
    odd = (other < top) & (other != last * step)
    multiples = Multiples.of(
        meeting.unfold(kinds.entry_at, kinds.entry_column),
        cant_before_mm[:, kinds.entry_at],
        kinds.fastest(np.minimum(top, other)),
        kinds.further([other], [odd]),
        exceptional,
    )
    before, after = (multiples.within(end, last.astype(np.int64), kinds.entry) for end in (0, 1))
    window = Window(np.where(on_after, after.low, before.low), np.where(on_after, after.high, before.high))
    if not odd.any():
        return window
    case = np.flatnonzero(odd)
    place = multiples.further + kinds.rank[case]
    beyond = multiples.at(place, kinds.entry[case])
    gap = multiples.gap(on_after[case], place, kinds.entry[case])
    window.low[:, case] = np.maximum(window.low[:, case], np.where(gap, np.inf, beyond.low))
    window.high[:, case] = np.minimum(window.high[:, case], beyond.high)
    return window
