"""Degree of curve and versine: their notations, and the radius that each kind means.

A degree says nothing without its kind: over a chord or arc of 100 ft (30.48 m), of 30.5 m, or of 20 m. The
last differs from the others by a factor of 1.5, so a kind is never assumed where the file leaves both open.
"""

from __future__ import annotations

import re

import numpy as np

from cant.model.curves import FloatArray
from cant.quantities.geometry import radius_from_degree, radius_from_versine
from cant.reading.cells import STRAIGHT, Taken
from cant.reading.numbers import parse_number
from cant.reading.takers import is_straight

ARC_100_FT, CHORD_100_FT, CHORD_30_5_M, CHORD_20_M = (
    "100 ft arc",
    "100 ft chord",
    "30.5 m chord",
    "20 m chord",
)
"""Kinds of degree that a list may be in, by their names in :mod:`cant.quantities.geometry`."""

_NUM = r"\d+(?:[.,]\d+)?"
_DMS = re.compile(
    rf"(?P<sign>[+-]?)\s*(?P<d>{_NUM})\s*(?:°|º|d(?:eg)?\.?|grad)\s*(?:(?P<m>{_NUM})\s*(?:'|′|’|m(?:in)?\.?)?\s*)?"
    rf"(?:(?P<s>{_NUM})\s*(?:\"|″|''|”|s(?:ec)?\.?)?)?",
    re.IGNORECASE,
)
_DASHED = re.compile(
    r"(?P<sign>)(?P<d>\d{1,2})\s*[-: ]\s*(?P<m>\d{1,2})(?:\s*[-: ]\s*(?P<s>\d{1,2}(?:\.\d+)?))?[\"']?"
)
_MINUTES = re.compile(rf"(?P<m>{_NUM})\s*(?:'|′|min)")


def take_degree(text: str, decimal: str = "") -> Taken:
    """Read an angle: ``2.5``, ``2°15'``, ``3°15'00"``, ``2-15-00``, ``45'``."""
    if is_straight(text):
        return Taken(state=STRAIGHT)
    number = parse_number(text, decimal)
    if number is not None and not re.search(r"\d\s+\d", text):
        return Taken(number)
    match = _DMS.fullmatch(text.replace("''", '"')) or _DASHED.fullmatch(text)
    if match is not None:
        minutes, seconds = (float((match[g] or "0").replace(",", ".")) for g in ("m", "s"))
        if minutes < 60 and seconds < 60:
            value = float(match["d"].replace(",", ".")) + minutes / 60 + seconds / 3600
            return Taken(-value if match["sign"] == "-" else value)
    if match := _MINUTES.fullmatch(text):
        return Taken(float(match["m"].replace(",", ".")) / 60)
    if (
        text.endswith(("°", "º", "deg"))
        and (number := parse_number(text.rstrip("°ºdeg "), decimal)) is not None
    ):
        return Taken(number)
    return Taken(problem=f"'{text}' is no degree of curve; one such as 2°15' or 2.25 belongs there")


def radius_of_degree(degrees: FloatArray, kind: str) -> FloatArray:
    """Give the radius [m] of a degree of curve, with its sign; nan for 0, which a list writes for "none".

    Parameters
    ----------
    degrees : ndarray
    kind : str
        As :func:`cant.quantities.geometry.radius_from_degree` knows it.
    """
    return radius_from_degree(np.where(degrees == 0, np.nan, degrees), kind)


def radius_of_versine(versines_m: FloatArray, chord_m: float | FloatArray) -> FloatArray:
    """Give the radius [m] of a versine [m] over its chord, with its sign; nan for 0."""
    return radius_from_versine(np.where(versines_m == 0, np.nan, versines_m) * 1000.0, chord_m)
