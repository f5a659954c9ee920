"""The time that paths through the levels of chains lose: of one exactly, of all from a level on at least.

A search is only as quick as its bounds are tight: here stands what a path can be sure to lose further on.
"""

from __future__ import annotations

from functools import cached_property
from itertools import pairwise
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from cant.planning.levels import Levels
from cant.planning.lexicographic import least_of_groups
from cant.planning.line import Line
from cant.planning.meetings import PairList
from cant.planning.permissible import Permitted
from cant.planning.running_time import Services

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

LEADING = 4
"""Transitions broken, their overrun, trains stopped, time lost: the measures that bound a path from below."""


class Ahead(NamedTuple):
    """The least leading measures of paths from a pair to the end of its chain, (p, LEADING) each.

    ``settled``: from the curve after on; ``unsettled``: from the curve before on.
    """

    settled: FloatArray
    unsettled: FloatArray


class ChainCosts:
    """What levels and pairs of levels cost in the leading measures.

    Parameters
    ----------
    line : Line
        Whole chains, one after the other, with limits in bands.
    levels : Levels
    pairs : PairList

    Attributes
    ----------
    broken : ndarray, shape (p, 2)
        Transitions broken and their overrun.
    sure_after : ndarray, shape (p, 2)
        Time that the pair is sure to cost the curve after beyond its own, whatever lies on its other side.
    position : ndarray of int, shape (c,)
        Place of each curve in its chain.
    length : ndarray of int, shape (q,)
        Curves of each chain.
    slows_before : ndarray of bool, shape (p,)
        Whether the pair permits less than everything on the curve before.
    """

    def __init__(self, line: Line, levels: Levels, pairs: PairList) -> None:
        self._line, self._levels, self._pairs = line, levels, pairs
        self._services = Services.of(line)
        self.broken: FloatArray = np.stack([pairs.broken, pairs.overrun], axis=-1)
        start = np.flatnonzero(np.diff(levels.chain, prepend=-1))
        self.position: IntArray = np.arange(len(levels.chain)) - start[levels.chain]
        self.length: IntArray = np.bincount(levels.chain)
        self._goes_on = self.position < self.length[levels.chain] - 1
        self._levels_at = _by_position(self.position[levels.curve], int(self.length.max()))
        self._pairs_at = _by_position(self.position[levels.curve[pairs.before]], int(self.length.max()))
        self.slows_before: BoolArray = pairs.on_before.slows
        self._extra = (
            self._extra_time(pairs.before, pairs.on_before, self.slows_before),
            self._extra_time(pairs.after, pairs.on_after, pairs.on_after.slows),
        )
        # A curve between two transitions loses at least half of what both by themselves make it lose.
        first = self.position[levels.curve[pairs.before]] == 0
        last = ~self._goes_on[levels.curve[pairs.after]]
        self._sure_before = self._extra[0] * np.where(first, 1.0, 0.5)[:, None]
        self.sure_after: FloatArray = self._extra[1] * np.where(last, 1.0, 0.5)[:, None]

    @cached_property
    def to_go(self) -> FloatArray:
        """What no path from a level to the end of its chain can undercut, (l, LEADING); inf: no path."""
        return self._to_go(self._sure_before + self.sure_after)[0]

    @cached_property
    def ahead(self) -> Ahead:
        """What no path over a pair can undercut."""
        pairs = self._pairs
        settled = self.to_go[pairs.after] + np.concatenate([self.broken, self.sure_after], axis=1)
        unsettled = settled.copy()
        unsettled[:, 2:] += self._levels.own[pairs.before] + self._sure_before
        return Ahead(settled, unsettled)

    def chain(self, level: IntArray) -> IntArray:
        """Give the chains of levels."""
        return self._levels.chain[self._levels.curve[level]]

    def run(self, level: IntArray, *beside: Permitted) -> FloatArray:
        """Give the speeds run at some levels with what the transitions beside permit, shape (s, k)."""
        up_to, planned = self._levels.alone.up_to_kmh[level], self._levels.alone.planned[level]
        for permitted in beside:
            up_to = np.minimum(up_to, permitted.up_to_kmh)
            planned = planned & permitted.planned
        return Permitted(up_to, planned).run_speed(self._line.planned_kmh[self._levels.curve[level]])

    def permission(self, level: IntArray, beside: Permitted) -> FloatArray:
        """Give rows (s, k), equal where a level and the transition beside it permit the same together."""
        planned = self._line.planned_kmh[self._levels.curve[level]]
        up_to = np.minimum(np.minimum(self._levels.alone.up_to_kmh[level], beside.up_to_kmh), planned)
        return np.where(self._levels.alone.planned[level] & beside.planned, up_to, -1.0 - up_to)

    def time(self, level: IntArray, run_kmh: FloatArray) -> FloatArray:
        """Give trains stopped and time lost at levels (s,) and speeds (s, k): shape (s, 2)."""
        services = self._services.take(self._levels.curve[level])
        return np.stack([services.stopped(run_kmh), services.lost_s(run_kmh)], axis=-1)

    def _extra_time(self, level: IntArray, beside: Permitted, slows: BoolArray) -> FloatArray:
        """Give what a transition's permission alone adds to the time of some levels, shape (s, 2)."""
        extra = np.zeros((len(level), 2))
        at = np.flatnonzero(slows)
        run = self.run(level[at], beside.take(at))
        extra[at] = self.time(level[at], run) - self._levels.own[level[at]]
        return extra

    def _to_go(self, extra: FloatArray) -> tuple[FloatArray, IntArray]:
        """Give the least from each level on where each pair costs so much extra, and the pair taken first."""
        own, pairs = self._levels.own, self._pairs
        to_go = np.concatenate([np.zeros_like(own), own], axis=1)
        choice = np.zeros(len(to_go), dtype=np.int64)
        cost = np.concatenate([self.broken, extra], axis=1)
        for level, pair in zip(self._levels_at[-2::-1], self._pairs_at[-2::-1], strict=True):
            here, least, best = least_of_groups(cost[pair] + to_go[pairs.after[pair]], pairs.before[pair])
            to_go[level[self._goes_on[self._levels.curve[level]]]] = np.inf
            to_go[here] = least
            to_go[here, 2:] += own[here]
            choice[here] = pair[best]
        return to_go, choice

    def ceiling(self) -> FloatArray:
        """Give the leading measures of a good path of each chain, (q, LEADING): no better one is worth more.

        It is the best path if transitions on both sides of a curve add up: they hardly ever do less. inf
        where there is no path.
        """
        pairs = self._pairs
        to_go, choice = self._to_go(self._extra[0] + self._extra[1])
        starts = self._levels_at[0]
        _, least, best = least_of_groups(to_go[starts], self.chain(starts))
        total = np.where(np.isfinite(least), 0.0, np.inf)
        chain = np.flatnonzero(np.isfinite(least).all(axis=1))
        level = starts[best[chain]]
        left = Permitted.everything(len(chain), self._line.classes)
        for i in range(int(self.length.max())):
            on = self.length[chain] > i + 1
            ends = chain[~on]
            total[ends, 2:] += self.time(level[~on], self.run(level[~on], left.take(~on)))
            chain, level, left = chain[on], level[on], left.take(on)
            pair = choice[level]
            total[chain, :2] += self.broken[pair]
            total[chain, 2:] += self.time(level, self.run(level, left, pairs.on_before.take(pair)))
            level, left = pairs.after[pair], pairs.on_after.take(pair)
        return total


def _by_position(position: IntArray, length: int) -> list[IntArray]:
    """Give for each of the positions 0, 1 ... which entries have it, ascending."""
    order = np.argsort(position, kind="stable")
    ends = np.searchsorted(position[order], np.arange(length + 1))
    return [order[begin:end] for begin, end in pairwise(ends)]
