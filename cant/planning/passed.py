"""The limits that given cants pass, one by one with value, limit and row: for reasons, not for the choice."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import overrun
from cant.planning.limit_table import LimitAt
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.rules import AT_LEAST, AT_MOST, Asked, Rule, curve_terms
from cant.planning.shared import Meeting, SharedAsked, shared_values

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True)
class PassedLimit:
    """A limit passed at its normal value by the class that passes it most.

    Attributes
    ----------
    rule : Rule
    column : int
        The class.
    row : int
        Row of the limit set; -1 for what the site demands.
    value, limit, exceptional : float
        In the canonical unit of the quantity.
    within_exceptional : bool
        The exceptional value is kept.
    other : int
        For a shared transition the curve at its other end (position in the line), else -1.
    """

    rule: Rule
    column: int
    row: int
    value: float
    limit: float
    exceptional: float
    within_exceptional: bool
    other: int = -1


def passed_limits(
    line: Line, pairs: Pairs, cant_mm: FloatArray, speed_kmh: FloatArray, wanted: int
) -> list[list[PassedLimit]]:
    """List what each of the first ``wanted`` curves passes, its transitions included.

    Parameters
    ----------
    line : Line
        n curves.
    pairs : Pairs
        Shared transitions among them; one whose cants are not both known is judged by its jump alone.
    cant_mm : ndarray, shape (n,)
        Cants [mm]; a curve whose cant is nan passes nothing.
    speed_kmh : ndarray, shape (n, k)
    wanted : int
    """
    found: list[list[PassedLimit]] = [[] for _ in range(wanted)]
    known = ~np.isnan(cant_mm)
    for i, limit in _alone(line, cant_mm[:, None], speed_kmh):
        if i < wanted and known[i]:
            found[i].append(limit)
    if len(pairs):
        for j, limit in _shared(line, pairs, cant_mm, speed_kmh):
            first, second = int(pairs.first[j]), int(pairs.second[j])
            for mine, other in ((first, second), (second, first)):
                if mine < wanted and known[mine]:
                    found[mine].append(_with_other(limit, other))
    return found


def _with_other(limit: PassedLimit, other: int) -> PassedLimit:
    return PassedLimit(
        limit.rule,
        limit.column,
        limit.row,
        limit.value,
        limit.limit,
        limit.exceptional,
        limit.within_exceptional,
        other,
    )


def _alone(line: Line, cant: FloatArray, speed_kmh: FloatArray) -> Iterator[tuple[int, PassedLimit]]:
    normal = curve_terms(Asked(line, speed_kmh, False))
    exceptional = curve_terms(Asked(line, speed_kmh, True))
    for terms, loose in zip(normal, exceptional, strict=True):
        broken = ~terms.kept(cant)
        if broken.any():
            sign = -1.0 if terms.rule is AT_LEAST else 1.0
            yield from _worst(
                terms.rule, broken, terms.value(cant), terms.limit, loose.kept(cant), loose.limit, sign
            )


def _shared(
    line: Line, pairs: Pairs, cant_mm: FloatArray, speed_kmh: FloatArray
) -> Iterator[tuple[int, PassedLimit]]:
    meeting = Meeting.of(line, pairs)
    cants = (cant_mm[pairs.first][:, None], cant_mm[pairs.second][:, None])
    unknown = np.isnan(cants[0] + cants[1])
    filled = (np.nan_to_num(cants[0]), np.nan_to_num(cants[1]))
    speed = np.minimum(speed_kmh[pairs.first], speed_kmh[pairs.second])
    normal = shared_values(SharedAsked(meeting, speed, False), *filled)
    exceptional = shared_values(SharedAsked(meeting, speed, True), *filled)
    for value, loose in zip(normal, exceptional, strict=True):
        broken = ~value.kept()
        if not value.rule.quantity.startswith("abrupt"):
            broken = broken & ~unknown
        if broken.any():
            yield from _worst(value.rule, broken, value.value, value.limit, loose.kept(), loose.limit, 1.0)


def _worst(
    rule: Rule,
    broken: BoolArray,
    value: FloatArray,
    limit: LimitAt,
    loose_kept: BoolArray,
    loose: LimitAt,
    sign: float,
) -> Iterator[tuple[int, PassedLimit]]:
    shape = broken.shape
    value, normal = np.broadcast_to(value, shape), np.broadcast_to(limit.value, shape)
    row, exceptional = np.broadcast_to(limit.row, shape), np.broadcast_to(loose.value, shape)
    kept = np.broadcast_to(loose_kept, shape)
    over = np.where(broken, overrun(value, normal), -np.inf)
    for i in np.flatnonzero(broken.any(axis=-1)):
        k = int(over[i].argmax())
        within = bool((kept[i] | ~broken[i]).all()) and rule not in (AT_MOST, AT_LEAST)
        yield (
            int(i),
            PassedLimit(
                rule=rule,
                column=k if shape[-1] > 1 or rule.of_class else -1,
                row=int(row[i, k]),
                value=sign * float(value[i, k]),
                limit=sign * float(normal[i, k]),
                exceptional=sign * float(exceptional[i, k]),
                within_exceptional=within,
            ),
        )
