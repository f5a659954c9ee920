"""Limits asked at a speed and a radius: the rows of a limit set as conditions over arrays.

Apart from the model because a row is stated in its own unit with words as conditions, while the rules of the
planner want one number per curve and class in the canonical unit, with the row that governs beside it.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from cant.model.limits import QUANTITIES, TOLERANCE, LimitRow, LimitSet
from cant.model.settings import Settings

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]
CodeArray = npt.NDArray[np.int16]

NO_CATEGORY = -1
"""Category code that only rows without a category match."""

_ALWAYS: BoolArray = np.ones((), dtype=np.bool_)
EDGE_KMH = 1e-9
"""A speed this close to the edge of a band [km/h] stands on the edge; a radius [m] too."""


@dataclass(frozen=True, slots=True)
class LimitAt:
    """The governing limit at given speeds and radii; all arrays broadcast to the same shape (..., n, k).

    Attributes
    ----------
    value : ndarray
        Limit in the canonical unit; inf where nothing limits (for a minimum: 0).
    tolerance : ndarray
        By how much it may be passed, in the canonical unit.
    row : ndarray of int16
        Index of the governing row in the limit set, -1 where none.
    gap : ndarray of bool
        Rows match by category and situation, but none by speed or radius.
    """

    value: FloatArray
    tolerance: FloatArray
    row: CodeArray
    gap: BoolArray

    def each(self, change: Callable[[Any], Any]) -> LimitAt:
        """Change all four arrays alike."""
        return LimitAt(change(self.value), change(self.tolerance), change(self.row), change(self.gap))


@dataclass(frozen=True, slots=True)
class _Condition:
    """A row made ready: tiers in the canonical unit, and its conditions as look-up tables."""

    index: int
    normal: float
    exceptional: float
    tolerance: float
    slope: float
    categories: BoolArray | None
    situations: BoolArray | None
    speed_over: float | None
    speed_up_to: float | None
    radius_over: float | None
    radius_up_to: float | None

    @property
    def by_speed(self) -> bool:
        return self.speed_over is not None or self.speed_up_to is not None

    @property
    def by_radius(self) -> bool:
        """Whether it holds, or what it says, depends on the radius."""
        return bool(self.slope) or self.radius_over is not None or self.radius_up_to is not None

    def holds_by_kind(self, category: IntArray, situation: IntArray) -> BoolArray:
        holds: BoolArray = _ALWAYS
        if self.categories is not None:
            holds = self.categories[category]
        if self.situations is not None:
            holds = holds & self.situations[situation]
        return holds

    def holds_by_size(self, speed: FloatArray, radius: FloatArray) -> BoolArray:
        holds: BoolArray = _ALWAYS
        if self.speed_over is not None:
            holds = speed > self.speed_over + EDGE_KMH
        if self.speed_up_to is not None:
            holds = holds & (speed <= self.speed_up_to + EDGE_KMH)
        if self.radius_over is not None:
            holds = holds & (radius > self.radius_over + EDGE_KMH)
        if self.radius_up_to is not None:
            holds = holds & (radius <= self.radius_up_to + EDGE_KMH)
        return holds


class LimitTable:
    """The rows of a limit set over the categories and situations of one line.

    Parameters
    ----------
    limits : LimitSet
    settings : Settings
        Rail spacing for limits stated as accelerations, and the maintenance allowance.
    categories : sequence of str
        Category words; an array of category codes indexes them.
    situations : sequence of frozenset of str
        Distinct sets of situation words; an array of situation codes indexes them.
    exceptional_allowed : sequence of bool, optional
        For each of them whether exceptional values count there where they are asked for; everywhere when not
        given.
    """

    def __init__(
        self,
        limits: LimitSet,
        settings: Settings,
        categories: Sequence[str],
        situations: Sequence[frozenset[str]],
        exceptional_allowed: Sequence[bool] | None = None,
    ) -> None:
        self.limits = limits
        self.categories = len(categories)
        self._allowed = (
            None
            if exceptional_allowed is None or all(exceptional_allowed)
            else np.array(exceptional_allowed, dtype=np.bool_)
        )
        self._situations = len(situations)
        self._may_have_gap: dict[str, bool] = {}
        self._settings = settings
        self._rows: dict[str, list[_Condition]] = {quantity: [] for quantity in QUANTITIES}
        for index, row in enumerate(limits.rows):
            self._rows[row.quantity].append(self._prepare(index, row, categories, situations))

    def _prepare(
        self, index: int, row: LimitRow, categories: Sequence[str], situations: Sequence[frozenset[str]]
    ) -> _Condition:
        spacing = self._settings.spacing_mm
        allowance = 0.0
        if row.quantity == "cant" and row.kind == "ceiling":
            allowance = self._settings.maintenance_allowance_mm or 0.0
        size = row.unit_size(spacing)
        wanted = {word.strip().casefold() for word in row.situation.split(";") if word.strip()}
        return _Condition(
            index=index,
            normal=row.canonical(row.normal, spacing) - allowance,
            exceptional=row.canonical(row.stated(exceptional=True), spacing) - allowance,
            tolerance=TOLERANCE * (1.0 if math.isnan(size) else size),
            slope=0.0 if math.isnan(size) else row.per_metre_of_radius * size,
            # The last entry stands for NO_CATEGORY.
            categories=(
                np.array([word.casefold() == row.category.casefold() for word in categories] + [False])
                if row.category
                else None
            ),
            situations=(
                np.array([bool(wanted & words) for words in situations], dtype=np.bool_) if wanted else None
            ),
            speed_over=row.speed_over_kmh,
            speed_up_to=row.speed_up_to_kmh,
            radius_over=row.radius_over_m,
            radius_up_to=row.radius_up_to_m,
        )

    def has(self, quantity: str) -> bool:
        """Tell whether the set has any row of a quantity."""
        return bool(self._rows[quantity])

    def may_have_gap(self, quantity: str) -> bool:
        """Tell whether a quantity can have a gap: where a kind of train has rows for some speeds only.

        A row with a condition of radius counts as one that may not hold.
        """
        if quantity not in self._may_have_gap:
            rows, upper = self._rows[quantity], self.bands(quantity)
            category = np.arange(-1, self.categories)[:, None, None]
            situation = np.arange(self._situations)[:, None]
            speed = np.where(np.isfinite(upper), upper, np.append(upper, 0.0)[len(upper) - 2] + 1.0)
            has_rows, covered = np.zeros(
                (2, self.categories + 1, self._situations, len(upper)), dtype=np.bool_
            )
            for row in rows:
                kind = row.holds_by_kind(category, situation)
                has_rows |= kind
                if not row.by_radius:
                    covered |= kind & row.holds_by_size(speed, np.ones(1))
            self._may_have_gap[quantity] = bool((has_rows & ~covered).any())
        return self._may_have_gap[quantity]

    def changes_with_speed(self, quantity: str) -> bool:
        """Tell whether a quantity has rows with a condition of speed."""
        return any(row.by_speed for row in self._rows[quantity])

    def bands(self, quantity: str) -> FloatArray:
        """Give the upper edges of the bands of speed of one quantity [km/h], ascending, the last one inf."""
        edges = {
            edge
            for row in self._rows[quantity]
            for edge in (row.speed_over, row.speed_up_to)
            if edge is not None
        }
        return np.array([*sorted(edges), np.inf])

    def speed_edges(self, quantities: Sequence[str]) -> list[float]:
        """Give the speeds [km/h] at which a band of one of the quantities begins or ends, ascending."""
        edges = {
            edge
            for quantity in quantities
            for row in self._rows[quantity]
            for edge in (row.speed_over, row.speed_up_to)
            if edge is not None and edge > 0
        }
        return sorted(edges)

    def at(
        self,
        quantity: str,
        *,
        exceptional: bool,
        category: IntArray,
        situation: IntArray,
        speed: FloatArray,
        radius: FloatArray,
    ) -> LimitAt:
        """Ask a quantity's limit.

        Parameters
        ----------
        quantity : str
        exceptional : bool
            Tier asked for.
        category, situation : ndarray of int
            Codes, broadcasting with each other and the next two: usually (n, k) and (n, 1).
        speed : ndarray
            [km/h]; nan matches no row with a condition of speed.
        radius : ndarray
            [m].

        Returns
        -------
        LimitAt
            In the broadcast shape of the arguments.
        """
        found = self.compact(
            quantity,
            exceptional=exceptional,
            category=category,
            situation=situation,
            speed=speed,
            radius=radius,
        )
        shape = np.broadcast_shapes(category.shape, situation.shape, speed.shape, radius.shape)
        return found.each(lambda part: np.broadcast_to(part, shape))

    def compact(
        self,
        quantity: str,
        *,
        exceptional: bool,
        category: IntArray,
        situation: IntArray,
        speed: FloatArray,
        radius: FloatArray,
    ) -> LimitAt:
        """Ask a quantity's limit as :meth:`at` does, in a shape that only broadcasts to the same.

        An axis on which no condition of the quantity's rows depends has length 1: most limits of most sets
        are one number, or one for each curve, and need not be spread over every class.
        """
        rows = self._rows[quantity]
        allowed = self._allowed if exceptional else None
        shape = np.broadcast_shapes(
            (1,) * max(category.ndim, situation.ndim, speed.ndim, radius.ndim),
            category.shape if any(row.categories is not None for row in rows) else (),
            situation.shape if allowed is not None or any(row.situations is not None for row in rows) else (),
            speed.shape if any(row.by_speed for row in rows) else (),
            radius.shape if any(row.by_radius for row in rows) else (),
        )
        order: Literal["C", "F"] = "F" if len(shape) == 2 else "C"
        largest = QUANTITIES[quantity].larger_is_stricter
        value = np.full(shape, 0.0 if largest else np.inf, order=order)
        tolerance = np.zeros(shape, order=order)
        governing = np.full(shape, -1, dtype=np.int16, order=order)
        by_kind = np.zeros(shape, dtype=np.bool_, order=order)
        by_size = np.zeros(shape, dtype=np.bool_, order=order)
        for row in rows:
            kind = row.holds_by_kind(category, situation)
            holds = kind & row.holds_by_size(speed, radius)
            by_kind |= kind
            by_size |= holds
            stated = np.asarray(row.exceptional if exceptional else row.normal)
            if allowed is not None:
                stated = np.where(allowed[situation], row.exceptional, row.normal)
            if np.isinf(stated).all():
                continue
            here = stated + row.slope * radius if row.slope else stated
            stricter = holds & (here > value if largest else here < value)
            np.copyto(value, here, where=stricter)
            np.copyto(tolerance, row.tolerance, where=stricter)
            np.copyto(governing, row.index, where=stricter)
        return LimitAt(value, tolerance, governing, by_kind & ~by_size)
