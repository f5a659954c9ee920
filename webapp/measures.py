"""Numbers as people are shown them, metric or US: one unit and so many decimals for each kind of measure.

Everything inside is metric (:mod:`cant.units`); this is the last step before the page. The JSON never passes
through here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from cant.units import FOOT_M, INCH_MM, MILE_KM, STANDARD_GRAVITY_MS2, UNITS

System = Literal["metric", "us"]
SYSTEMS: tuple[System, ...] = ("metric", "us")
SYSTEM_WORDS: dict[str, str] = {"metric": "Metric", "us": "US"}
ABSENT = "–"

DEGREE_OF_CURVE_M = 100 * FOOT_M / 2
"""Half the 100 ft chord of the degree of curve [m]: R = 50 ft / sin(D / 2)."""


@dataclass(frozen=True, slots=True)
class Measure:
    """How one kind of measure is shown: unit, canonical units in one shown unit, decimals."""

    unit: str
    size: float
    decimals: int


_METRIC: dict[str, Measure] = {
    "cant": Measure("mm", 1.0, 0),
    "exact cant": Measure("mm", 1.0, 1),
    "radius": Measure("m", 1.0, 0),
    "length": Measure("m", 1.0, 1),
    "chainage": Measure("km", 1.0, 3),
    "speed": Measure("km/h", 1.0, 1),
    "acceleration": Measure("m/s²", 1.0, 2),
    "gradient": Measure("mm/m", 1.0, 2),
    "rate": Measure("mm/s", 1.0, 1),
    "mass": Measure("t", 1.0, 1),
    "height": Measure("m", 1.0, 2),
}
_US: dict[str, Measure] = {
    "cant": Measure("in", INCH_MM, 2),
    "exact cant": Measure("in", INCH_MM, 3),
    "radius": Measure("degree", math.nan, 2),
    "length": Measure("ft", FOOT_M, 0),
    "chainage": Measure("mi", MILE_KM, 3),
    "speed": Measure("mph", MILE_KM, 1),
    "acceleration": Measure("g", STANDARD_GRAVITY_MS2, 3),
    "gradient": Measure("in/31 ft", UNITS["in/31 ft"].factor, 2),
    "rate": Measure("in/s", INCH_MM, 2),
    "mass": Measure("short ton", UNITS["short ton"].factor, 0),
    "height": Measure("ft", FOOT_M, 1),
}


@dataclass(frozen=True)
class Measures:
    """The measures of one system of units."""

    system: System

    @property
    def table(self) -> dict[str, Measure]:
        """How each kind of measure is shown."""
        return _US if self.system == "us" else _METRIC

    def unit(self, kind: str) -> str:
        """Give the unit in which a kind of measure is shown."""
        return self.table[kind].unit

    def number(self, kind: str, value: float) -> float:
        """Give a canonical value in the shown unit, not rounded."""
        if kind == "radius" and self.system == "us":
            if value < DEGREE_OF_CURVE_M:
                return math.nan
            return 2 * math.degrees(math.asin(DEGREE_OF_CURVE_M / value))
        return value / self.table[kind].size

    def canonical(self, kind: str, number: float) -> float:
        """Give the canonical value of a number in the shown unit: the inverse of :meth:`number`."""
        if kind == "radius" and self.system == "us":
            return DEGREE_OF_CURVE_M / math.sin(math.radians(number) / 2)
        return number * self.table[kind].size

    def show(self, kind: str, value: float | None) -> str:
        """Give a canonical value as text without unit; :data:`ABSENT` for None and nan."""
        if value is None:
            return ABSENT
        number = self.number(kind, float(value))
        if math.isnan(number):
            return ABSENT
        if math.isinf(number):
            return "not limited"
        text = f"{number:.{self.table[kind].decimals}f}"
        if kind in ("speed", "length", "mass", "acceleration", "height") and "." in text:
            text = text.rstrip("0").rstrip(".") if kind in ("speed", "length", "mass") else text
        return (
            "0"
            if text.strip("-0.") == "" and kind in ("speed", "length", "mass", "cant")
            else text.replace("-", "−")
        )

    def with_unit(self, kind: str, value: float | None) -> str:
        """Give a canonical value as text with its unit, which a line break never parts from it."""
        text = self.show(kind, value)
        if text == ABSENT or text == "not limited":
            return text
        unit = self.unit(kind)
        return f"{text}°" if unit == "degree" else f"{text}\u00a0{unit}"


def measures(system: str) -> Measures:
    """Give the measures of a system by name; metric for any other word."""
    return Measures("us") if system == "us" else Measures("metric")
