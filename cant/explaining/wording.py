"""How numbers and names of the trade are put into words, in either system of units: the one place for it."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from cant.model.display import Display
from cant.quantities.geometry import degree_from_radius
from cant.units import FOOT_M, INCH_MM

_KIND_OF_QUANTITY = {
    "cant gradient": "gradient",
    "rate of change of cant": "rate",
    "rate of change of cant deficiency": "rate",
    "felt acceleration": "acceleration",
}
DEGREE_KIND = "100 ft chord"


class Words:
    """Numbers as a reader sees them.

    Parameters
    ----------
    display : Display
        Metric or US units.
    """

    def __init__(self, display: Display) -> None:
        self._display = display
        self.us = display.units == "us"
        self._shown = {
            kind: display[kind]
            for kind in (
                "cant",
                "cant exact",
                "speed",
                "length",
                "radius",
                "share",
                "mass",
                "acceleration",
                "jerk",
            )
        }

    def cant(self, value_mm: float | None) -> str:
        """Write a cant as it is set: whole where it is whole."""
        if value_mm is not None and not self.us and abs(value_mm - round(value_mm)) > 0.05:
            return self.exact(value_mm)
        return self._shown["cant"].text(value_mm)

    def exact(self, value_mm: float | None) -> str:
        """Write a cant, deficiency or excess as computed."""
        return self._shown["cant exact"].text(value_mm)

    def speed(self, value_kmh: float | None) -> str:
        """Write a speed; with a decimal where it is not whole."""
        if value_kmh is None:
            return "-"
        shown = self._shown["speed"]
        value = value_kmh * shown.factor
        return (
            f"{value:.0f} {shown.unit}" if abs(value - round(value)) < 0.05 else f"{value:.1f} {shown.unit}"
        )

    def length(self, value_m: float | None) -> str:
        """Write a length along the track; whole metres without a decimal."""
        if value_m is not None and not self.us and abs(value_m - round(value_m)) < 0.05:
            return f"{value_m:.0f} m"
        return self._shown["length"].text(value_m)

    def offset(self, value_m: float) -> str:
        """Write how far track moves sideways."""
        return f"{value_m / FOOT_M:.1f} ft" if self.us else f"{value_m:.2f} m"

    def movement(self, value_mm: float) -> str:
        """Write how far a point beside or above the track moves."""
        return f"{value_mm / INCH_MM:.1f} in" if self.us else f"{value_mm:.0f} mm"

    def radius(self, value_m: float | None) -> str:
        """Write a radius, in US units with its degree of curve."""
        text = self._shown["radius"].text(value_m)
        if self.us and value_m and value_m > 20:
            degree = float(degree_from_radius(value_m, DEGREE_KIND))
            return f"{text} ({degree:.2f} degrees)"
        return text

    def share(self, value: float) -> str:
        """Write a share as whole per cent."""
        return f"{100 * value:.0f} %"

    def limited(self, quantity: str, value: float | None) -> str:
        """Write a value of a limited quantity in its unit."""
        return self._display.text(_KIND_OF_QUANTITY.get(quantity, "cant exact"), value)

    def measured(self, kind: str, value: float | None) -> str:
        """Write a value of any kind that :class:`cant.model.display.Display` knows."""
        return self._display.text(kind, value)


def seconds(value_s: float) -> str:
    """Write a time lost a day."""
    if value_s < 9.95:
        return f"{value_s:.1f} s"
    return f"{value_s:.0f} s" if value_s < 5940 else f"{value_s / 60:.0f} min"


def governing_words(by: dict[str, Any] | None) -> str:
    """Say what governs: ``cant excess of Freight, clause``."""
    if not by:
        return "no limit"
    words = str(by["quantity"])
    if by.get("class"):
        words += f" of {by['class']}"
    return f"{words}, {by['clause']}" if by.get("clause") else words


def listed(parts: Iterable[str]) -> str:
    """Join words: ``a, b and c``."""
    given = list(parts)
    return " and ".join([", ".join(given[:-1]), given[-1]]) if len(given) > 1 else "".join(given)
