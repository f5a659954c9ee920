"""What bounds the cant of a curve by itself: the strictest limit on either side and the one behind it.

Apart from the planner's own bounds because a reason also says the limit's value and what would bind next.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning import Plan
from cant.planning.line import Line
from cant.planning.rules import AT_LEAST, Asked, Rule, curve_terms
from cant.quantities.speeds import smallest_radius_for_mix

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Bound:
    """A bound on the cant and the limit that makes it.

    Attributes
    ----------
    mm : float
        The bound [mm].
    quantity, class_name, clause : str or None
    limit : float
        Value of the limit in the canonical unit of its quantity.
    place : str
        The arc, or the transition before or after it.
    """

    mm: float
    quantity: str
    class_name: str | None
    clause: str | None
    limit: float
    place: str

    def as_json(self) -> dict[str, Any]:
        """Give the bound as the JSON of a plan has it."""
        return {
            "mm": self.mm,
            "quantity": self.quantity,
            "class": self.class_name,
            "clause": self.clause,
            "limit": self.limit,
            "place": self.place,
        }


@dataclass(frozen=True, slots=True)
class Binding:
    """The bounds of one curve, the strictest first, at most two a side.

    Attributes
    ----------
    lower, upper : list of Bound
    radius_of_mix_m : float
        Radius below which no cant serves the fastest and the slowest class together [m]; 0 where any does.
    mix : tuple of str
        Those two classes.
    """

    lower: list[Bound]
    upper: list[Bound]
    radius_of_mix_m: float
    mix: tuple[str, str]


def bindings(plan: Plan, indices: Sequence[int]) -> list[Binding]:
    """Give what bounds the cant of some curves, at planned speeds and the tier of each.

    Parameters
    ----------
    plan : Plan
    indices : sequence of int
        Curves that are planned.
    """
    at = np.asarray(indices, dtype=np.int64)
    line = plan.outcome.line.take(at)
    allows = plan.settings.allows_exceptional
    found = [_of_tier(plan, line, exceptional) for exceptional in ((False, True) if allows else (False,))]
    tier = plan.outcome.exceptional[at] if allows else np.zeros(len(at), dtype=np.bool_)
    return [found[int(tier[j])][j] for j in range(len(at))]


class _Side:
    """All bounds of one side: columns of an array, each with its rule, class, limits and rows."""

    def __init__(self, n: int, rising: bool) -> None:
        self._n, self._rising = n, rising
        self._bounds: list[FloatArray] = []
        self._limits: list[FloatArray] = []
        self._rows: list[npt.NDArray[np.int16]] = []
        self._labels: list[tuple[Rule, int]] = []

    def add(self, rule: Rule, bound: FloatArray, limit: FloatArray, row: npt.NDArray[np.int16]) -> None:
        width = bound.shape[-1]
        shape = (self._n, width)
        self._bounds.append(np.broadcast_to(bound, shape))
        self._limits.append(np.broadcast_to(limit, shape))
        self._rows.append(np.broadcast_to(row, shape))
        self._labels += [(rule, k if rule.of_class and width > 1 else -1) for k in range(width)]

    def strictest(self, plan: Plan, classes: int) -> list[list[Bound]]:
        if not self._bounds:
            return [[] for _ in range(self._n)]
        bounds, limits, rows = (
            np.concatenate(part, axis=1) for part in (self._bounds, self._limits, self._rows)
        )
        strict = bounds if self._rising else np.negative(bounds)
        order = np.argsort(strict, axis=1, kind="stable")[:, :2]
        if classes == 1:
            self._labels = [(rule, 0 if rule.of_class else -1) for rule, _ in self._labels]
        return [
            [
                self._bound(plan, bounds[j, m], limits[j, m], int(rows[j, m]), *self._labels[m])
                for m in order[j]
                if np.isfinite(bounds[j, m])
            ]
            for j in range(self._n)
        ]

    def _bound(self, plan: Plan, mm: float, limit: float, row: int, rule: Rule, column: int) -> Bound:
        stated = plan.limits.rows[row] if row >= 0 else None
        name = plan.traffic.class_names[column] if column >= 0 else None
        if stated is not None and rule.quantity in ("cant", "cant gradient"):
            speaks = (
                stated.category or stated.speed_over_kmh is not None or stated.speed_up_to_kmh is not None
            )
            name = name if speaks else None
        sign = -1.0 if rule is AT_LEAST else 1.0
        clause = (stated.clause or None) if stated is not None else None
        return Bound(float(mm), rule.quantity, name, clause, sign * float(limit), rule.place)


def _of_tier(plan: Plan, line: Line, exceptional: bool) -> list[Binding]:
    n, k = len(line), line.classes
    sides = {-1: _Side(n, rising=False), 1: _Side(n, rising=True)}
    asked = Asked(line, line.planned_kmh, exceptional)
    for terms in curve_terms(asked):
        if terms.rule.sense:
            sides[terms.rule.sense].add(terms.rule, terms.bound(), terms.limit.value, terms.limit.row)
    lower, upper = (sides[sense].strictest(plan, k) for sense in (-1, 1))
    radius, fast, slow = _mix(line, asked)
    names = plan.traffic.class_names
    return [
        Binding(lower[j], upper[j], float(radius[j]), (names[fast[j]], names[slow[j]]) if k else ("", ""))
        for j in range(n)
    ]


def _mix(line: Line, asked: Asked) -> tuple[FloatArray, IntArray, IntArray]:
    """Give the smallest radius at which every pair of classes can have a cant, and the pair that decides."""
    n, k = line.runs.shape
    if not k:
        return np.zeros(n), np.zeros(n, dtype=np.int64), np.zeros(n, dtype=np.int64)
    speed = np.nan_to_num(line.planned_kmh)
    deficiency = np.broadcast_to(asked.limit("cant deficiency").value, (n, k))[:, :, None]
    excess = np.broadcast_to(asked.limit("cant excess").value, (n, k))[:, None, :]
    with np.errstate(divide="ignore", invalid="ignore"):
        radius = smallest_radius_for_mix(
            speed[:, :, None], speed[:, None, :], deficiency, excess, line.constant
        )
    both = line.runs[:, :, None] & line.regular[:, None, :] & np.isfinite(deficiency + excess)
    flat = np.where(both, np.nan_to_num(radius), 0.0).reshape(n, k * k)
    best = flat.argmax(axis=1)
    return flat[np.arange(n), best], best // k, best % k
