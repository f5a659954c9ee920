"""The best cants of chains whose transitions make trains slow down or cannot all be kept; any chains.

The speed of a class on a curve then hangs on the cants of three curves, and what it passes on a transition on
those of four. So a path is followed from the smaller chainage on with all that its end still needs: the last
two cants, the speeds run on the last curve but one, and what the last transition permits. Paths that cannot
become best are dropped by a bound from below; of paths that need the same from here on, the better is kept.
Nothing that could be best is dropped: the result is exact.

The paths of all chains stand in one list and go from curve to curve together. A search goes over the pairs
that keep what no lower speed can mend; a chain that has no such path is searched again over all pairs. A good
path over few of the levels comes first: levels that lose more time by themselves need not be looked at.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_alone, passed_shared
from cant.planning.levels import Levels
from cant.planning.lexicographic import distinct_rows, least_of_groups, not_above
from cant.planning.line import Line
from cant.planning.meetings import PairList, make_pair_list, spread_ranges
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes, squares
from cant.planning.permissible import Permitted
from cant.planning.running_time import Services
from cant.planning.shared import Meeting
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

LEADING = 4
"""Transitions broken, their overrun, trains stopped, time lost: the measures that bound a path from below."""
_QUANTUM = 1e-8


def search_chains(
    line: Line,
    pairs: Pairs,
    nodes: Nodes,
    chains: Sequence[IntArray],
    target: Target,
    exceptional: bool,
    also_broken: bool,
) -> tuple[IntArray, FloatArray]:
    """Find the best cants of some chains.

    Parameters
    ----------
    line : Line
        n curves, with their limits in bands.
    pairs : Pairs
    nodes : Nodes
        Of the same curves.
    chains : sequence of ndarray of int
        Each in order of chainage.
    target : Target
    exceptional : bool
        Last tier allowed.
    also_broken : bool
        Also over pairs that do not keep what no lower speed can mend.

    Returns
    -------
    curves : ndarray of int, shape (c,)
        Of the chains, in their order.
    cant_mm : ndarray, shape (c,)
        nan on a chain without a path.
    """
    curves = np.concatenate(chains)
    chain = np.repeat(np.arange(len(chains)), [len(some) for some in chains])
    part = line.take(curves)
    levels = Levels.of(part, nodes.take(curves), chain, exceptional)
    meeting = Meeting.of(line, pairs.take(pairs.after(len(line))[curves[levels.begins]]))
    if not also_broken:
        few = levels.take(levels.few())
        listed = make_pair_list(meeting, few, exceptional, also_broken)
        ceiling = _Search(part, meeting, few, listed, target).ceiling()[chain[levels.curve]]
        levels = levels.take(not_above(levels.bound(), ceiling[:, 2:]))
    listed = make_pair_list(meeting, levels, exceptional, also_broken)
    best = _Search(part, meeting, levels, listed, target).best()
    return curves, np.where(best < 0, np.nan, levels.cant_mm[best])


@dataclass
class _Paths:
    """Paths of several chains that end at the curve of one position; s of them.

    ``level`` (s, i + 1) numbers of the levels; ``before`` (s, k) the speeds run on the last curve but one,
    nan on the first; ``left`` what the last transition permits on the last curve, ``extra`` (s, 2) the time
    that this alone costs there; ``measures`` (s, 8): the leading four, approvals, overrun, square, sum of
    cants, of everything that is settled.
    """

    level: IntArray
    before: FloatArray
    left: Permitted
    extra: FloatArray
    measures: FloatArray

    def take(self, at: IntArray | BoolArray) -> _Paths:
        return _Paths(self.level[at], self.before[at], self.left.take(at), self.extra[at], self.measures[at])


class _Search:
    """The search over several chains.

    Parameters
    ----------
    line : Line
        Whole chains, one after the other, with limits in bands.
    meeting : Meeting
        The transitions between their curves.
    levels : Levels
    pairs : PairList
    target : Target
    """

    def __init__(self, line: Line, meeting: Meeting, levels: Levels, pairs: PairList, target: Target) -> None:
        self._line, self._meeting, self._levels, self._pairs = line, meeting, levels, pairs
        self._target = target
        self._services = Services.of(line)
        self._own = levels.own
        self._first = np.searchsorted(pairs.before, np.arange(len(levels.curve) + 1))
        self._broken = np.stack([pairs.broken, pairs.overrun], axis=-1)
        self._extra = (
            self._extra_time(pairs.before, pairs.on_before),
            self._extra_time(pairs.after, pairs.on_after),
        )
        start = np.flatnonzero(np.diff(levels.chain, prepend=-1))
        self._position = np.arange(len(levels.chain)) - start[levels.chain]
        self._length = np.bincount(levels.chain)

    # -- time -------------------------------------------------------------------------------------------

    def _run(self, level: IntArray, *beside: Permitted) -> FloatArray:
        """Give the speeds run at some levels with what the transitions beside permit, shape (s, k)."""
        up_to, planned = self._levels.alone.up_to_kmh[level], self._levels.alone.planned[level]
        for permitted in beside:
            up_to = np.minimum(up_to, permitted.up_to_kmh)
            planned = planned & permitted.planned
        return Permitted(up_to, planned).run_speed(self._line.planned_kmh[self._levels.curve[level]])

    def _time(self, level: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give trains stopped and time lost at levels (s,) and speeds (s, k): shape (s, 2)."""
        services = self._services.take(self._levels.curve[level])
        return np.stack([services.stopped(run_kmh), services.lost_s(run_kmh)], axis=-1)

    def _extra_time(self, level: IntArray, beside: Permitted) -> FloatArray:
        """Give what a transition's permission alone adds to the time of some levels, shape (s, 2)."""
        extra = np.zeros((len(level), 2))
        at = np.flatnonzero((~beside.planned | np.isfinite(beside.up_to_kmh)).any(axis=-1))
        run = self._run(level[at], beside.take(at))
        extra[at] = self._time(level[at], run) - self._own[level[at]]
        return extra

    # -- bounds -----------------------------------------------------------------------------------------

    def _to_go(self, share: float) -> tuple[FloatArray, IntArray]:
        """Give the least leading measures from each level to the end of its chain, and the pair taken first.

        ``share`` of the time that each transition by itself makes a curve lose: a curve between two loses at
        least half of both together (then it is a bound from below), and hardly more than both.

        Returns
        -------
        to_go : ndarray, shape (l, LEADING)
            inf where no path leads to the end.
        choice : ndarray of int, shape (l,)
        """
        levels, pairs = self._levels, self._pairs
        to_go = np.concatenate([np.zeros_like(self._own), self._own], axis=1)
        choice = np.zeros(len(to_go), dtype=np.int64)
        cost = np.concatenate([self._broken, share * (self._extra[0] + self._extra[1])], axis=1)
        position = self._position[levels.curve]
        goes_on = position < (self._length[levels.chain] - 1)[levels.curve]
        at_position = position[pairs.before]
        for i in range(int(self._length.max()) - 2, -1, -1):
            pair = np.flatnonzero(at_position == i)
            here, least, best = least_of_groups(cost[pair] + to_go[pairs.after[pair]], pairs.before[pair])
            to_go[(position == i) & goes_on] = np.inf
            to_go[here] = least
            to_go[here, 2:] += self._own[here]
            choice[here] = pair[best]
        return to_go, choice

    def ceiling(self) -> FloatArray:
        """Give the leading measures of a good path of each chain, (q, LEADING): no better one is worth more.

        inf where there is no path.
        """
        pairs = self._pairs
        to_go, choice = self._to_go(1.0)
        starts = np.flatnonzero(self._position[self._levels.curve] == 0)
        _, least, best = least_of_groups(to_go[starts], self._levels.chain[self._levels.curve[starts]])
        total = np.where(np.isfinite(least), 0.0, np.inf)
        chain = np.flatnonzero(np.isfinite(least).all(axis=1))
        level, left = starts[best[chain]], _free(len(chain), self._line.classes)
        for i in range(int(self._length.max())):
            on = self._length[chain] > i + 1
            ends = chain[~on]
            total[ends, 2:] += self._time(level[~on], self._run(level[~on], left.take(~on)))
            chain, level, left = chain[on], level[on], left.take(on)
            pair = choice[level]
            total[chain, :2] += self._broken[pair]
            total[chain, 2:] += self._time(level, self._run(level, left, pairs.on_before.take(pair)))
            level, left = pairs.after[pair], pairs.on_after.take(pair)
        return total

    # -- the way forward --------------------------------------------------------------------------------

    def best(self) -> IntArray:
        """Give the best level of each curve by number, shape (c,); -1 where its chain has no path."""
        levels, k = self._levels, self._line.classes
        best = np.full(len(levels.chain), -1, dtype=np.int64)
        ceiling, (to_go, _) = self.ceiling(), self._to_go(0.5)
        level = np.flatnonzero(self._position[levels.curve] == 0)
        level = level[np.isfinite(ceiling[self._chain(level)]).all(axis=1)]
        level = level[not_above(to_go[level], ceiling[self._chain(level)])]
        paths = _Paths(
            level[:, None],
            np.full((len(level), k), np.nan),
            _free(len(level), k),
            np.zeros((len(level), 2)),
            np.zeros((len(level), 8)),
        )
        for i in range(int(self._length.max())):
            ends = self._length[self._chain(paths.level[:, -1])] == i + 1
            self._finish(paths.take(ends), ceiling, best)
            paths = self._step(paths.take(~ends), ceiling, to_go)
        return best

    def _chain(self, level: IntArray) -> IntArray:
        return self._levels.chain[self._levels.curve[level]]

    def _step(self, paths: _Paths, ceiling: FloatArray, to_go: FloatArray) -> _Paths:
        """Go from one curve to the next: settle the speeds of the one."""
        pairs, last = self._pairs, paths.level[:, -1]
        source, pair = spread_ranges(self._first[last], self._first[last + 1])
        here, after = last[source], pairs.after[pair]
        ceiling = ceiling[self._chain(here)]
        to_come = to_go[after]
        to_come[:, :2] += self._broken[pair]
        to_come[:, 2:] += self._extra[1][pair] / 2
        low = paths.measures[source, :LEADING] + to_come
        low[:, 2:] += self._own[here] + (paths.extra[source] + self._extra[0][pair]) / 2
        keep = np.flatnonzero(not_above(low, ceiling))
        source, pair, here = source[keep], pair[keep], here[keep]
        run = self._run(here, paths.left.take(source), pairs.on_before.take(pair))
        measures = paths.measures[source]
        measures[:, 2:LEADING] += self._time(here, run)
        good = np.flatnonzero(not_above(measures[:, :LEADING] + to_come[keep], ceiling[keep]))
        source, pair, here, run, measures = source[good], pair[good], here[good], run[good], measures[good]
        measures[:, :2] += self._broken[pair]
        measures[:, LEADING:] += self._rest(here, run)
        measures[:, 4:6] += self._approvals(paths, source, run)
        grown = _Paths(
            np.concatenate([paths.level[source], pairs.after[pair][:, None]], axis=1),
            run,
            pairs.on_after.take(pair),
            self._extra[1][pair],
            measures,
        )
        return grown.take(self._best_of_alike(grown))

    def _finish(self, paths: _Paths, ceiling: FloatArray, best: IntArray) -> None:
        """Settle the last curve of chains that end here, and enter their best levels."""
        last = paths.level[:, -1]
        run = self._run(last, paths.left)
        measures = paths.measures.copy()
        measures[:, 2:LEADING] += self._time(last, run)
        good = np.flatnonzero(not_above(measures[:, :LEADING], ceiling[self._chain(last)]))
        paths, run, measures, last = paths.take(good), run[good], measures[good], last[good]
        measures[:, LEADING:] += self._rest(last, run)
        measures[:, 4:6] += self._approvals(paths, np.arange(len(last)), run)
        order = self._in_order(measures, paths.level)
        chain = self._chain(last[order])
        level = paths.level[order[np.flatnonzero(np.diff(chain, prepend=-1))]]
        best[self._levels.curve[level]] = level

    def _rest(self, level: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give approvals, overrun, square and cant at levels (s,) and speeds (s, k): shape (s, 4)."""
        seen, place = distinct_rows(np.concatenate([level[:, None], run_kmh], axis=1))
        level, run = level[seen], run_kmh[seen]
        line, cant = self._line.take(self._levels.curve[level]), self._levels.cant_mm[level]
        passed = passed_alone(line, cant[:, None], run)
        square = squares(line, cant[:, None], run, self._target)
        return np.stack([passed.count, passed.total, square, cant], axis=-1)[place]

    def _approvals(self, paths: _Paths, source: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give number and overrun of the limits passed on the transitions before the last curve, (s, 2)."""
        if paths.level.shape[1] < 2 or not len(source):
            return np.zeros((len(source), 2))
        before, here = paths.level[source, -2], paths.level[source, -1]
        run = np.minimum(paths.before[source], run_kmh)
        seen, place = distinct_rows(np.concatenate([before[:, None], here[:, None], run], axis=1))
        before, here, run = before[seen], here[seen], run[seen]
        meeting = self._meeting.take(np.searchsorted(self._levels.begins, self._levels.curve[before]))
        cants = (self._levels.cant_mm[before][:, None], self._levels.cant_mm[here][:, None])
        passed = passed_shared(meeting, cants, run)
        if not passed.by_rule:
            return np.zeros((len(source), 2))
        return np.stack([passed.count, passed.total], axis=-1)[place]

    # -- the order of paths -----------------------------------------------------------------------------

    def _in_order(self, measures: FloatArray, level: IntArray) -> IntArray:
        """Sort paths by chain, the best of each first; then the lower cant at the smaller chainage."""
        chain = self._chain(level[:, 0])
        size = np.ones((len(self._length), measures.shape[1]))
        np.maximum.at(size, chain, np.abs(measures))
        exact = np.round(measures / (size[chain] * _QUANTUM))
        return np.lexsort([chain, *exact.T, *level.T][::-1])

    def _best_of_alike(self, paths: _Paths) -> IntArray:
        """Of the paths that need the same from here on, give the best: indices."""
        if paths.level.shape[1] == 2:
            return np.arange(len(paths.level))
        order = self._in_order(paths.measures, paths.level)
        need = np.concatenate([paths.level[:, -2:], paths.before], axis=1)
        seen, _ = distinct_rows(need[order])
        return np.asarray(order[np.sort(seen)])


def _free(n: int, k: int) -> Permitted:
    """Give what permits everything."""
    return Permitted(np.full((n, k), np.inf), np.ones((n, k), dtype=np.bool_))
