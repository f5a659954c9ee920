"""The difference of two plans, curve by curve: of one list before and after a decision, or of two revisions.

A curve is known by line, track and name; several of the same names are paired in the order of the list. What
differs is found from arrays, so that a register of 100,000 curves is compared at once; a row is made when
somebody looks at it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.model.curves import CurveList, none_if_nan
from cant.model.plan import STATUSES
from cant.planning import Plan

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

SAME = 1e-6
SAME_S = 1e-3
"""Running times closer than this [s a day] are the same."""
_NAMED = ("radius", "hand", "cant today", "start", "end", "transition in", "transition out", "cant held")
_OF_LIST = ("radius_m", "hand", "cant_mm", "start_km", "end_km", "transition_in_m", "transition_out_m")


@dataclass(frozen=True)
class CurveDifference:
    """One curve in both plans; None stands for the plan that has no such curve.

    Attributes
    ----------
    before, after : int or None
        Index in either list.
    line, track, curve : str
    status : pair of (str or None)
    cant_mm, today_mm, seconds_lost_a_day : pair of (float or None)
        Proposed cant, today's [mm], running time lost [s a day].
    approvals : pair of (int or None)
        Limits passed at their normal values, on the curve and on its shared transitions.
    run_speed_kmh : dict of str to pair of (float or None)
        Run speeds [km/h] of the classes for which they differ.
    inputs : tuple of str
        What the lists say otherwise of the curve.
    """

    before: int | None
    after: int | None
    line: str
    track: str
    curve: str
    status: tuple[str | None, str | None]
    cant_mm: tuple[float | None, float | None]
    today_mm: tuple[float | None, float | None]
    seconds_lost_a_day: tuple[float | None, float | None]
    approvals: tuple[int | None, int | None]
    run_speed_kmh: dict[str, tuple[float | None, float | None]]
    inputs: tuple[str, ...]


class Difference:
    """What differs between two plans.

    Parameters
    ----------
    before, after : Plan
    pairs : ndarray of int, shape (p, 2), optional
        The curves to compare, where their names are not to say it; others are then left out.

    Attributes
    ----------
    pairs : ndarray of int, shape (p, 2)
        Indices of the curves that both plans have, in the order of the second list.
    only_before, only_after : list of int
        Curves that one plan has alone.
    """

    def __init__(self, before: Plan, after: Plan, pairs: IntArray | None = None) -> None:
        self.before, self.after = before, after
        found = _paired(before, after) if pairs is None else (pairs, [], [])
        self.pairs, self.only_before, self.only_after = found
        self._values = (_Values(before), _Values(after))

    @cached_property
    def changed(self) -> dict[str, BoolArray]:
        """Tell for each pair, by name, whether verdict, cant, speed, approvals, seconds or inputs differ."""
        a, b = self.pairs[:, 0], self.pairs[:, 1]
        mine, theirs = self._values
        return {
            "verdict": mine.status[a] != theirs.status[b],
            "cant": _differ(mine.cant_mm[a], theirs.cant_mm[b]),
            "speed": self._speeds_differ(a, b),
            "approvals": mine.approvals[a] != theirs.approvals[b],
            "seconds": _differ(mine.lost_s[a], theirs.lost_s[b], SAME_S),
            "inputs": self._inputs_differ(a, b),
        }

    @cached_property
    def rows(self) -> list[tuple[int | None, int | None]]:
        """Curves that differ, as indices in either list: those of both plans first, then those of one."""
        differs = np.zeros(len(self.pairs), dtype=np.bool_)
        for part in self.changed.values():
            differs |= part
        both: list[tuple[int | None, int | None]] = [(int(i), int(j)) for i, j in self.pairs[differs]]
        return [*both, *((i, None) for i in self.only_before), *((None, j) for j in self.only_after)]

    def row(self, before: int | None, after: int | None) -> CurveDifference:
        """Give one curve of :attr:`rows` in both plans."""
        if after is not None:
            curves, at = self.after.curves, after
        elif before is not None:
            curves, at = self.before.curves, before
        else:
            message = "a row needs a curve of one plan at least"
            raise KeyError(message)
        mine, theirs = self._values
        found = (mine.of(before), theirs.of(after))
        speeds = (
            {} if before is None else mine.speeds(before),
            {} if after is None else theirs.speeds(after),
        )
        names = list(dict.fromkeys((*speeds[0], *speeds[1])))
        return CurveDifference(
            before=before,
            after=after,
            line=curves.line[at],
            track=curves.track[at],
            curve=curves.curve[at],
            status=(found[0].get("status"), found[1].get("status")),
            cant_mm=(found[0].get("cant"), found[1].get("cant")),
            today_mm=(found[0].get("today"), found[1].get("today")),
            seconds_lost_a_day=(found[0].get("lost"), found[1].get("lost")),
            approvals=(found[0].get("approvals"), found[1].get("approvals")),
            run_speed_kmh={
                name: (speeds[0].get(name), speeds[1].get(name))
                for name in names
                if not _same_speed(speeds[0].get(name), speeds[1].get(name))
            },
            inputs=()
            if before is None or after is None
            else _inputs(self.before.curves, before, self.after.curves, after),
        )

    def totals(self) -> dict[str, Any]:
        """Give the sums: curves that differ by what differs, and of each plan what it comes to.

        Returns
        -------
        dict
            ``curves`` (both plans have them), ``differ``, ``only_before``, ``only_after``; ``verdict``,
            ``cant``, ``speed`` (curves where they differ); and as pairs ``approvals``, ``seconds_lost_a_day``
            and by status ``counts``.
        """
        return {
            "curves": len(self.pairs),
            "differ": len(self.rows),
            "only_before": len(self.only_before),
            "only_after": len(self.only_after),
            **{key: int(np.count_nonzero(self.changed[key])) for key in ("verdict", "cant", "speed")},
            "approvals": tuple(_approvals_of(plan) for plan in (self.before, self.after)),
            "seconds_lost_a_day": tuple(float(np.nansum(v.lost_s)) for v in self._values),
            "counts": {
                status: (self.before.counts()[status], self.after.counts()[status]) for status in STATUSES
            },
        }

    def _inputs_differ(self, a: IntArray, b: IntArray) -> BoolArray:
        mine, theirs = self.before.curves, self.after.curves
        differ = np.zeros(len(a), dtype=np.bool_)
        for name in _OF_LIST:
            columns = (np.asarray(getattr(curves, name), dtype=np.float64) for curves in (mine, theirs))
            differ |= _differ(next(columns)[a], next(columns)[b])
        held = [np.full(len(c), np.nan) if c.held_mm is None else c.held_mm for c in (mine, theirs)]
        return differ | _differ(held[0][a], held[1][b])

    def _speeds_differ(self, a: IntArray, b: IntArray) -> BoolArray:
        names = (self.before.traffic.class_names, self.after.traffic.class_names)
        differ = np.zeros(len(a), dtype=np.bool_)
        for name in dict.fromkeys((*names[0], *names[1])):
            speeds: list[FloatArray] = [
                values.run_kmh[at, known.index(name)] if name in known else np.full(len(at), np.nan)
                for values, known, at in zip(self._values, names, (a, b), strict=True)
            ]
            differ |= _differ(speeds[0], speeds[1])
        return differ


class _Values:
    """What is compared of one plan, as arrays (n,) and (n, k)."""

    def __init__(self, plan: Plan) -> None:
        outcome = plan.outcome
        n = len(plan.curves)
        self._names = plan.traffic.class_names
        self.status = np.array(plan.status)
        self.cant_mm = plan.proposed_mm
        self.today_mm = plan.curves.cant_mm
        self.run_kmh = np.where(outcome.line.runs, outcome.proposed.run_kmh, np.nan)
        self.lost_s = np.where(outcome.planned, outcome.proposed.lost_s, np.nan)
        approvals = np.array(np.broadcast_to(outcome.proposed.passed.count, (n,)), dtype=np.int64)
        between = np.broadcast_to(outcome.proposed.passed_between.count, (len(outcome.pairs),)).astype(int)
        np.add.at(approvals, outcome.pairs.first, between)
        np.add.at(approvals, outcome.pairs.second, between)
        self.approvals = np.where(outcome.planned, approvals, 0)

    def of(self, index: int | None) -> dict[str, Any]:
        if index is None:
            return {}
        return {
            "status": str(self.status[index]),
            "cant": none_if_nan(self.cant_mm[index]),
            "today": none_if_nan(self.today_mm[index]),
            "lost": none_if_nan(self.lost_s[index]),
            "approvals": int(self.approvals[index]),
        }

    def speeds(self, index: int) -> dict[str, float | None]:
        return dict(zip(self._names, map(none_if_nan, self.run_kmh[index]), strict=True))


def _approvals_of(plan: Plan) -> int:
    """Count the limits passed at their normal values on a whole line, each shared transition once."""
    proposed, outcome = plan.outcome.proposed, plan.outcome
    own = np.broadcast_to(proposed.passed.count, (len(plan.curves),))[outcome.planned].sum()
    return int(own + np.broadcast_to(proposed.passed_between.count, (len(outcome.pairs),)).sum())


def _paired(before: Plan, after: Plan) -> tuple[IntArray, list[int], list[int]]:
    """Pair the curves of two plans by their names."""
    waiting: dict[tuple[str, str, str], list[int]] = {}
    for i in reversed(before.assessed.tolist()):
        waiting.setdefault(_key(before.curves, i), []).append(i)
    pairs, alone = [], []
    for j in after.assessed.tolist():
        left = waiting.get(_key(after.curves, j))
        if left:
            pairs.append((left.pop(), j))
        else:
            alone.append(j)
    gone = sorted(i for left in waiting.values() for i in left)
    return np.array(pairs, dtype=np.int64).reshape(-1, 2), gone, alone


def _key(curves: CurveList, i: int) -> tuple[str, str, str]:
    names = (curves.line[i], curves.track[i], curves.curve[i])
    # A curve without a name is known by its row alone.
    return names if names[2] else (*names[:2], f"\0{curves.sheet[i]}\0{curves.row[i]}")


def _differ(mine: FloatArray, theirs: FloatArray, same: float = SAME) -> BoolArray:
    """Tell where two arrays differ; nan is like nan alone."""
    none = (np.isnan(mine), np.isnan(theirs))
    return np.asarray((none[0] != none[1]) | (np.abs(np.nan_to_num(mine) - np.nan_to_num(theirs)) > same))


def _same_speed(mine: float | None, theirs: float | None) -> bool:
    return mine is theirs if mine is None or theirs is None else abs(mine - theirs) <= SAME


def _inputs(mine: CurveList, i: int, theirs: CurveList, j: int) -> tuple[str, ...]:
    held = (mine.held(i) != theirs.held(j),)
    differ: Sequence[bool] = [
        *(bool(_differ(_one(getattr(mine, c)[i]), _one(getattr(theirs, c)[j]))) for c in _OF_LIST),
        *held,
    ]
    return tuple(name for name, differs in zip(_NAMED, differ, strict=True) if differs)


def _one(value: Any) -> FloatArray:
    return np.asarray(value, dtype=np.float64)
