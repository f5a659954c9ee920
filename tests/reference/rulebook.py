"""Limits as the reference planner asks them: one quantity, one class, one speed, one radius, one tier.

Apart from the planner's own look-up on purpose: units, bands, slopes, ceilings and tolerances are worked out
here a second time, row by row.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings

GRAVITY = 9.81
TOLERANCE = 0.001
SPEED_NOISE = 1e-6
"""Two speeds or radii closer than this are the same: 12 x 5 mph is 60 mph."""

_SIZE = {
    "mm": 1.0,
    "cm": 10.0,
    "m": 1000.0,
    "in": 25.4,
    "km/h": 1.0,
    "mph": 1.609344,
    "mm/m": 1.0,
    "%": 10.0,
    "in/31 ft": 25.4 / (31 * 0.3048),
    "in/62 ft": 25.4 / (62 * 0.3048),
    "mm/s": 1.0,
    "in/s": 25.4,
    "s": 1.0,
    "m/s2": 1.0,
}
"""Size of a stated unit in mm, km/h, mm/m, mm/s, s or m/s2."""


@dataclass(frozen=True)
class Limit:
    """What one quantity may be at one place.

    Attributes
    ----------
    value : float
        Limit in mm, mm/m, mm/s or m/s2; inf where there is none.
    most : float
        The largest value that still keeps it: 0.001 of the stated unit more.
    row : LimitRow or None
        The governing row.
    gap : bool
        Rows are there for the class (or curve), none of them for its speed or radius.
    """

    value: float = math.inf
    most: float = math.inf
    row: LimitRow | None = None
    gap: bool = False

    def kept_by(self, value: float) -> bool:
        """Tell whether a value keeps the limit."""
        return value <= self.most


NO_LIMIT = Limit()
GAP = Limit(gap=True)


def strictest(limits: list[Limit]) -> Limit:
    """Give the smallest limit (the first of equals); a gap anywhere stays a gap."""
    best = NO_LIMIT
    for limit in limits:
        if limit.value < best.value:
            best = limit
    return Limit(best.value, best.most, best.row, any(limit.gap for limit in limits))


def overrun(value: float, limit: float) -> float:
    """Give value / limit - 1, or 1000 + the amount where the limit is 0 or less."""
    return value / limit - 1 if limit > 0 else 1000 + (value - limit)


class Book:
    """The rows of a limit set under the settings of a plan."""

    def __init__(self, limits: LimitSet, settings: Settings) -> None:
        self.rows = limits.rows
        self.allowance = settings.maintenance_allowance_mm or 0.0
        given = (settings.equilibrium_constant, settings.rail_spacing_mm)
        if given == (None, None):
            given = (limits.equilibrium_constant, limits.rail_spacing_mm)
        self.constant = given[0] if given[0] is not None else (given[1] or 1500.0) / (12.96 * GRAVITY)
        self.spacing = 12.96 * GRAVITY * self.constant
        self._answers: dict[tuple[str, str, frozenset[str], float, float, bool], Limit] = {}

    def find(
        self,
        quantity: str,
        category: str,
        situations: frozenset[str],
        speed: float,
        radius: float,
        exceptional: bool,
    ) -> Limit:
        """Give the strictest of the rows that hold for a class at a speed [km/h] and radius [m]."""
        question = (quantity, category, situations, speed, radius, exceptional)
        if question not in self._answers:
            self._answers[question] = self._look_up(*question)
        return self._answers[question]

    def _look_up(
        self,
        quantity: str,
        category: str,
        situations: frozenset[str],
        speed: float,
        radius: float,
        exceptional: bool,
    ) -> Limit:
        meant = [
            row
            for row in self.rows
            if row.quantity == quantity
            and row.category in ("", category)
            and (row.situation == "" or row.situation in situations)
        ]
        if not meant:
            return NO_LIMIT
        holding = [row for row in meant if _in_bands(row, speed, radius)]
        if not holding:
            return GAP
        return strictest([self._limit(row, radius, exceptional) for row in holding])

    def find_without_class(
        self, quantity: str, situations: frozenset[str], radius: float, exceptional: bool
    ) -> Limit:
        """Give the strictest of the rows that hold whatever runs: without category and without speed."""
        meant = [
            row
            for row in self.rows
            if row.quantity == quantity
            and row.category == ""
            and row.speed_over_kmh is None
            and row.speed_up_to_kmh is None
            and (row.situation == "" or row.situation in situations)
        ]
        if not meant:
            return NO_LIMIT
        holding = [row for row in meant if _in_bands(row, 0.0, radius)]
        if not holding:
            return GAP
        return strictest([self._limit(row, radius, exceptional) for row in holding])

    def values(
        self, quantity: str, classes: list[tuple[str, float]], situations: frozenset[str], radius: float
    ) -> list[float]:
        """Give all normal values that hold for a curve or for any class on it (steps and minima)."""
        found = []
        for row in self.rows:
            if row.quantity != quantity or (row.situation and row.situation not in situations):
                continue
            bare = row.category == "" and row.speed_over_kmh is None and row.speed_up_to_kmh is None
            if (bare and _in_bands(row, 0.0, radius)) or any(
                row.category in ("", category) and _in_bands(row, speed, radius)
                for category, speed in classes
            ):
                found.append((row.normal + row.per_metre_of_radius * radius) * _SIZE[row.unit])
        return found

    def _limit(self, row: LimitRow, radius: float, exceptional: bool) -> Limit:
        stated = row.exceptional if exceptional and row.exceptional is not None else row.normal
        if math.isinf(stated):
            return Limit(math.inf, math.inf, row)
        stated += row.per_metre_of_radius * radius
        if row.unit == "1 in n":
            if stated <= TOLERANCE:
                return Limit(math.inf, math.inf, row)
            return Limit(1000 / stated, 1000 / (stated - TOLERANCE), row)
        size = _SIZE[row.unit]
        if row.unit == "m/s2" and row.quantity != "felt acceleration":
            size = self.spacing / GRAVITY
        less = self.allowance if row.quantity == "cant" and row.kind == "ceiling" else 0.0
        return Limit(stated * size - less, (stated + TOLERANCE) * size - less, row)


def _in_bands(row: LimitRow, speed: float, radius: float) -> bool:
    return (
        (row.speed_over_kmh is None or speed > row.speed_over_kmh + SPEED_NOISE)
        and (row.speed_up_to_kmh is None or speed <= row.speed_up_to_kmh + SPEED_NOISE)
        and (row.radius_over_m is None or radius > row.radius_over_m + SPEED_NOISE)
        and (row.radius_up_to_m is None or radius <= row.radius_up_to_m + SPEED_NOISE)
    )
