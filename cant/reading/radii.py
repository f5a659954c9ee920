"""The radius of every curve: from radius, degree or versine, each a check on the others.

What the columns leave open (metres, chains or feet; which kind of degree; which chord) is settled by their
agreement and by the cant that the speeds would need, and asked about where that does not settle it.
"""

from __future__ import annotations

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import PAIR, STRAIGHT, Numbers, take_column
from cant.reading.curvatures import (
    CHORDS,
    DEGREES,
    degrees_of,
    parted,
    versines_of,
    with_degree,
    with_versine,
)
from cant.reading.degrees import radius_of_degree, radius_of_versine
from cant.reading.draft import Draft
from cant.reading.evidence import Evidence
from cant.reading.sheet_column import Column
from cant.reading.takers import take_radius
from cant.units import ratio

_UNIT_WORDS = {"m": "metres", "ch": "chains", "ft": "feet"}
AGREE = 0.03
"""Share by which two statements of one radius may part: degrees and versines are rounded."""


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
    degree, versine = degrees_of(draft), versines_of(draft)
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
        radius = with_degree(draft, radius, known, degree, evidence)
    if versine is not None:
        radius = with_versine(draft, radius, known, versine)
    return radius


def _mend_thousands(draft: Draft, item: Column, numbers: Numbers, evidence: Evidence) -> None:
    """Read 1.2 as 1200 among radii of hundreds: 1.200 with a thousands dot, or kilometres."""
    sizes = np.abs(numbers.values)
    with np.errstate(invalid="ignore"):
        tiny = (sizes < 20) & (sizes >= 1)
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
    sample = item.samples(1)[0]
    value = float(np.nanmedian(np.abs(bare)))
    said = "; ".join(f"{_UNIT_WORDS[u]}: {value * ratio(u, 'm'):.0f} m in the middle" for u in fitting)
    draft.ask(
        item,
        f"The radius ({sample}) names no unit, and each is possible at these speeds ({said}). Which is it?",
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
        stated += [radius_of_degree(np.abs(degree.values), kind) for kind in DEGREES.values()]
    if versine is not None:
        item = draft.column("Versine")
        unit = item.unit or "mm" if item else "mm"
        stated += [radius_of_versine(np.abs(versine.converted(unit, "m")), c) for c in CHORDS.values()]
    return any(parted(np.abs(radius), other) < AGREE for other in stated)
