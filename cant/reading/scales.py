"""Units of speeds, cants and lengths where the heading names none.

A canonical heading without a unit is in the program's own unit as long as its values allow it; anything else
is told from the headings beside it, the system of the sheet and the size of the values, and asked about last.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import Numbers
from cant.reading.draft import Draft
from cant.reading.evidence import Evidence
from cant.reading.sheet_column import Column
from cant.units import ratio, unit

_FAMILIES = (
    ("Transition in", "Transition out", "Transition", "Cant ramp in", "Cant ramp out", "Cant ramp"),
    ("Cant", "Design cant", "Proposed cant", "Cant at most", "Cant at least", "Cant at start", "Cant at end"),
    ("Radius", "Radius at start", "Radius at end"),
)
_FRACTION_CELL = re.compile(r"\d\s*/\s*(2|4|8|16)\b|[¼½¾⅛⅜⅝⅞]|[\"″]")
_CANT_WORDS = {"mm": "millimetres", "in": "inches", "cm": "centimetres"}
_LENGTH_WORDS = {"m": "metres", "ft": "feet"}


def share_units(columns: Iterable[Column]) -> None:
    """Let a column take the unit of a sister (transition out from transition in, one speed from another)."""
    items = list(columns)
    speeds = [c for c in items if c.meaning == "Speed"]
    families = [[c for c in items if c.meaning in names] for names in _FAMILIES]
    for family in [speeds, *families]:
        units = {c.unit for c in family if c.unit}
        if len(units) == 1:
            for item in family:
                if not item.unit:
                    item.unit, item.unit_from = next(iter(units)), "other columns"


def settle_speed_unit(draft: Draft, evidence: Evidence) -> None:
    """Give every speed column without a unit one of its own."""
    speeds = [c for c in draft.columns if c.meaning == "Speed" and not c.unit]
    if not speeds:
        return
    miles = evidence.counts_miles or (
        evidence.only_imperial and bool(evidence.imperial & {"in", "ft", "feet", "mph", "miles", "inches"})
    )
    named_km = bool(evidence.metric & {"km/h", "km", "kmh", "kmph"})
    for item in speeds:
        if miles and not named_km:
            item.unit, item.unit_from, item.confidence = "mph", "other columns", "likely"
        else:
            item.unit, item.unit_from = "km/h", "canonical"


def settle_cant_unit(
    draft: Draft, item: Column, numbers: Numbers, evidence: Evidence, radius: FloatArray, speed: FloatArray
) -> str:
    """Give the unit of a cant column: millimetres unless its values or the sheet speak against it."""
    if item.unit and unit(item.unit).dimension == "length":
        return item.unit
    bare = numbers.values.copy()
    bare[list(numbers.units)] = np.nan
    sizes = np.abs(bare[~np.isnan(bare) & (bare != 0)])
    item.unit_from = "values"
    if not len(sizes) or float(np.median(sizes)) >= 16:
        item.unit, item.unit_from = "mm", "canonical"
        return "mm"
    if any(isinstance(c, str) and _FRACTION_CELL.search(c) for c in item.cells):
        item.unit = "in"
        return "in"
    fitting = [u for u in ("in", "cm", "mm") if _possible_cant(bare * ratio(u, "mm"), radius, speed, u)]
    item.unit = _choose_cant(draft, item, fitting, evidence, bare)
    return item.unit


def _possible_cant(cant: FloatArray, radius: FloatArray, speed: FloatArray, name: str) -> bool:
    sizes = np.abs(cant[~np.isnan(cant) & (cant != 0)])
    if float(np.max(sizes)) > 230 or (name == "mm" and float(np.median(sizes)) < 10):
        return False
    with np.errstate(invalid="ignore", divide="ignore"):
        over = np.abs(cant) - 11.8 * speed**2 / np.abs(radius)
    over = over[np.isfinite(over)]
    return not len(over) or -300.0 <= float(np.median(over)) <= 60.0


def _choose_cant(draft: Draft, item: Column, fitting: list[str], evidence: Evidence, bare: FloatArray) -> str:
    if len(fitting) == 1:
        return fitting[0]
    if not fitting:
        item.unit_from = "canonical"
        return "mm"
    if "in" in fitting and evidence.imperial and not evidence.metric & {"mm", "cm", "m"}:
        return "in"
    if "cm" in fitting and evidence.only_metric and evidence.language != "en":
        return "cm"
    choices = tuple(_CANT_WORDS[u] for u in fitting)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is not None:
        item.unit_from = "answer"
        return fitting[choices.index(answer)]
    where = [int(i) for i in np.flatnonzero(~np.isnan(bare))]
    draft.ask(
        item,
        f"The cant names no unit; {item.samples(1)[0]} may be {' or '.join(choices)}. Which is it?",
        choices,
        where,
    )
    return fitting[0]


def settle_length_unit(draft: Draft, item: Column, numbers: Numbers, evidence: Evidence) -> str:
    """Give the unit of a transition or ramp: metres unless the sheet is imperial throughout."""
    if item.unit:
        return item.unit
    radius = draft.column("Radius")
    metric_radius = radius is not None and radius.unit == "m" and radius.unit_from in ("heading", "unit row")
    if metric_radius or not evidence.imperial or evidence.metric & {"m"}:
        item.unit, item.unit_from = "m", "canonical"
        return "m"
    cant = draft.column("Cant")
    inches = cant is not None and cant.unit == "in"
    if evidence.only_imperial and (inches or evidence.imperial & {"in", "ft"}):
        item.unit, item.unit_from = "ft", "other columns"
        item.confidence = "likely"
        return "ft"
    if (
        draft.column("Cant") is not None
        and evidence.metric & {"mm"}
        and radius is not None
        and radius.unit == "m"
    ):
        item.unit, item.unit_from = "m", "canonical"
        return "m"
    choices = tuple(_LENGTH_WORDS.values())
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is None:
        where = [int(i) for i in np.flatnonzero(~np.isnan(numbers.values) & (numbers.values != 0))]
        draft.ask(
            item,
            "The length names no unit, and the sheet mixes metres and feet. Which is it?",
            choices,
            where,
        )
    item.unit = "ft" if answer == "feet" else "m"
    item.unit_from = "answer" if answer else ""
    return item.unit


def settle_arc_unit(
    draft: Draft, item: Column, numbers: Numbers, evidence: Evidence, spans_m: FloatArray
) -> str:
    """Give the unit of the arc's length: the one that agrees with the chainages, else as of a transition."""
    if item.unit:
        return item.unit
    for name in ("m", "ft", "yd", "ch"):
        with np.errstate(invalid="ignore", divide="ignore"):
            off = np.abs(numbers.values * ratio(name, "m") - spans_m) / spans_m
        off = off[np.isfinite(off)]
        if len(off) and float(np.median(off)) < 0.05:
            item.unit, item.unit_from = name, "other columns"
            return name
    return settle_length_unit(draft, item, numbers, evidence)
