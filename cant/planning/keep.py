"""``Keep within``: today's cants stay where they are nearly as good: no tamping for nothing.

Chains do not touch each other, so all of a block take the same step at once: first every chain all that is
within its reach, then those that cannot their first, their second ...
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import (
    Assessment,
    Passed,
    assess,
    hard_kept,
    passed_alone,
    passed_shared,
    shared_hard_kept,
)
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.neighbours import Chains, Pairs
from cant.planning.running_time import TimeLost
from cant.planning.shared import Meeting

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

SAME_MM = 1e-6
"""Cants closer than this [mm] are the same."""
BLOCK = 1000
"""Curves looked at together, about: keeps their arrays within the processor's cache."""


def keep_today(
    line: Line, pairs: Pairs, cant_mm: FloatArray, within_mm: float, keepable: BoolArray, exceptional: bool
) -> FloatArray:
    """Put today's cants in the place of the best where they lie within reach and cost nothing.

    First all those of a chain together, else one by one from the smaller chainage on.

    Parameters
    ----------
    line : Line
        n curves.
    pairs : Pairs
    cant_mm : ndarray, shape (n,)
        Best cants [mm]; nan where the curve is not planned.
    within_mm : float
        Reach [mm].
    keepable : ndarray of bool, shape (n,)
        Curves whose cant may be exchanged.
    exceptional : bool

    Returns
    -------
    ndarray, shape (n,)
    """
    today = line.cant_today_mm[:, 0]
    with np.errstate(invalid="ignore"):
        away = np.abs(today - cant_mm)
        reach = keepable & (away <= within_mm + SAME_MM) & (away > SAME_MM)
    result = cant_mm.copy()
    after = pairs.after(len(line))
    place = np.zeros(len(line), dtype=np.int64)
    for curves, begin in _blocks(pairs, reach):
        place[curves] = np.arange(len(curves))
        own = pairs.take(after[curves][after[curves] >= 0])
        own.first, own.second = place[own.first], place[own.second]
        part = _Part(line.take(curves).with_bands(), own, begin, reach[curves], exceptional)
        result[curves] = part.kept(cant_mm[curves])
    return result


def _blocks(pairs: Pairs, reach: BoolArray) -> Iterator[tuple[IntArray, IntArray]]:
    """Yield whole chains with anything in reach, lone curves as chains of one, and where each begins."""
    chains = Chains.of(pairs)
    lone = reach.copy()
    lone[chains.members] = False
    groups = chains.take(chains.any(reach)) + list(np.flatnonzero(lone)[:, None])
    block: list[IntArray] = []
    size = 0
    for group in groups:
        block.append(group)
        size += len(group)
        if size >= BLOCK:
            yield _in_a_row(block)
            block, size = [], 0
    if block:
        yield _in_a_row(block)


def _in_a_row(groups: Sequence[IntArray]) -> tuple[IntArray, IntArray]:
    lengths = np.array([len(group) for group in groups])
    return np.concatenate(groups), np.cumsum(lengths) - lengths


@dataclass(frozen=True)
class _Part:
    """Some whole chains: their line, the pairs among them, where each begins, and which cants may go back."""

    line: Line
    pairs: Pairs
    begin: IntArray
    reach: BoolArray
    exceptional: bool

    def kept(self, cant_mm: FloatArray) -> FloatArray:
        """Put today's cants back: all of a chain together, else one after the other."""
        state = self._state(cant_mm)
        good = self._good(cant_mm, state, self.reach)
        cants = np.where(good & self.reach, self.line.cant_today_mm[:, 0], cant_mm)
        # Where only one is within reach, together and one by one are the same.
        count = np.cumsum(self.reach, dtype=np.int64)
        turn = count - np.repeat(count[self.begin] - self.reach[self.begin], self._lengths)
        several = np.repeat(np.add.reduceat(self.reach, self.begin, dtype=np.int64) > 1, self._lengths)
        left = self.reach & several & ~good
        changed = good & self.reach
        for i in range(1, int(turn[left].max(initial=0)) + 1):
            state = self._state(cants) if changed.any() else state
            exchanged = left & (turn == i)
            changed = exchanged & self._good(cants, state, exchanged)
            cants = np.where(changed, self.line.cant_today_mm[:, 0], cants)
        return cants

    @property
    def _lengths(self) -> IntArray:
        return np.diff(self.begin, append=len(self.line))

    def _state(self, cant_mm: FloatArray) -> _State:
        return _State.of(self.line, self.pairs, cant_mm, self.exceptional)

    def _good(self, cant_mm: FloatArray, before: _State, exchanged: BoolArray) -> BoolArray:
        """Tell for each curve whether its chain may have today's cants at some of its curves."""
        after = self._state(np.where(exchanged, self.line.cant_today_mm[:, 0], cant_mm))
        clean = np.logical_and.reduceat(_clean(self.pairs, before, after, exchanged), self.begin)
        lost = (worth.by_group(self.begin) for worth in (before.worth, after.worth))
        return np.repeat(clean & ~_slower(*lost), self._lengths)


@dataclass(frozen=True)
class _State:
    """Cants with their worth, and what they keep: curves by themselves (n,), shared transitions (m,).

    ``hard`` is what no lower speed can mend at planned speeds, ``tier`` every limit at the speeds run, both
    in the last tier.
    """

    worth: Assessment
    hard: BoolArray
    tier: BoolArray
    hard_between: BoolArray
    tier_between: BoolArray

    @classmethod
    def of(cls, line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool) -> _State:
        worth = assess(line, pairs, cant_mm, exceptional)
        run, meeting = worth.run_kmh, Meeting.of(line, pairs)
        cants = (cant_mm[pairs.first][:, None], cant_mm[pairs.second][:, None])
        together = np.minimum(run[pairs.first], run[pairs.second])
        return cls(
            worth=worth,
            hard=hard_kept(line, cant_mm[:, None], exceptional),
            tier=passed_alone(line, cant_mm[:, None], run, exceptional, sites=True).count == 0,
            hard_between=shared_hard_kept(meeting, cants, exceptional)[0],
            tier_between=np.asarray(passed_shared(meeting, cants, together, exceptional).count == 0),
        )


def _slower(before: TimeLost, after: TimeLost) -> BoolArray:
    """Tell where running time is lost that was not lost before."""
    more_stopped = after.stopped > before.stopped + slack(before.stopped)
    return np.asarray(more_stopped | (after.lost_s > before.lost_s + slack(before.lost_s)))


def _new(before: Passed, after: Passed) -> BoolArray:
    """Tell where a limit is passed that was not passed before, shape (n,)."""
    found = [
        (over > 0) & ~(before.by_rule[key] > 0) if key in before.by_rule else over > 0
        for key, over in after.by_rule.items()
    ]
    return np.asarray(np.any(found, axis=0)) if found else np.zeros(0, dtype=np.bool_)


def _clean(pairs: Pairs, before: _State, after: _State, exchanged: BoolArray) -> BoolArray:
    """Tell for each curve whether it and its transitions break and pass nothing new, shape (n,).

    An exchanged cant must break no limit of the last tier at all, on its curve and its transitions.
    """
    clean = np.where(exchanged, after.hard & after.tier, after.hard | ~before.hard)
    clean &= ~_new(before.worth.passed, after.worth.passed)
    if len(pairs):
        touched = exchanged[pairs.first] | exchanged[pairs.second]
        good = after.hard_between & after.tier_between
        between = np.where(touched, good, after.hard_between | ~before.hard_between)
        between &= ~_new(before.worth.passed_between, after.worth.passed_between)
        np.logical_and.at(clean, pairs.first, between)
        np.logical_and.at(clean, pairs.second, between)
    return np.asarray(clean)
