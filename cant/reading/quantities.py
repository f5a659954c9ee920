"""From the cells of a block to quantities in canonical units: in which order columns settle one another."""

from __future__ import annotations

import numpy as np

from cant.model.curves import SHAPES, FloatArray
from cant.reading.cells import PAIR, Numbers, take_column
from cant.reading.columns import column
from cant.reading.draft import NUMERIC, Draft
from cant.reading.evidence import IMPERIAL, Evidence, gather
from cant.reading.hands import settle_hands
from cant.reading.headings import MILES_YARDS
from cant.reading.legends import apply_legends
from cant.reading.locations import counts_miles_and_yards, settle_locations
from cant.reading.radii import settle_radius
from cant.reading.scales import (
    settle_arc_unit,
    settle_cant_unit,
    settle_length_unit,
    settle_speed_unit,
    share_units,
)
from cant.reading.sheet_column import Column
from cant.reading.site_words import fill_situations
from cant.reading.speeds import highest_speed, name_classes, settle_speeds, split_speed_columns
from cant.reading.takers import take_cant, take_length, take_transition
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.words import lexicon, meaning_of


def fill(draft: Draft) -> Evidence:
    """Turn every column of a block into quantities, and note what cannot be used."""
    _shapes(draft)
    fill_situations(draft)
    _fixed(draft)
    name_classes(draft)
    if draft.canonical:
        _usual_units(draft)
    apply_legends(draft.columns, draft.block.title)
    share_units(draft.columns)
    split_speed_columns(draft)
    evidence = gather(draft.columns, draft.block.title)
    if counts_miles_and_yards(draft):
        evidence = evidence.with_imperial(MILES_YARDS)
    located, speed, evidence = _settle_together(draft, evidence)
    _cants(draft, evidence, speed)
    _transitions(draft, evidence)
    _place(draft, located)
    _length(draft, evidence)
    settle_hands(draft)
    return evidence


def _settle_together(draft: Draft, evidence: Evidence) -> tuple[dict[str, FloatArray], FloatArray, Evidence]:
    """Settle speeds, chainages and radii; again where the radii turn out to be chains or feet."""
    asked, noted = len(draft.context.questions), len(draft.context.notes)
    problems = {index: list(found) for index, found in draft.problems.items()}
    open_ones = [(c, c.unit, c.unit_from, c.confidence) for c in draft.columns if not c.unit]
    for again in (True, False):
        settle_speed_unit(draft, evidence)
        settle_speeds(draft)
        located = settle_locations(draft, evidence)
        speed = highest_speed(draft)
        draft.numbers["radius_m"] = settle_radius(draft, evidence, speed)
        radius = draft.column("Radius")
        implied = radius.unit if radius is not None and radius.unit_from == "values" else ""
        if not again or implied not in ("ch", "ft") or implied in evidence.imperial:
            break
        evidence = evidence.with_imperial(implied)
        del draft.context.questions[asked:], draft.context.notes[noted:]
        draft.problems = {index: list(found) for index, found in problems.items()}
        for item, unit, unit_from, confidence in open_ones:
            if item is not radius:
                item.unit, item.unit_from, item.confidence = unit, unit_from, confidence
    return located, speed, evidence


def _usual_units(draft: Draft) -> None:
    """In a canonical table give every heading without a unit the usual one, chainages apart (km or m).

    Beside inches, feet, miles or mph a column whose values are hardly metres or millimetres is left to what
    its values say: 40 is then no radius in metres.
    """
    imperial = any(item.unit in IMPERIAL for item in draft.columns if item.meaning)
    for item in draft.columns:
        usual = column("curves", item.meaning).unit if item.meaning else ""
        if not usual or item.unit or item.notation or item.meaning in ("Start", "End"):
            continue
        if imperial and _too_small(item):
            continue
        item.unit, item.unit_from = usual, "canonical"


_HARDLY_BELOW = {"Radius": 60.0, "Cant": 10.0}
"""Radii [m] and cants [mm] whose median is below this are another unit's (common practice)."""


def _too_small(item: Column) -> bool:
    bound = _HARDLY_BELOW.get(item.meaning)
    sizes = [abs(c) for c in item.cells if isinstance(c, int | float) and not isinstance(c, bool) and c != 0]
    return bound is not None and bool(sizes) and float(np.median(sizes)) < bound


def _cants(draft: Draft, evidence: Evidence, speed: FloatArray) -> None:
    _promote_design_cant(draft)
    for meaning in ("Cant", "Cant at most", "Cant at least"):
        item = draft.column(meaning)
        if item is None:
            continue
        numbers = take_column(item.cells, lambda text: take_cant(text, draft.decimal))
        _existing_of_pairs(item, numbers)
        unit = settle_cant_unit(draft, item, numbers, evidence, draft.numbers["radius_m"], speed)
        draft.numbers[NUMERIC[meaning][0]] = _single(draft, item, numbers, unit, "mm", "cant")
        share_units(draft.columns)


def _existing_of_pairs(item: Column, numbers: Numbers) -> None:
    """Of ``90/105`` under a heading that names both states take the existing cant."""
    states = [lexicon("states").get(token) for token in fold(item.heading.text).split()]
    named = [state for state in states if state]
    if sorted(named) != ["existing", "proposed"]:
        return
    for index in [i for i, state in numbers.states.items() if state == PAIR]:
        if named[0] == "proposed":
            numbers.values[index] = numbers.second[index]
        del numbers.states[index]
    item.note = "existing and proposed in one cell: the existing is taken"


def _promote_design_cant(draft: Draft) -> None:
    start = draft.column("Cant at start")
    if start is not None and draft.column("Cant") is None and draft.column("Cant at end") is None:
        start.meaning = "Cant"
        if not start.unit and fold(start.heading.text).endswith(" in"):
            start.unit, start.unit_from = "in", "heading"
    design = draft.column("Design cant")
    if design is not None and draft.column("Cant") is None:
        design.meaning, design.confidence = "Cant", "likely"
        design.note = "the list has no other cant: taken for today's"


def _transitions(draft: Draft, evidence: Evidence) -> None:
    for meaning in ("Transition in", "Transition out", "Cant ramp in", "Cant ramp out", *_BOTH):
        item = draft.column(meaning)
        if item is None:
            continue
        numbers = take_column(item.cells, lambda text: take_transition(text, draft.decimal))
        unit = settle_length_unit(draft, item, numbers, evidence)
        if meaning in _BOTH:
            _pairs(draft, item, numbers, unit, _BOTH[meaning])
        else:
            attribute = NUMERIC[meaning][0]
            draft.numbers[attribute] = _single(draft, item, numbers, unit, "m", "length")
        share_units(draft.columns)


_BOTH = {"Transition": ("transition_in_m", "transition_out_m"), "Cant ramp": ("ramp_in_m", "ramp_out_m")}


def _pairs(draft: Draft, item: Column, numbers: Numbers, unit: str, ends: tuple[str, str]) -> None:
    first, second = numbers.converted(unit, "m"), numbers.converted(unit, "m", second=True)
    paired = np.zeros(len(draft), dtype=np.bool_)
    paired[[i for i, state in numbers.states.items() if state == PAIR]] = True
    for attribute, values in (
        (ends[0], first),
        (ends[1], np.where(paired, second, first)),
    ):
        known = draft.numbers[attribute]
        draft.numbers[attribute] = np.where(np.isnan(known), values, known)
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)


def _single(draft: Draft, item: Column, numbers: Numbers, unit: str, target: str, what: str) -> FloatArray:
    values = numbers.converted(unit, target)
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)
    for index, state in numbers.states.items():
        if state == PAIR:
            values[index] = np.nan
            draft.fail(
                index, item, f"two values stand where one {what} belongs; give each its own row or column"
            )
    return values


def _place(draft: Draft, located: dict[str, FloatArray]) -> None:
    """Set the arc's ends; from the transitions' points make their lengths where no column gives them."""
    for name, attribute in (("Start", "start_km"), ("End", "end_km")):
        if name in located:
            draft.numbers[attribute] = located[name]
    for outer, inner, attribute in (
        ("Transition start", "start_km", "transition_in_m"),
        ("Transition end", "end_km", "transition_out_m"),
    ):
        if outer in located:
            length = np.round(np.abs(located[outer] - draft.numbers[inner]) * 1000, 3)
            known = draft.numbers[attribute]
            draft.numbers[attribute] = np.where(np.isnan(known), length, known)


def _length(draft: Draft, evidence: Evidence) -> None:
    item = draft.column("Length")
    if item is None:
        return
    numbers = take_column(item.cells, lambda text: take_length(text, draft.decimal))
    spans = np.abs(draft.numbers["end_km"] - draft.numbers["start_km"]) * 1000
    unit = settle_arc_unit(draft, item, numbers, evidence, spans)
    draft.numbers["length_m"] = _single(draft, item, numbers, unit, "m", "length")


def _shapes(draft: Draft) -> None:
    item = draft.column("Shape")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        if is_blank(cell):
            continue
        text = squeeze(shown(cell))
        found = meaning_of("shapes", text) or (fold(text) if fold(text) in SHAPES else None)
        if found is not None:
            draft.shape[index] = found
        elif meaning_of("nothing", text) is None:
            draft.fail(index, item, f"'{text}' is no shape of a transition; it is one of {', '.join(SHAPES)}")


def _fixed(draft: Draft) -> None:
    item = draft.column("Cant fixed")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        if isinstance(cell, bool):
            draft.cant_fixed[index] = cell
        elif cell is not None:
            text = squeeze(shown(cell))
            meaning = lexicon("yes_no").get(fold(text) or text)
            if meaning is None and not is_blank(cell):
                draft.fail(index, item, f"'{text}' stands where yes or no belongs")
            draft.cant_fixed[index] = meaning == "yes"
