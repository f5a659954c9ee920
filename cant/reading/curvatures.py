"""Degrees of curve and versines of a block: which kind, over which chord, and whether they agree."""

from __future__ import annotations

import re

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import Numbers, take_column
from cant.reading.degrees import (
    ARC_100_FT,
    CHORD_20_M,
    CHORD_30_5_M,
    CHORD_100_FT,
    radius_of_degree,
    radius_of_versine,
    take_degree,
)
from cant.reading.draft import Draft
from cant.reading.evidence import Evidence
from cant.reading.numbers import parse_quantity
from cant.reading.sheet_column import Column
from cant.reading.takers import take_length
from cant.reading.text import shown, squeeze
from cant.units import FOOT_M, UNITS, ratio

CHORDS = {"20 m chord": 20.0, "10 m chord": 10.0, "62 ft chord": 62 * FOOT_M}

DEGREES = {"20 m": CHORD_20_M, "100 ft": ARC_100_FT}

CONTRADICT = 0.12
"""Share beyond which two statements of one radius contradict each other."""


def parted(first: FloatArray, second: FloatArray) -> float:
    """Median share by which two statements of the same radii part; inf where there is nothing to compare."""
    with np.errstate(invalid="ignore", divide="ignore"):
        off = np.abs(first - second) / second
    off = off[np.isfinite(off)]
    return float(np.median(off)) if len(off) else np.inf


def degrees_of(draft: Draft) -> Numbers | None:
    """Read the column of degrees as it stands, None where there is none."""
    item = draft.column("Degree")
    if item is None:
        return None
    item.unit = "deg"
    return take_column(item.cells, lambda text: take_degree(text, draft.decimal))


def versines_of(draft: Draft) -> Numbers | None:
    """Read the column of versines as it stands, None where there is none."""
    item = draft.column("Versine")
    if item is None:
        return None
    return take_column(item.cells, lambda text: take_length(text, draft.decimal))


def with_degree(
    draft: Draft, radius: FloatArray, known: np.ndarray, degree: Numbers, evidence: Evidence
) -> FloatArray:
    """Complete radii [m] from degrees, and refuse rows in which the two contradict each other.

    Parameters
    ----------
    radius : ndarray, shape (n,)
        Radii so far [m], nan where there is none.
    known : ndarray of bool, shape (n,)
        Where the radius itself was stated.
    """
    item = draft.column("Degree")
    assert item is not None  # noqa: S101
    for index, text in degree.problems.items():
        if not known[index]:
            draft.fail(index, item, text)
    missing = ~known & ~np.isnan(degree.values)
    kind = _degree_kind(draft, item, degree, radius, evidence, missing)
    if kind is None:
        return radius
    item.note = f"degree by {kind}"
    from_degree = radius_of_degree(degree.values, kind)
    _contradictions(draft, item, radius, from_degree, known)
    return np.where(missing, from_degree, radius)


def _degree_kind(
    draft: Draft, item: Column, degree: Numbers, radius: FloatArray, evidence: Evidence, missing: np.ndarray
) -> str | None:
    if item.heading.chord_m is not None:
        return _kind_of_length(draft, item, item.heading.chord_m, missing)
    both = {k: parted(np.abs(radius), radius_of_degree(np.abs(degree.values), k)) for k in DEGREES.values()}
    if (best := min(both, key=lambda k: both[k])) and both[best] < 0.06:
        return best
    if not missing.any():
        item.note = "agrees with no kind of degree; the radius is used"
        item.confidence = "likely"
        return None
    titles = " ".join(draft.block.title)
    if re.search(r"20\s*m", titles):
        return CHORD_20_M
    if re.search(r"100\s*-?\s*(ft|feet|foot|')", titles, re.IGNORECASE) or _is_us(draft, evidence):
        return _of_100_ft(f"{item.heading.text} {titles}")
    choices = tuple(DEGREES)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        return DEGREES[answer]
    where = [int(i) for i in np.flatnonzero(missing)]
    draft.ask(
        item,
        "A degree of curve over 100 ft (or 30.5 m) is 1746 m / degree, over 20 m it is 1146 m / degree; the "
        "file does not say which. Over which length is it?",
        choices,
        where,
    )
    return None


def _kind_of_length(draft: Draft, item: Column, length_m: float, missing: np.ndarray) -> str | None:
    """Give the kind over a length that the heading names; rows over any other length are refused."""
    if abs(length_m - 20.0) < 0.01:
        return CHORD_20_M
    if abs(length_m - 30.5) < 0.001:
        return CHORD_30_5_M
    if abs(length_m - 100 * FOOT_M) < 0.01:
        return _of_100_ft(item.heading.text)
    for index in np.flatnonzero(missing):
        draft.fail(
            int(index),
            item,
            f"a degree of curve over {length_m:g} m is not known here; over 100 ft, 30.5 m or 20 m it is, "
            "or give the radius",
        )
    return None


def _of_100_ft(said: str) -> str:
    """Tell the chord of 100 ft from the arc, taken where neither is said (0.13 % apart at 10 degrees)."""
    return CHORD_100_FT if _SAYS_CHORD.search(said) and not _SAYS_ARC.search(said) else ARC_100_FT


_SAYS_CHORD = re.compile(r"\b(?:chord|corde|cuerda|corda|sehne)\b", re.IGNORECASE)
_SAYS_ARC = re.compile(r"\barc\b", re.IGNORECASE)


def _is_us(draft: Draft, evidence: Evidence) -> bool:
    return bool(evidence.imperial & {"mph", "in", "ft", "mi"}) and not evidence.metric & {"km", "km/h", "m"}


def _contradictions(
    draft: Draft, item: Column, radius: FloatArray, other: FloatArray, known: np.ndarray
) -> None:
    with np.errstate(invalid="ignore", divide="ignore"):
        off = np.abs(np.abs(radius) - np.abs(other)) / np.abs(radius)
        wrong = known & (off > CONTRADICT)
    for index in np.flatnonzero(wrong):
        draft.fail(
            int(index),
            item,
            f"it makes a radius of {abs(other[index]):.0f} m, the row says {abs(radius[index]):.0f} m; one "
            "of them is wrong",
        )


def with_versine(draft: Draft, radius: FloatArray, known: np.ndarray, versine: Numbers) -> FloatArray:
    """Complete radii [m] from versines, and refuse rows in which the two contradict each other.

    Parameters
    ----------
    radius : ndarray, shape (n,)
        Radii so far [m], nan where there is none.
    known : ndarray of bool, shape (n,)
        Where the radius itself was stated.
    """
    item = draft.column("Versine")
    assert item is not None  # noqa: S101
    known = ~np.isnan(radius)
    if not item.unit:
        feet = (item.heading.chord_m or 0.0) / FOOT_M
        in_feet = feet > 0 and abs(feet - round(feet)) < 1e-6 and (item.heading.chord_m or 0.0) % 1 != 0
        item.unit, item.unit_from = ("in", "other columns") if in_feet else ("mm", "canonical")
    for index, text in versine.problems.items():
        if not known[index]:
            draft.fail(index, item, text)
    values = versine.converted(item.unit, "m")
    missing = ~known & ~np.isnan(values)
    chord = _chord(draft, item, values, radius, missing)
    if chord is None:
        return radius
    from_versine = radius_of_versine(values, chord)
    _contradictions(draft, item, radius, from_versine, known)
    return np.where(missing, from_versine, radius)


def _chord(
    draft: Draft, item: Column, values: FloatArray, radius: FloatArray, missing: np.ndarray
) -> float | FloatArray | None:
    column = draft.column("Chord")
    if column is not None:
        return _chord_column(draft, column)
    if item.heading.chord_m is not None:
        item.note = f"versine over a chord of {item.heading.chord_m:g} m"
        return item.heading.chord_m
    off = {name: parted(np.abs(radius), radius_of_versine(np.abs(values), c)) for name, c in CHORDS.items()}
    if (best := min(off, key=lambda name: off[name])) and off[best] < 0.06:
        item.note = f"versine over a {best}, by the radii beside it"
        return CHORDS[best]
    if not missing.any():
        return None
    for text in draft.block.title:
        if match := re.search(
            r"(\d+(?:[.,]\d+)?)\s*-?\s*(m|ft)\b[^.;]*(?:chord|corde|cuerda|corda|sehne)|(?:chord|corde|cuerda|corda|sehne)\D{0,12}(\d+(?:[.,]\d+)?)\s*(m|ft)\b",
            text,
            re.IGNORECASE,
        ):
            number, unit = match[1] or match[3], match[2] or match[4]
            return float(number.replace(",", ".")) * ratio(unit.casefold(), "m")
    choices = tuple(CHORDS)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        return CHORDS[answer]
    draft.ask(
        item,
        "A versine makes a radius only with its chord, which neither heading nor title names. Which is it?",
        choices,
        [int(i) for i in np.flatnonzero(missing)],
    )
    return None


def _chord_column(draft: Draft, column: Column) -> FloatArray:
    values = np.full(len(draft), np.nan)
    for index, cell in enumerate(column.cells):
        found = parse_quantity(squeeze(shown(cell)), draft.decimal) if cell is not None else None
        if found is not None:
            unit = found[1].symbol if found[1] else column.unit or "m"
            length = found[0] * ratio(unit, "m") if UNITS[unit].dimension == "length" else np.nan
            values[index] = length if 1.0 <= length <= 100.0 else np.nan
    column.unit = column.unit or "m"
    return values
