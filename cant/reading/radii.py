"""The radius of every curve: from radius, degree or versine, each a check on the others.

What the columns leave open (metres, chains or feet; which kind of degree; which chord) is settled by their
agreement and by the cant that the speeds would need, and asked about where that does not settle it.
"""

from __future__ import annotations

import re

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import PAIR, STRAIGHT, Numbers, take_column
from cant.reading.degrees import ARC_100_FT, CHORD_20_M, radius_of_degree, radius_of_versine, take_degree
from cant.reading.draft import Draft
from cant.reading.evidence import Evidence
from cant.reading.meanings import Column
from cant.reading.numbers import parse_quantity
from cant.reading.takers import take_length, take_radius
from cant.reading.text import shown, squeeze
from cant.units import FOOT_M, UNITS, ratio

_UNIT_WORDS = {"m": "metres", "ch": "chains", "ft": "feet"}
_CHORDS = {"20 m chord": 20.0, "10 m chord": 10.0, "62 ft chord": 62 * FOOT_M}
_DEGREES = {"20 m": CHORD_20_M, "100 ft": ARC_100_FT}
AGREE = 0.03
"""Share by which two statements of one radius may part: degrees and versines are rounded."""

CONTRADICT = 0.12
"""Share beyond which two statements of one radius contradict each other."""


def settle_radius(draft: Draft, evidence: Evidence, speed_kmh: FloatArray) -> FloatArray:
    """Give the radius of every row [m], with the sign that the user wrote; nan where there is none.

    Parameters
    ----------
    draft : Draft
    evidence : Evidence
    speed_kmh : ndarray, shape (n,)
        Highest speed of each row [km/h], nan where not known; it tells possible from impossible units.
    """
    count = len(draft)
    degree, versine = _degrees(draft), _versines(draft)
    item = draft.column("Radius")
    radius = np.full(count, np.nan)
    if item is not None:
        numbers = take_column(item.cells, lambda text: take_radius(text, draft.decimal))
        _mend_thousands(draft, item, numbers, evidence)
        unit = _radius_unit(draft, item, numbers, evidence, speed_kmh, degree, versine)
        radius = numbers.converted(unit, "m")
        _row_problems(draft, item, numbers, radius)
    known = ~np.isnan(radius)
    if degree is not None:
        radius = _with_degree(draft, radius, known, degree, evidence)
    if versine is not None:
        radius = _with_versine(draft, radius, known, versine)
    return radius


def _mend_thousands(draft: Draft, item: Column, numbers: Numbers, evidence: Evidence) -> None:
    """Read 1.2 as 1200 among radii of hundreds: 1.200 with a thousands dot, or kilometres."""
    sizes = np.abs(numbers.values)
    with np.errstate(invalid="ignore"):
        tiny = (sizes < 20) & (sizes >= 0.1)
        most = float(np.nanmedian(sizes)) if np.any(~np.isnan(sizes)) else 0.0
    all_tiny = item.unit in ("", "m") and not evidence.imperial and bool(np.all(tiny | np.isnan(sizes)))
    if tiny.any() and (most > 100 or all_tiny):
        numbers.values[tiny] = np.round(numbers.values[tiny] * 1000, 6)
        rows = ", ".join(str(int(r)) for r in draft.rows[tiny][:10])
        draft.context.notes.append(f"radii such as 1.2 cannot be metres and are read as 1200 (row {rows})")


def _row_problems(draft: Draft, item: Column, numbers: Numbers, radius: FloatArray) -> None:
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)
    for index, state in numbers.states.items():
        if state == PAIR:
            radius[index] = np.nan
            draft.fail(
                index, item, "two radii stand in one cell; give each part of a compound curve its own row"
            )
        elif state == STRAIGHT:
            draft.fail(index, item, "straight track is no curve; leave the row out, or give its radius")
    for index, hand in numbers.hands.items():
        draft.hand[index] = hand


def _radius_unit(
    draft: Draft,
    item: Column,
    numbers: Numbers,
    evidence: Evidence,
    speed: FloatArray,
    degree: Numbers | None,
    versine: Numbers | None,
) -> str:
    if item.unit:
        return item.unit
    bare = numbers.values.copy()
    bare[list(numbers.units)] = np.nan
    item.unit_from = "values"
    if not np.any(~np.isnan(bare)):
        item.unit = "m"
        return "m"
    fitting = [unit for unit in _UNIT_WORDS if _possible(bare * ratio(unit, "m"), speed, unit, evidence)]
    agreeing = [u for u in _UNIT_WORDS if _agrees(draft, bare * ratio(u, "m"), degree, versine)]
    if len(agreeing) == 1:
        fitting, item.unit_from = agreeing, "other columns"
    item.unit = _choose(draft, item, fitting, evidence, bare)
    return item.unit


def _choose(draft: Draft, item: Column, fitting: list[str], evidence: Evidence, bare: FloatArray) -> str:
    if len(fitting) == 1:
        return fitting[0]
    if "m" in fitting and not evidence.imperial:
        item.unit_from = "canonical"
        return "m"
    if not fitting:
        return "m"
    choices = tuple(_UNIT_WORDS[unit] for unit in fitting)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        item.unit_from = "answer"
        return fitting[choices.index(answer)]
    if evidence.only_imperial and "ft" in fitting and evidence.imperial & {"in", "ft"}:
        item.confidence = "likely"
        return "ft"
    if "m" in fitting and evidence.metric & {"m", "mm"}:
        item.unit_from, item.confidence = "canonical", "likely"
        return "m"
    where = [int(i) for i in np.flatnonzero(~np.isnan(bare))]
    draft.ask(
        item,
        f"The radius names no unit, and {_listed(choices)} are all possible at these speeds. Which is it?",
        choices,
        where,
    )
    return fitting[0]


def _listed(words: tuple[str, ...]) -> str:
    return " and ".join((", ".join(words[:-1]), words[-1])) if len(words) > 1 else words[0]


def _possible(radius: FloatArray, speed: FloatArray, unit: str, evidence: Evidence) -> bool:
    """Whether radii are those of a railway: in themselves, and by the cant that the speeds would need."""
    values = np.abs(radius[~np.isnan(radius)])
    inside = np.mean((values >= 60) & (values <= 20_000))
    if inside < 0.8 or (unit == "ch" and not (evidence.counts_miles or not evidence.metric)):
        return False
    with np.errstate(invalid="ignore", divide="ignore"):
        needed = 11.8 * speed**2 / np.abs(radius)
    needed = needed[np.isfinite(needed)]
    return not len(needed) or 12.0 <= float(np.median(needed)) <= 420.0


def _agrees(draft: Draft, radius: FloatArray, degree: Numbers | None, versine: Numbers | None) -> bool:
    stated: list[FloatArray] = []
    if degree is not None:
        stated += [radius_of_degree(np.abs(degree.values), kind) for kind in _DEGREES.values()]
    if versine is not None:
        item = draft.column("Versine")
        unit = item.unit or "mm" if item else "mm"
        stated += [radius_of_versine(np.abs(versine.converted(unit, "m")), c) for c in _CHORDS.values()]
    return any(_parted(np.abs(radius), other) < AGREE for other in stated)


def _parted(first: FloatArray, second: FloatArray) -> float:
    """Median share by which two statements of the same radii part; inf where there is nothing to compare."""
    with np.errstate(invalid="ignore", divide="ignore"):
        off = np.abs(first - second) / second
    off = off[np.isfinite(off)]
    return float(np.median(off)) if len(off) else np.inf


def _degrees(draft: Draft) -> Numbers | None:
    item = draft.column("Degree")
    if item is None:
        return None
    item.unit = "deg"
    return take_column(item.cells, lambda text: take_degree(text, draft.decimal))


def _versines(draft: Draft) -> Numbers | None:
    item = draft.column("Versine")
    if item is None:
        return None
    return take_column(item.cells, lambda text: take_length(text, draft.decimal))


def _with_degree(
    draft: Draft, radius: FloatArray, known: np.ndarray, degree: Numbers, evidence: Evidence
) -> FloatArray:
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
        return CHORD_20_M if abs(item.heading.chord_m - 20.0) < 1 else ARC_100_FT
    both = {k: _parted(np.abs(radius), radius_of_degree(np.abs(degree.values), k)) for k in _DEGREES.values()}
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
        return ARC_100_FT
    choices = tuple(_DEGREES)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        return _DEGREES[answer]
    where = [int(i) for i in np.flatnonzero(missing)]
    draft.ask(
        item,
        "A degree of curve over 100 ft (or 30.5 m) is 1746 m / degree, over 20 m it is 1146 m / degree; the "
        "file does not say which. Over which length is it?",
        choices,
        where,
    )
    return None


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


def _with_versine(draft: Draft, radius: FloatArray, known: np.ndarray, versine: Numbers) -> FloatArray:
    item = draft.column("Versine")
    assert item is not None  # noqa: S101
    known = ~np.isnan(radius)
    if not item.unit:
        item.unit, item.unit_from = "mm", "canonical"
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
    parted = {
        name: _parted(np.abs(radius), radius_of_versine(np.abs(values), c)) for name, c in _CHORDS.items()
    }
    if (best := min(parted, key=lambda name: parted[name])) and parted[best] < 0.06:
        item.note = f"versine over a {best}, by the radii beside it"
        return _CHORDS[best]
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
    choices = tuple(_CHORDS)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        return _CHORDS[answer]
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
