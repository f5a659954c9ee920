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
from cant.planning.chain_costs import LEADING, ChainCosts
from cant.planning.levels import Levels
from cant.planning.lexicographic import distinct_rows, least_of_groups, not_above
from cant.planning.line import Line
from cant.planning.meetings import PairList, make_pair_list, spread_ranges
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes, squares
from cant.planning.permissible import Permitted
from cant.planning.shared import Meeting
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_QUANTUM = 1e-8
_TIES = 100
"""Time lost this many times further apart than what counts as equal is surely not equal."""


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
        ceiling = ChainCosts(part, few, listed).ceiling()[chain[levels.curve]]
        levels = levels.take(not_above(levels.bound(), ceiling[:, 2:]))
    listed = make_pair_list(meeting, levels, exceptional, also_broken)
    best = _Search(part, meeting, levels, listed, target).best()
    return curves, np.where(best < 0, np.nan, levels.cant_mm[best])


@dataclass
class _Paths:
    """Paths of several chains that end at the curve of one position; s of them, chain after chain.

    Attributes
    ----------
    node : ndarray of int, shape (s,)
        Where the path stands in the trail of this position.
    rank : ndarray of int, shape (s,)
        Ascending with the cants of a chain, the smaller chainages first.
    last_but_one, last : ndarray of int, shape (s,)
        Numbers of the last two levels; the first of them -1 on the first curve.
    before : ndarray, shape (s, k)
        Speeds run on the last curve but one.
    left : Permitted
        What the last transition permits on the last curve.
    sure : ndarray, shape (s, 2)
        Time that this alone is sure to cost there.
    measures : ndarray, shape (s, 8)
        The leading four, approvals, overrun, square, sum of cants: the leading ones and those of transitions
        up to the last curve but one, those of curves by themselves up to the one before.
    """

    node: IntArray
    rank: IntArray
    last_but_one: IntArray
    last: IntArray
    before: FloatArray
    left: Permitted
    sure: FloatArray
    measures: FloatArray

    @classmethod
    def begin(cls, level: IntArray, k: int) -> _Paths:
        """Begin a path at each of some levels."""
        s = len(level)
        return cls(
            node=np.arange(s),
            rank=level,
            last_but_one=np.full(s, -1, dtype=np.int64),
            last=level,
            before=np.full((s, k), np.nan),
            left=Permitted.everything(s, k),
            sure=np.zeros((s, 2)),
            measures=np.zeros((s, 8)),
        )

    def take(self, at: IntArray | BoolArray) -> _Paths:
        return _Paths(
            self.node[at],
            self.rank[at],
            self.last_but_one[at],
            self.last[at],
            self.before[at],
            self.left.take(at),
            self.sure[at],
            self.measures[at],
        )


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
        self._costs = ChainCosts(line, levels, pairs)
        self._first = np.searchsorted(pairs.before, np.arange(len(levels.curve) + 1))
        self._trail: list[tuple[IntArray, IntArray]] = []

    def best(self) -> IntArray:
        """Give the best level of each curve by number, shape (c,); -1 where its chain has no path."""
        costs, levels = self._costs, self._levels
        best = np.full(len(levels.chain), -1, dtype=np.int64)
        ceiling, to_go = costs.ceiling(), costs.to_go
        level = np.flatnonzero(costs.position[levels.curve] == 0)
        level = level[np.isfinite(ceiling[costs.chain(level)]).all(axis=1)]
        level = level[not_above(to_go[level], ceiling[costs.chain(level)])]
        paths = _Paths.begin(level, self._line.classes)
        self._trail = [(level, paths.node)]
        for i in range(int(costs.length.max())):
            ends = costs.length[costs.chain(paths.last)] == i + 1
            if ends.any():
                self._finish(paths.take(ends), best)
                paths = paths.take(~ends)
            paths = self._step(paths, ceiling)
        return best

    def _step(self, paths: _Paths, ceiling: FloatArray) -> _Paths:
        """Go from one curve to the next: settle the speeds of the one."""
        pairs, costs, ahead = self._pairs, self._costs, self._costs.ahead
        source, pair = spread_ranges(self._first[paths.last], self._first[paths.last + 1])
        so_far = paths.measures[:, :LEADING] + np.pad(paths.sure, ((0, 0), (2, 0)))
        ceiling = ceiling[costs.chain(paths.last)]
        keep = np.flatnonzero(not_above(so_far[source] + ahead.unsettled[pair], ceiling[source]))
        source, pair = source[keep], pair[keep]
        here = paths.last[source]
        run = costs.run(here, paths.left.take(source), pairs.on_before.take(pair))
        measures = paths.measures[source]
        measures[:, 2:LEADING] += costs.time(here, run)
        good = np.flatnonzero(not_above(measures[:, :LEADING] + ahead.settled[pair], ceiling[source]))
        source, pair, here, run, measures = source[good], pair[good], here[good], run[good], measures[good]
        measures[:, :2] += costs.broken[pair]
        if self._trail[1:]:
            measures[:, LEADING:] += self._rest(paths.last_but_one[source], paths.before[source])
            measures[:, 4:6] += self._approvals(paths.last_but_one[source], here, paths.before[source], run)
        rank = np.empty(len(source), dtype=np.int64)
        rank[np.lexsort((pairs.after[pair], paths.rank[source]))] = np.arange(len(source))
        grown = _Paths(
            paths.node[source],
            rank,
            here,
            pairs.after[pair],
            run,
            pairs.on_after.take(pair),
            costs.sure_after[pair],
            measures,
        )
        if self._trail[1:]:
            grown = grown.take(self._best_of_alike(grown))
        self._trail.append((grown.last, grown.node))
        grown.node = np.arange(len(grown.last))
        return grown

    def _finish(self, paths: _Paths, best: IntArray) -> None:
        """Settle the last curve of chains that end here, and enter their best levels."""
        costs = self._costs
        run = costs.run(paths.last, paths.left)
        measures = paths.measures.copy()
        measures[:, 2:LEADING] += costs.time(paths.last, run)
        # Only paths that lose least time are weighed further.
        least = _least_of_chain(measures[:, :LEADING], costs.chain(paths.last))
        good = np.flatnonzero(not_above(measures[:, :LEADING], least, _TIES))
        paths, run, measures = paths.take(good), run[good], measures[good]
        measures[:, LEADING:] += self._rest(paths.last, run)
        if self._trail[1:]:
            measures[:, LEADING:] += self._rest(paths.last_but_one, paths.before)
            measures[:, 4:6] += self._approvals(paths.last_but_one, paths.last, paths.before, run)
        order = self._in_order(measures, paths)
        chain = costs.chain(paths.last[order])
        node = paths.node[order[np.flatnonzero(np.diff(chain, prepend=-1))]]
        for level, source in reversed(self._trail):
            best[self._levels.curve[level[node]]] = level[node]
            node = source[node]

    # -- what decides among paths that lose as much time ---------------------------------------------------

    def _rest(self, level: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give approvals, overrun, square and cant at levels (s,) and speeds (s, k): shape (s, 4)."""
        seen, place = distinct_rows(np.concatenate([level[:, None], run_kmh], axis=1))
        level, run = level[seen], run_kmh[seen]
        line, cant = self._line.take(self._levels.curve[level]), self._levels.cant_mm[level]
        passed = passed_alone(line, cant[:, None], run)
        square = squares(line, cant[:, None], run, self._target)
        return np.stack([passed.count, passed.total, square, cant], axis=-1)[place]

    def _approvals(
        self, before: IntArray, here: IntArray, before_kmh: FloatArray, here_kmh: FloatArray
    ) -> FloatArray:
        """Give number and overrun of the limits passed between levels (s,) at speeds (s, k): (s, 2)."""
        if not len(before):
            return np.zeros((0, 2))
        run = np.minimum(before_kmh, here_kmh)
        seen, place = distinct_rows(np.concatenate([before[:, None], here[:, None], run], axis=1))
        before, here, run = before[seen], here[seen], run[seen]
        meeting = self._meeting.take(np.searchsorted(self._levels.begins, self._levels.curve[before]))
        cants = (self._levels.cant_mm[before][:, None], self._levels.cant_mm[here][:, None])
        passed = passed_shared(meeting, cants, run)
        if not passed.by_rule:
            return np.zeros((len(place), 2))
        return np.stack([passed.count, passed.total], axis=-1)[place]

    def _in_order(self, measures: FloatArray, paths: _Paths) -> IntArray:
        """Sort paths by chain, the best of each first; then the lower cant at the smaller chainage."""
        chain = self._costs.chain(paths.last)
        begin, owner = _groups(chain)
        size = np.maximum(np.maximum.reduceat(np.abs(measures), begin), 1.0) if len(begin) else measures
        exact = np.round(measures / (size[owner] * _QUANTUM))
        return np.lexsort([chain, *exact.T, paths.rank][::-1])

    def _best_of_alike(self, paths: _Paths) -> IntArray:
        """Of the paths that need the same from here on, give the best: indices."""
        order = self._in_order(paths.measures, paths)
        need = np.concatenate([paths.last_but_one[:, None], paths.last[:, None], paths.before], axis=1)
        seen, _ = distinct_rows(need[order])
        return np.asarray(order[np.sort(seen)])


def _groups(chain: IntArray) -> tuple[IntArray, IntArray]:
    """Give where the paths of each chain begin, and the number of each path's group; chains ascend."""
    new = np.diff(chain, prepend=-1) != 0
    return np.flatnonzero(new), np.cumsum(new) - 1


def _least_of_chain(measures: FloatArray, chain: IntArray) -> FloatArray:
    """Give for each path (s, c) the measures of the best of its chain; chains ascend."""
    _, least, _ = least_of_groups(measures, chain)
    return np.asarray(least[_groups(chain)[1]])
