"""``Keep within``: today's cants stay where they are nearly as good: no tamping for nothing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from cant.planning.assess import Assessment, Passed, TimeLost, assess
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.neighbours import Pairs, chains_of

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
    before = assess(line, pairs, cant_mm, exceptional)
    kept = np.where(reach, today, cant_mm)
    after = assess(line, pairs, kept, exceptional)
    clean = _nothing_new(pairs, before, after)
    slower = _slower(before, after)
    result = np.where(lone & reach & clean & ~slower, today, cant_mm)
    for chain in chains:
        if not reach[chain].any():
            continue
        if clean[chain].all() and not _slower(before.total(chain), after.total(chain)).any():
            result[chain] = kept[chain]
        else:
            result[chain] = _one_by_one(line, pairs, chain, cant_mm, reach, exceptional)
    return result


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


def _nothing_new(pairs: Pairs, before: Assessment, after: Assessment) -> BoolArray:
    """Tell for each curve whether it and its transitions break and pass nothing new, shape (n,)."""
    clean = (after.hard | ~before.hard) & ~_new(before.passed, after.passed)
    if len(pairs):
        between = after.hard_between | ~before.hard_between
        between &= ~_new(before.passed_between, after.passed_between)
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
    cants = cant_mm[at].copy()
    best = assess(part, own, cants, exceptional)
    every = np.arange(len(at))
    for i in np.flatnonzero(reach[at]):
        trial = cants.copy()
        trial[i] = part.cant_today_mm[i, 0]
        after = assess(part, own, trial, exceptional)
        if _nothing_new(own, best, after).all() and not _slower(best.total(every), after.total(every)).any():
            cants = trial
    return cants
