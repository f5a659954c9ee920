"""Numbers as a page shows them, metric or US, in the units and decimals of :mod:`cant.model.display`.

The last step before the page; the JSON never passes through here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from cant.explaining import Words
from cant.model.display import Display

System = Literal["metric", "us"]
SYSTEMS: tuple[System, ...] = ("metric", "us")
SYSTEM_WORDS: dict[str, str] = {"metric": "Metric", "us": "US"}
ABSENT = "–"
NO_BREAK = "\u00a0"


@dataclass(frozen=True)
class Measures:
    """The measures of one system of units."""

    system: System

    @property
    def display(self) -> Display:
        """How each kind of number is shown."""
        return Display(self.system)

    @property
    def words(self) -> Words:
        """How the plan's own sentences say a number."""
        return Words(self.display)

    def unit(self, kind: str) -> str:
        """Give the unit in which a kind of number is shown."""
        return self.display[kind].unit

    def number(self, kind: str, value: float) -> float:
        """Give a canonical value in the shown unit, not rounded."""
        return value * self.display[kind].factor

    def canonical(self, kind: str, number: float) -> float:
        """Give the canonical value of a number in the shown unit: the inverse of :meth:`number`."""
        return number / self.display[kind].factor

    def show(self, kind: str, value: float | None) -> str:
        """Give a canonical value as text without unit; :data:`ABSENT` for None and nan."""
        if value is None or math.isnan(value):
            return ABSENT
        if math.isinf(value):
            return "not limited"
        return self.display[kind].text(float(value), with_unit=False)

    def with_unit(self, kind: str, value: float | None) -> str:
        """Give a canonical value as text with its unit, which a line break never parts from it."""
        if kind == "radius" and value is not None and math.isfinite(value):
            return self.words.radius(value).replace(" ", NO_BREAK, 1)
        text = self.show(kind, value)
        if text in (ABSENT, "not limited") or not self.unit(kind):
            return text
        return f"{text}{NO_BREAK}{self.unit(kind)}"

    def field(self, kind: str, value: float | None) -> str:
        """Give a canonical value for a field of a form, "" for None, as exact as a person would write it."""
        return "" if value is None else f"{round(self.number(kind, value), 6):.10g}"


def measures(system: str) -> Measures:
    """Give the measures of a system by name; metric for any other word."""
    return Measures("us") if system == "us" else Measures("metric")
