"""Which rule makes a bound, and which ends the search for a permissible speed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import overrun
from cant.planning.limit_table import LimitAt
from cant.planning.line import Line
from cant.planning.permissible import FASTEST_KMH, gap_at
from cant.planning.permissible_shared import shared_gap, slows_after
from cant.planning.rules import Asked, Rule, curve_terms, speed_terms
from cant.planning.shared import Meeting, SharedAsked, speed_values

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

GAP = Rule("gap in the limits", "curve", 0, True)
NOTHING = -1


@dataclass
class Governing:
    """What governs, for each of some places; arrays of the same shape.

    Attributes
    ----------
    value : ndarray
        The bound [mm], or the overrun.
    rule : ndarray of int
        Index into ``rules``; NOTHING where nothing governs.
    rules : list of Rule
    column : ndarray of int
        Index of the class; NOTHING where the rule speaks of no class.
    row : ndarray of int
        Index of the row in the limit set; NOTHING where it comes from the site.
    """

    value: FloatArray
    rule: IntArray
    rules: list[Rule]
    column: IntArray
    row: IntArray

    @classmethod
    def nothing(cls, shape: tuple[int, ...], value: float) -> Governing:
        """Start with nothing that governs."""
        none = np.full(shape, NOTHING, dtype=np.int64)
        return cls(np.full(shape, value), none, [], none.copy(), none.copy())

    def replace(
        self, where: BoolArray, value: FloatArray, rule: Rule, column: IntArray, row: IntArray
    ) -> None:
        """Let a rule govern where it is stricter."""
        if not where.any():
            return
        self.rules.append(rule)
        np.copyto(self.value, value, where=where)
        np.copyto(self.rule, len(self.rules) - 1, where=where)
        np.copyto(self.column, column, where=where)
        np.copyto(self.row, row, where=where)

    def rule_at(self, index: int | tuple[int, int]) -> Rule | None:
        """Give the rule that governs at one place."""
        number = int(self.rule[index])
        return self.rules[number] if number >= 0 else None


def bounds(line: Line, exceptional: bool, speed_kmh: FloatArray | None = None) -> tuple[Governing, Governing]:
    """Give the lower and the upper bound of each curve by itself, each of shape (n,).

    At planned speeds unless others are given; no tolerance; -inf and inf where nothing binds.
    """
    n = len(line)
    low, high = Governing.nothing((n,), -np.inf), Governing.nothing((n,), np.inf)
    at = np.arange(n)
    for terms in curve_terms(Asked(line, line.planned_kmh if speed_kmh is None else speed_kmh, exceptional)):
        if terms.rule.sense == 0:
            continue
        rising = terms.rule.sense > 0
        bound = np.broadcast_to(terms.bound(), (n, terms.bound().shape[-1]))
        column = (bound.argmin(axis=-1) if rising else bound.argmax(axis=-1)).astype(np.int64)
        value = bound[at, column]
        row = np.broadcast_to(terms.limit.row, bound.shape)[at, column].astype(np.int64)
        side = high if rising else low
        stricter = value < side.value if rising else value > side.value
        side.replace(stricter, value, terms.rule, column_of(terms.rule, column, bound, line), row)
    return low, high


def column_of(rule: Rule, column: IntArray, over: FloatArray, line: Line) -> IntArray:
    """Give the class's column, NOTHING for a rule of the curve alone (one column for all classes)."""
    if not rule.of_class or over.shape[-1] != line.classes:
        return np.full(column.shape, NOTHING, dtype=np.int64)
    return column


def speed_stoppers(line: Line, cant_mm: FloatArray, trial_kmh: FloatArray, exceptional: bool) -> Governing:
    """Give the rule that fails worst at trial speeds, of curves by themselves: shape (n, k)."""
    found = Governing.nothing(line.runs.shape, 0.0)
    columns = np.broadcast_to(np.arange(line.classes), line.runs.shape)
    asked = Asked(line, trial_kmh, exceptional)
    beyond = gap_at(asked) & (trial_kmh > line.planned_kmh)
    found.replace(beyond, np.zeros(line.runs.shape), GAP, columns, np.full(line.runs.shape, NOTHING))
    for terms in speed_terms(asked):
        _put(found, terms.rule, terms.kept(cant_mm), terms.value(cant_mm), terms.limit, columns)
    return found


def shared_stoppers(
    meeting: Meeting,
    cants_mm: tuple[FloatArray, FloatArray],
    own_kmh: tuple[FloatArray, FloatArray],
    trial_kmh: tuple[FloatArray, FloatArray],
    exceptional: bool,
) -> tuple[Governing, Governing]:
    """Give the rule over shared transitions that fails worst at trial speeds, for both curves: (m, k)."""
    after = slows_after(meeting, own_kmh)
    columns = np.broadcast_to(np.arange(meeting.before.classes), after.shape)
    results = []
    for side in (0, 1):
        mine = after if side else ~after
        speed = np.minimum(trial_kmh[side], own_kmh[1 - side])
        found = Governing.nothing(after.shape, 0.0)
        planned = (meeting.before, meeting.after)[side].planned_kmh
        beyond = shared_gap(meeting, speed, after, exceptional) & (speed > planned) & mine
        found.replace(beyond, np.zeros(after.shape), GAP, columns, np.full(after.shape, NOTHING))
        for value in speed_values(SharedAsked(meeting, speed, exceptional), *cants_mm):
            _put(found, value.rule, value.kept() | ~mine, value.value, value.limit, columns)
        results.append(found)
    return results[0], results[1]


def _put(
    found: Governing, rule: Rule, kept: BoolArray, value: FloatArray, limit: LimitAt, columns: IntArray
) -> None:
    shape = found.value.shape
    over = np.where(kept, 0.0, np.broadcast_to(overrun(value, limit.value), shape))
    found.replace(over > found.value, over, rule, columns, np.broadcast_to(limit.row, shape).astype(np.int64))


def next_trial(permissible_kmh: FloatArray, steps: FloatArray) -> FloatArray:
    """Give the multiple of the speed step above a permissible speed [km/h]; nan beyond the fastest tried."""
    trial = (np.floor(permissible_kmh / steps + 1e-9) + 1.0) * steps
    return np.where(trial <= FASTEST_KMH + 1e-9, trial, np.nan)
