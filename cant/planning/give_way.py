"""The best cants of any chain, also where its transitions make trains slow down or cannot all be kept.

The speed of a class on a curve then hangs on the cants of three curves, and what it passes on a transition on
those of four. So a path is followed from the smaller chainage on with all that its end still needs: the last
two cants, the speeds run on the last curve but one, and what the last transition permits. Paths that cannot
become best are dropped by a bound from below; of paths that need the same from here on, the better is kept.
Nothing that could be best is dropped: the result is exact.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_alone, passed_shared, time_lost, trains_stopped
from cant.planning.chain_choice import Stage, shortest_path
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.meetings import PairTable
from cant.planning.nodes import squares
from cant.planning.permissible import Permitted
from cant.planning.shared import Meeting
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

LEADING = 4
"""Transitions broken, their overrun, trains stopped, time lost: the measures that bound a path from below."""
_QUANTUM = 1e-8


@dataclass
class Member:
    """One curve of a chain with the levels that it may take.

    Attributes
    ----------
    line : Line
        One curve.
    cant_mm : ndarray, shape (a,)
    alone : Permitted
        What the curve by itself permits, shape (a, k).
    """

    line: Line
    cant_mm: FloatArray
    alone: Permitted

    def run(self, left: Permitted | None, right: Permitted | None, level: IntArray) -> FloatArray:
        """Give the speeds run at some levels with what the transitions beside permit, shape (s, k)."""
        up_to, planned = self.alone.up_to_kmh[level], self.alone.planned[level]
        for beside in (left, right):
            if beside is not None:
                up_to = np.minimum(up_to, beside.up_to_kmh)
                planned = planned & beside.planned
        return Permitted(up_to, planned).run_speed(self.line.planned_kmh)

    def time(self, run_kmh: FloatArray) -> FloatArray:
        """Give trains stopped and time lost at speeds (s, k): shape (s, 2)."""
        run = run_kmh[:, None, :]
        return np.stack([trains_stopped(self.line, run)[:, 0], time_lost(self.line, run)[:, 0]], axis=-1)

    def rest(self, run_kmh: FloatArray, level: IntArray, target: Target) -> FloatArray:
        """Give approvals, overrun, square and cant at levels (s,) and speeds (s, k): shape (s, 4)."""
        cant, run = self.cant_mm[level][:, None, None], run_kmh[:, None, :]
        passed = passed_alone(self.line, cant, run)
        square = squares(self.line, cant, run, target)
        return np.stack([passed.count[:, 0], passed.total[:, 0], square[:, 0], self.cant_mm[level]], axis=-1)


@dataclass
class Link:
    """The transition between two members with the table of all pairs of their levels."""

    meeting: Meeting
    table: PairTable

    def permitted(self, before: IntArray, after: IntArray) -> tuple[Permitted, Permitted]:
        """Give what it permits on the two curves at pairs of levels, shape (s, k)."""
        one, other = self.table.before, self.table.after
        return (
            Permitted(one.up_to_kmh[before, after], one.planned[before, after]),
            Permitted(other.up_to_kmh[before, after], other.planned[before, after]),
        )

    def broken(self, before: IntArray, after: IntArray) -> FloatArray:
        """Give 1 where the pair is not allowed, and its overrun: shape (s, 2)."""
        hard = self.table.hard[before, after]
        return np.stack([~hard, np.where(hard, 0.0, self.table.hard_overrun[before, after])], axis=-1)

    def approvals(
        self, before: FloatArray, after: FloatArray, run_before: FloatArray, run_after: FloatArray
    ) -> FloatArray:
        """Give number and overrun of normal limits passed at cants (s,) and speeds (s, k): shape (s, 2)."""
        passed = passed_shared(
            self.meeting,
            (before[:, None, None], after[:, None, None]),
            np.minimum(run_before, run_after)[:, None, :],
        )
        if not passed.by_rule:
            return np.zeros((len(before), 2))
        return np.stack([np.asarray(passed.count)[:, 0], np.asarray(passed.total)[:, 0]], axis=-1)


@dataclass
class _Paths:
    """Paths that end at one curve; s of them.

    ``level`` (s, i + 1); ``before`` (s, k) the speeds run on the last curve but one; ``left`` what the last
    transition permits on the last curve; ``measures`` (s, 8): the leading four, approvals, overrun, square,
    sum of cants, of everything that is settled.
    """

    level: IntArray
    before: FloatArray | None
    left: Permitted | None
    measures: FloatArray

    def take(self, at: IntArray) -> _Paths:
        return _Paths(
            self.level[at],
            None if self.before is None else self.before[at],
            None if self.left is None else Permitted(self.left.up_to_kmh[at], self.left.planned[at]),
            self.measures[at],
        )


def _extra(member: Member, beside: Permitted, own_time: FloatArray) -> FloatArray:
    """Give what a transition's permission alone adds to a curve's time at every pair, shape (a, b, 2).

    ``beside`` has the levels of the member first.
    """
    a, b, k = beside.up_to_kmh.shape
    level = np.repeat(np.arange(a), b)
    flat = Permitted(beside.up_to_kmh.reshape(a * b, k), beside.planned.reshape(a * b, k))
    time = member.time(member.run(flat, None, level)).reshape(a, b, 2)
    return time - own_time[:, None, :]


def _turned(permitted: Permitted) -> Permitted:
    return Permitted(permitted.up_to_kmh.swapaxes(0, 1), permitted.planned.swapaxes(0, 1))


class ChainSearch:
    """The search over one chain.

    Parameters
    ----------
    members : sequence of Member
        In order of chainage.
    links : sequence of Link
        One fewer.
    target : Target
    """

    def __init__(self, members: Sequence[Member], links: Sequence[Link], target: Target) -> None:
        self.members = members
        self.links = links
        self.target = target
        self._own = [
            member.time(member.run(None, None, np.arange(len(member.cant_mm)))) for member in members
        ]
        self._extras = []
        for i, link in enumerate(links):
            on_before = _extra(members[i], link.table.before, self._own[i])
            on_after = _extra(members[i + 1], _turned(link.table.after), self._own[i + 1]).swapaxes(0, 1)
            self._extras.append((on_before, on_after))
        self._to_go = self._bounds_from_below()

    def best(self) -> list[int]:
        """Give the best level of each curve."""
        ceiling = self._ceiling()
        first = len(self.members[0].cant_mm)
        paths = _Paths(np.arange(first)[:, None], None, None, np.zeros((first, 8)))
        for i in range(len(self.links)):
            paths = self._step(i, paths, ceiling)
        return self._finish(paths)

    def _bounds_from_below(self) -> list[FloatArray]:
        """Give for each curve and level the least that is still to come, shape (a, LEADING).

        A curve between two transitions loses at least half of what each by itself would make it lose.
        """
        last = self._own[-1]
        to_go = [np.concatenate([np.zeros((len(last), 2)), last], axis=1)]
        for i in range(len(self.links) - 1, -1, -1):
            pair = self._pair_bound(i) + to_go[0][None, :, :]
            best = _lexicographic_least(pair)
            best[:, 2:] += self._own[i]
            to_go.insert(0, best)
        return to_go

    def _pair_bound(self, i: int) -> FloatArray:
        table = self.links[i].table
        broken = np.stack([~table.hard, np.where(table.hard, 0.0, table.hard_overrun)], axis=-1)
        on_before, on_after = self._extras[i]
        return np.concatenate([broken, (on_before + on_after) / 2], axis=-1)

    def _ceiling(self) -> FloatArray:
        """Give the leading measures of a good path, shape (LEADING,): no better one is worth more."""
        stages = []
        for i, own in enumerate(self._own):
            measures = [np.zeros(len(own)), np.zeros(len(own)), own[:, 0], own[:, 1]]
            if i == len(self.links):
                stages.append(Stage(measures))
                continue
            pair = self._pair_bound(i)
            pair[..., 2:] *= 2
            every = np.ones(pair.shape[:2], dtype=np.bool_)
            stages.append(Stage(measures, every, [pair[..., j] for j in range(LEADING)]))
        path = shortest_path(stages)
        if path is None:
            message = "a chain without levels"
            raise ValueError(message)
        return self._leading_of(np.array(path)[None, :])

    def _leading_of(self, level: IntArray) -> FloatArray:
        total = np.zeros(LEADING)
        for i, member in enumerate(self.members):
            left = self.links[i - 1].permitted(level[:, i - 1], level[:, i])[1] if i > 0 else None
            right = None
            if i < len(self.links):
                right = self.links[i].permitted(level[:, i], level[:, i + 1])[0]
                total[:2] += self.links[i].broken(level[:, i], level[:, i + 1])[0]
            total[2:] += member.time(member.run(left, right, level[:, i]))[0]
        return total

    def _step(self, i: int, paths: _Paths, ceiling: FloatArray) -> _Paths:
        """Go from curve i to the next: settle the speeds of curve i."""
        member, link = self.members[i], self.links[i]
        ahead = len(self.members[i + 1].cant_mm)
        source = np.repeat(np.arange(len(paths.level)), ahead)
        after = np.tile(np.arange(ahead), len(paths.level))
        here = paths.level[source, -1]
        right, left_of_next = link.permitted(here, after)
        left = paths.left
        beside = None if left is None else Permitted(left.up_to_kmh[source], left.planned[source])
        run = member.run(beside, right, here)
        measures = paths.measures[source]
        measures[:, :2] += link.broken(here, after)
        measures[:, 2:LEADING] += member.time(run)
        low = measures[:, :LEADING] + self._to_go[i + 1][after]
        low[:, 2:] += self._extras[i][1][here, after] / 2
        keep = np.flatnonzero(_not_above(low, ceiling))
        source, after, here, run, measures = source[keep], after[keep], here[keep], run[keep], measures[keep]
        measures[:, LEADING:] += member.rest(run, here, self.target)
        if i > 0 and paths.before is not None:
            measures[:, 4:6] += self._approvals_before(i, paths, source, here, run)
        grown = _Paths(
            np.concatenate([paths.level[source], after[:, None]], axis=1),
            run,
            Permitted(left_of_next.up_to_kmh[keep], left_of_next.planned[keep]),
            measures,
        )
        return grown.take(_best_of_alike(grown))

    def _approvals_before(
        self, i: int, paths: _Paths, source: IntArray, here: IntArray, run: FloatArray
    ) -> FloatArray:
        before_cant = self.members[i - 1].cant_mm[paths.level[source, -2]]
        before_run = paths.before[source] if paths.before is not None else run
        return self.links[i - 1].approvals(before_cant, self.members[i].cant_mm[here], before_run, run)

    def _finish(self, paths: _Paths) -> list[int]:
        i = len(self.members) - 1
        member, here = self.members[i], paths.level[:, -1]
        run = member.run(paths.left, None, here)
        measures = paths.measures.copy()
        measures[:, 2:LEADING] += member.time(run)
        measures[:, LEADING:] += member.rest(run, here, self.target)
        measures[:, 4:6] += self._approvals_before(i, paths, np.arange(len(here)), here, run)
        order = _in_order(measures, paths.level)
        return [int(level) for level in paths.level[order[0]]]


def _lexicographic_least(measures: FloatArray) -> FloatArray:
    """Give the least row along axis 1 of (a, b, c), c measures in their order: (a, c)."""
    left: BoolArray = np.ones(measures.shape[:2], dtype=np.bool_)
    for j in range(measures.shape[2]):
        value = np.where(left, measures[:, :, j], np.inf)
        least = value.min(axis=1, keepdims=True)
        left &= value <= least + slack(least)
    return np.asarray(measures[np.arange(len(measures)), np.argmax(left, axis=1)])


def _not_above(low: FloatArray, ceiling: FloatArray) -> BoolArray:
    """Tell which rows (s, c) are not larger than a row (c,), in the order of the measures."""
    above: BoolArray = np.zeros(len(low), dtype=np.bool_)
    level: BoolArray = np.ones(len(low), dtype=np.bool_)
    for j in range(low.shape[1]):
        room = 10 * slack(ceiling[j])
        above |= level & (low[:, j] > ceiling[j] + room)
        level &= np.abs(low[:, j] - ceiling[j]) <= room
    return ~above


def _in_order(measures: FloatArray, level: IntArray) -> IntArray:
    """Sort paths, the best first: by the measures, then the lower cant at the smaller chainage."""
    size = np.maximum(1.0, np.abs(measures).max(axis=0))
    exact = np.round(measures / (size * _QUANTUM))
    keys = [*exact.T, *level.T]
    return np.lexsort(keys[::-1])


def _best_of_alike(paths: _Paths) -> IntArray:
    """Of the paths that need the same from here on, give the best: indices."""
    if paths.before is None or not len(paths.level):
        return np.arange(len(paths.level))
    order = _in_order(paths.measures, paths.level)
    need = np.concatenate([paths.level[:, -2:], np.nan_to_num(paths.before, nan=-1.0)], axis=1)
    _, first = np.unique(need[order], axis=0, return_index=True)
    return np.asarray(order[np.sort(first)])
