"""Units of the trade and their conversion: a short closed table, not a general unit system.

Every quantity has one canonical unit inside the program (see :data:`CANONICAL`); a unit is read at the edge
and never travels further. Factors are exact by definition (inch 25.4 mm, foot 0.3048 m, chain 66 ft,
mile 1609.344 m; NIST SP 811, appendix B).
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

INCH_MM = 25.4
FOOT_M = 0.3048
CHAIN_M = 66 * FOOT_M
YARD_M = 3 * FOOT_M
MILE_KM = 1.609344
STANDARD_GRAVITY_MS2 = 9.80665
GRAVITY_MS2 = 9.81
"""Gravity as the contract and the printed constants of most standards have it [m/s2]."""

KMH_PER_MS = 3.6


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit: its usual symbol, the dimension it belongs to, and its size in the dimension's base unit."""

    symbol: str
    dimension: str
    factor: float


# Base units: length m, speed km/h, mass t, acceleration m/s2, gradient mm/m, rate mm/s, time s, angle degree.
_TABLE: tuple[tuple[str, str, float, tuple[str, ...]], ...] = (
    ("mm", "length", 0.001, ("mm", "millimetre", "millimeter", "millimetres", "millimeters")),
    ("cm", "length", 0.01, ("cm", "centimetre", "centimeter")),
    ("m", "length", 1.0, ("m", "metre", "meter", "metres", "meters", "mtr", "mts")),
    ("km", "length", 1000.0, ("km", "kilometre", "kilometer")),
    ("in", "length", INCH_MM / 1000, ("in", "inch", "inches", '"', "″", "ins", "pouce", "pulg", "zoll")),
    ("ft", "length", FOOT_M, ("ft", "foot", "feet", "'", "′")),
    ("yd", "length", YARD_M, ("yd", "yds", "yard", "yards")),
    ("ch", "length", CHAIN_M, ("ch", "chs", "chain", "chains")),
    ("mi", "length", MILE_KM * 1000, ("mi", "mile", "miles")),
    (
        "km/h",
        "speed",
        1.0,
        ("km/h", "kmh", "kmph", "kph", "km/hr", "km/u", "km/t", "km/tim", "km/godz", "km/hod"),
    ),
    ("mph", "speed", MILE_KM, ("mph", "mi/h", "miles/h", "miles/hour")),
    ("m/s", "speed", KMH_PER_MS, ("m/s", "ms-1")),
    ("t", "mass", 1.0, ("t", "tonne", "tonnes", "to", "mg")),
    ("kg", "mass", 0.001, ("kg",)),
    ("short ton", "mass", 0.90718474, ("short ton", "short tons", "tons (us)", "ton us")),
    ("long ton", "mass", 1.0160469088, ("long ton", "long tons", "tons (uk)")),
    ("m/s2", "acceleration", 1.0, ("m/s2", "m/s²", "m/s^2", "ms-2", "m/sec2", "m/s/s")),
    ("g", "acceleration", STANDARD_GRAVITY_MS2, ("g",)),
    ("mm/m", "gradient", 1.0, ("mm/m", "‰", "o/oo", "permille", "per mille")),
    ("%", "gradient", 10.0, ("%", "percent")),
    ("in/31 ft", "gradient", INCH_MM / (31 * FOOT_M), ("in/31 ft", "in/31ft", "in per 31 ft", "in in 31 ft")),
    ("in/62 ft", "gradient", INCH_MM / (62 * FOOT_M), ("in/62 ft", "in/62ft", "in per 62 ft", "in in 62 ft")),
    ("in/ft", "gradient", INCH_MM / FOOT_M, ("in/ft", "in per ft")),
    ("1 in n", "gradient", math.nan, ("1 in n", "1:n", "1 in x", "1:x", "1/n")),
    ("mm/s", "rate", 1.0, ("mm/s", "mm/sec", "mm per s")),
    ("in/s", "rate", INCH_MM, ("in/s", "in/sec", "in per s", "ips")),
    ("s", "time", 1.0, ("s", "sec", "second", "seconds")),
    ("deg", "angle", 1.0, ("deg", "degree", "degrees", "°", "grad", "grado", "grau", "degré")),
)

_BY_NAME: dict[str, Unit] = {
    name: Unit(symbol, dimension, factor) for symbol, dimension, factor, names in _TABLE for name in names
}

UNITS: dict[str, Unit] = {symbol: Unit(symbol, dimension, factor) for symbol, dimension, factor, _ in _TABLE}


def find_unit(text: str) -> Unit | None:
    """Find the unit that a piece of text names, or None where it names none.

    Parameters
    ----------
    text : str
        As a heading or a table holds it: ``(mm)``, ``[km/h]``, ``m/s²``; case, brackets and blanks at the
        ends do not matter.
    """
    word = re.sub(r"\s+", " ", text.strip().strip("()[]{}").strip()).casefold()
    return _BY_NAME.get(word)


def unit(symbol: str) -> Unit:
    """Give the unit of a symbol of the table; KeyError where there is none."""
    return UNITS[symbol]


def ratio(source: str, target: str) -> float:
    """Give the factor that turns a value in one unit into another of the same dimension.

    Raises
    ------
    ValueError
        Where the two belong to different dimensions.
    """
    a, b = UNITS[source], UNITS[target]
    if a.dimension != b.dimension:
        message = f"{source} is a {a.dimension}, {target} a {b.dimension}"
        raise ValueError(message)
    return a.factor / b.factor
