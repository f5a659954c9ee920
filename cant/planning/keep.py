"""``Keep within``: today's cants stay where they are nearly as good: no tamping for nothing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import (
    Assessment,
    Passed,
    TimeLost,
    assess,
    hard_kept,
    passed_alone,
    passed_shared,
    shared_hard_kept,
)
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.neighbours import Pairs, chains_of
from cant.planning.shared import Meeting

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

SAME_MM = 1e-6
"""Cants closer than this [mm] are the same."""


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
    if not reach.any():
        return cant_mm
    chains = chains_of(len(line), pairs)
    lone = np.ones(len(line), dtype=np.bool_)
    for chain in chains:
        lone[chain] = False
    kept = np.where(reach, today, cant_mm)
    before = _State.of(line, pairs, cant_mm, exceptional)
    after = _State.of(line, pairs, kept, exceptional)
    clean = _clean(pairs, before, after, reach)
    slower = _slower(before.worth, after.worth)
    result = np.where(lone & reach & clean & ~slower, today, cant_mm)
    for chain in chains:
        if not reach[chain].any():
            continue
        if clean[chain].all() and not _slower(before.worth.total(chain), after.worth.total(chain)).any():
            result[chain] = kept[chain]
        else:
            result[chain] = _one_by_one(line, pairs, chain, cant_mm, reach, exceptional)
    return result


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


def _slower(before: TimeLost | Assessment, after: TimeLost | Assessment) -> BoolArray:
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


def _one_by_one(
    line: Line,
    pairs: Pairs,
    chain: Sequence[int] | IntArray,
    cant_mm: FloatArray,
    reach: BoolArray,
    exceptional: bool,
) -> FloatArray:
    at = np.asarray(chain)
    part, own = line.take(at), pairs.among(at)
    cants: FloatArray = cant_mm[at].copy()
    best = _State.of(part, own, cants, exceptional)
    every = np.arange(len(at))
    for i in np.flatnonzero(reach[at]):
        trial: FloatArray = cants.copy()
        trial[i] = part.cant_today_mm[i, 0]
        after = _State.of(part, own, trial, exceptional)
        if (
            _clean(own, best, after, every == i).all()
            and not _slower(best.worth.total(every), after.worth.total(every)).any()
        ):
            cants = trial
    return cants
