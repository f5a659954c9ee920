"""The best cants of chains whose transitions make trains slow down or cannot all be kept; any chains.

The speed of a class on a curve then hangs on the cants of three curves, and what it passes on a transition on
those of four. So a path is followed from the smaller chainage on with all that its end still needs: the last
two cants, the speeds run on the last curve but one, and what the last transition permits. Paths that cannot
become best are dropped by a bound from below; of paths that need the same from here on, the better is kept;
where the next transition does not slow the last curve, before it is crossed. Nothing that could be best is
dropped: the result is exact.

The paths of all chains stand in one list and go from curve to curve together. A search goes over the pairs
that keep what no lower speed can mend; a chain that has no such path is searched again over all pairs. A good
path over few of the levels comes first: levels that lose more time by themselves need not be looked at, nor
pairs of them that surely do (:mod:`cant.planning.room`).
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_alone, passed_shared
from cant.planning.chain_costs import LEADING, ChainCosts
from cant.planning.levels import Levels
from cant.planning.lexicographic import distinct_rows, least_of_groups, not_above
from cant.planning.line import Line
from cant.planning.meetings import PairList, make_pair_list
from cant.planning.neighbours import Pairs
from cant.planning.nodes import Nodes, squares
from cant.planning.paths import Free, Paths
from cant.planning.reach import spread_ranges
from cant.planning.room import Room
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
    room = None
    if not also_broken:
        few = levels.take(levels.few())
        listed = make_pair_list(meeting, few, exceptional, also_broken)
        ceiling = ChainCosts(part, few, listed).ceiling()
        levels = levels.take(not_above(levels.bound(), ceiling[chain[levels.curve], 2:]))
        room = Room.under(ceiling, part, levels)
    listed = make_pair_list(meeting, levels, exceptional, also_broken, room)
    best = _Search(part, meeting, levels, listed, target).best()
    return curves, np.where(best < 0, np.nan, levels.cant_mm[best])


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
        paths = Paths.begin(level, self._line.classes)
        self._trail = [(level, paths.node)]
        for i in range(int(costs.length.max())):
            ends = costs.length[costs.chain(paths.last)] == i + 1
            if ends.any():
                self._finish(paths.take(ends), best)
                paths = paths.take(~ends)
            if not len(paths.last):
                break
            paths = self._step(paths, ceiling)
        return best

    def _step(self, paths: Paths, ceiling: FloatArray) -> Paths:
        """Go from one curve to the next: settle the speeds of the one."""
        pairs, costs, ahead = self._pairs, self._costs, self._costs.ahead
        free = self._freely(paths)
        source, pair = spread_ranges(self._first[paths.last], self._first[paths.last + 1])
        so_far = paths.measures[:, :LEADING] + np.pad(paths.sure, ((0, 0), (2, 0)))
        ceiling = ceiling[costs.chain(paths.last)]
        some = np.flatnonzero(free.leads[source] | costs.slows_before[pair])
        source, pair = source[some], pair[some]
        keep = np.flatnonzero(not_above(so_far[source] + ahead.unsettled[pair], ceiling[source]))
        source, pair = source[keep], pair[keep]
        here = paths.last[source]
        run, time = free.run_kmh[source], free.time[source]
        slow = np.flatnonzero(costs.slows_before[pair])
        run[slow] = costs.run(here[slow], paths.left.take(source[slow]), pairs.on_before.take(pair[slow]))
        time[slow] = costs.time(here[slow], run[slow])
        measures = paths.measures[source]
        measures[:, 2:LEADING] += time
        total = measures[:, :LEADING] + ahead.settled[pair]
        good = np.flatnonzero(not_above(total, ceiling[source]) & self._may_end(total, pairs.after[pair]))
        source, pair, here, run, measures = source[good], pair[good], here[good], run[good], measures[good]
        measures[:, :2] += costs.broken[pair]
        measures[:, LEADING:] += free.rest[source]
        measures[:, 4:6] += self._approvals_of(paths, free, source, run)
        grown = Paths(
            paths.node[source],
            # Of one path, the pairs ascend with the cant after.
            paths.rank[source] * len(self._levels.curve) + pairs.after[pair],
            here,
            pairs.after[pair],
            run,
            pairs.on_after.take(pair),
            costs.sure_after[pair],
            measures,
        )
        if self._trail[1:]:
            grown = grown.take(self._best_of_alike(grown))
        grown.rank[np.argsort(grown.rank)] = np.arange(len(grown.rank))
        self._trail.append((grown.last, grown.node))
        grown.node = np.arange(len(grown.last))
        return grown

    def _freely(self, paths: Paths) -> Free:
        """Settle paths as if no transition slowed their last curve further, and see which of them lead.

        Where it does not, only the best of those with the same last cant and permission need go on.
        """
        costs, last = self._costs, paths.last
        run = costs.run(last, paths.left)
        time = costs.time(last, run)
        if not self._trail[1:]:
            nothing = np.zeros((len(last), 4))
            return Free(run, time, nothing, nothing[:, :2], np.ones(len(last), dtype=np.bool_))
        rest = self._rest(paths.last_but_one, paths.before)
        approvals = self._approvals(paths.last_but_one, last, paths.before, run)
        measures = paths.measures.copy()
        measures[:, LEADING:] += rest
        measures[:, 4:6] += approvals
        order = self._in_order(measures, paths)
        seen, _ = distinct_rows(
            np.concatenate([last[:, None], costs.permission(last, paths.left)], axis=1)[order]
        )
        leads = np.zeros(len(last), dtype=np.bool_)
        leads[order[seen]] = True
        return Free(run, time, rest, approvals, leads)

    def _approvals_of(self, paths: Paths, free: Free, source: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give number and overrun of limits passed on the last transition of paths that have grown."""
        approvals = free.approvals[source]
        if self._trail[1:]:
            with np.errstate(invalid="ignore"):
                other = np.flatnonzero((run_kmh < free.run_kmh[source]).any(axis=-1))
            at = source[other]
            approvals[other] = self._approvals(
                paths.last_but_one[at], paths.last[at], paths.before[at], run_kmh[other]
            )
        return approvals

    def _may_end(self, total: FloatArray, last: IntArray) -> BoolArray:
        """Tell which paths (s,) are no worse than others that end at their chain's last curve alike.

        Nothing further on can change what these lose, so ``total`` (s, LEADING) is all of it.
        """
        costs = self._costs
        chain = costs.chain(last)
        going_on = costs.position[self._levels.curve[last]] < costs.length[chain] - 1
        return np.asarray(going_on | not_above(total, _least_of_chain(total, chain), _TIES))

    def _finish(self, paths: Paths, best: IntArray) -> None:
        """Settle the last curve of chains that end here, and enter their best levels."""
        costs = self._costs
        run = costs.run(paths.last, paths.left)
        measures = paths.measures.copy()
        measures[:, 2:LEADING] += costs.time(paths.last, run)
        # Only paths that lose least time are weighed further.
        least = _least_of_chain(measures[:, :LEADING], costs.chain(paths.last))
        good = np.flatnonzero(not_above(measures[:, :LEADING], least, _TIES))
        paths, run, measures = paths.take(good), run[good], measures[good]
        if self._trail[1:]:
            # Asked together, for each asking costs much the same.
            levels = np.concatenate([paths.last, paths.last_but_one])
            last, beside = np.split(self._rest(levels, np.concatenate([run, paths.before])), 2)
            measures[:, LEADING:] += last
            measures[:, LEADING:] += beside
            measures[:, 4:6] += self._approvals(paths.last_but_one, paths.last, paths.before, run)
        else:
            measures[:, LEADING:] += self._rest(paths.last, run)
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

    def _in_order(self, measures: FloatArray, paths: Paths) -> IntArray:
        """Sort paths by chain, the best of each first; then the lower cant at the smaller chainage."""
        chain = self._costs.chain(paths.last)
        begin, owner = _groups(chain)
        size = np.maximum(np.maximum.reduceat(np.abs(measures), begin), 1.0) if len(begin) else measures
        exact = np.round(measures / (size[owner] * _QUANTUM))
        return np.lexsort([chain, *exact.T, paths.rank][::-1])

    def _best_of_alike(self, paths: Paths) -> IntArray:
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
