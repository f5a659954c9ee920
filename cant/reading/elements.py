"""Element lists (straight, transition, circle row by row) turned into one row a curve.

A circle is a curve; the transitions that touch it in the list are its transitions, and no transition beside
it is a length of 0: an element list leaves nothing out.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import STRAIGHT, take_column
from cant.reading.draft import Draft
from cant.reading.quantities import fill
from cant.reading.sheet_column import Column
from cant.reading.takers import take_radius
from cant.reading.text import fold, is_blank, is_text, shown, squeeze
from cant.reading.words import lexicon

STRAIGHT_ELEMENT, TRANSITION, CIRCLE = "straight", "transition", "circle"


def is_element_list(columns: list[Column]) -> bool:
    """Whether the rows of a block are elements: a column of element words, or radii at start and end."""
    kinds = next((c for c in columns if c.meaning == "Element"), None)
    if kinds is not None and kinds.cells:
        words = [fold(str(c)) for c in kinds.cells if is_text(c)]
        meanings = {lexicon("elements").get(w) for w in words}
        known = sum(w in lexicon("elements") for w in words)
        if words and known >= 0.7 * len(words) and {CIRCLE} < meanings - {None}:
            return True
    meant = {c.meaning for c in columns}
    return {"Radius at start", "Radius at end"} <= meant


def curves_of_elements(draft: Draft) -> Draft:
    """Turn a draft of elements into a draft of curves."""
    kinds = _kinds(draft)
    start_radius, end_radius = _end_radii(draft)
    _as_radius(draft, kinds, start_radius, end_radius)
    circles = [i for i, kind in enumerate(kinds) if kind == CIRCLE]
    lengths = _lengths(draft, kinds)
    inner = _neighbours(kinds, lengths, circles)
    shapes = _shapes(draft, kinds)
    result = _taken(draft, circles)
    fill(result)
    for position, at in enumerate(circles):
        before, after = inner[at]
        if np.isnan(result.numbers["transition_in_m"][position]):
            result.numbers["transition_in_m"][position] = before
        if np.isnan(result.numbers["transition_out_m"][position]):
            result.numbers["transition_out_m"][position] = after
        result.shape[position] = shapes.get(at, result.shape[position])
        if kinds[at] is None:
            result.fail(position, draft.column("Element"), "the kind of element is not known")
    _note(draft, kinds)
    return result


def _kinds(draft: Draft) -> list[str | None]:
    item = draft.column("Element")
    if item is None:
        return [None] * len(draft)
    words = lexicon("elements")
    found: list[str | None] = []
    for cell in item.cells:
        text = fold(shown(cell))
        found.append(
            words.get(text) or next((words[t] for t in text.split() if t in words and len(t) > 1), None)
        )
    return found


def _end_radii(draft: Draft) -> tuple[FloatArray | None, FloatArray | None]:
    found: list[FloatArray | None] = []
    for meaning in ("Radius at start", "Radius at end"):
        item = draft.column(meaning)
        if item is None:
            found.append(None)
            continue
        numbers = take_column(item.cells, lambda text: take_radius(text, draft.decimal))
        values = numbers.values.copy()
        values[[i for i, s in numbers.states.items() if s == STRAIGHT]] = np.inf
        values[values == 0] = np.inf
        found.append(values)
    return found[0], found[1]


def _as_radius(
    draft: Draft, kinds: list[str | None], start: FloatArray | None, end: FloatArray | None
) -> None:
    """Let the column of start radii be the radius of circles, and tell kinds from the two radii."""
    item = draft.column("Radius at start") or draft.column("Radius at end")
    if start is not None and end is not None:
        for index, kind in enumerate(kinds):
            if kind is None:
                a, b = start[index], end[index]
                same = np.isinf(a) and np.isinf(b)
                kinds[index] = STRAIGHT_ELEMENT if same else CIRCLE if abs(a - b) < 1e-6 else TRANSITION
    if item is not None and draft.column("Radius") is None:
        item.meaning = "Radius"
    cant = draft.column("Cant at start") or draft.column("Cant at end")
    if cant is not None and draft.column("Cant") is None:
        cant.meaning = "Cant"
    radius = draft.column("Radius")
    if radius is not None and draft.column("Element") is not None:
        for index, kind in enumerate(kinds):
            if kind is None and not is_blank(radius.cells[index]):
                taken = take_radius(squeeze(shown(radius.cells[index])), draft.decimal)
                kinds[index] = STRAIGHT_ELEMENT if taken.state == STRAIGHT else CIRCLE


def _lengths(draft: Draft, kinds: list[str | None]) -> FloatArray:
    """Give the length of every element [m], from its length or its chainages."""
    every = _taken(draft, list(range(len(draft))))
    asked, noted = len(draft.context.questions), len(draft.context.notes)
    radius = every.column("Radius")
    if radius is not None:
        radius.meaning = ""
    fill(every)
    del draft.context.questions[asked:], draft.context.notes[noted:]
    spans = np.abs(every.numbers["end_km"] - every.numbers["start_km"]) * 1000
    stated = every.numbers["length_m"]
    return np.where(np.isnan(stated), np.round(spans, 3), stated)


def _neighbours(
    kinds: list[str | None], lengths: FloatArray, circles: list[int]
) -> dict[int, tuple[float, float]]:
    last = len(kinds) - 1

    def beside(index: int, step: int) -> float:
        at = index + step
        if not 0 <= at <= last:
            return np.nan
        return float(lengths[at]) if kinds[at] == TRANSITION else 0.0 if kinds[at] is not None else np.nan

    return {i: (beside(i, -1), beside(i, 1)) for i in circles}


def _shapes(draft: Draft, kinds: list[str | None]) -> dict[int, str]:
    """Give the shape of the transitions beside each circle, where a column names it."""
    item = draft.column("Shape")
    if item is None:
        return {}
    words = lexicon("shapes")
    named = [words.get(fold(shown(cell))) for cell in item.cells]
    found: dict[int, str] = {}
    for index, kind in enumerate(kinds):
        if kind == CIRCLE:
            for at in (index - 1, index + 1):
                if 0 <= at < len(kinds) and kinds[at] == TRANSITION and (shape := named[at]) is not None:
                    found.setdefault(index, shape)
    item.meaning = ""
    return found


def _taken(draft: Draft, indices: list[int]) -> Draft:
    columns = [replace(c, cells=[c.cells[i] for i in indices]) for c in draft.columns]
    return Draft(draft.block, columns, draft.rows[indices], draft.decimal, draft.context)


def _note(draft: Draft, kinds: list[str | None]) -> None:
    where = f"sheet '{draft.sheet}': " if draft.sheet else ""
    count = {kind: kinds.count(kind) for kind in (STRAIGHT_ELEMENT, TRANSITION, CIRCLE)}
    draft.context.notes.append(
        f"{where}a list of elements: {count[CIRCLE]} circles are the curves, {count[TRANSITION]} transitions "
        f"were given to them, {count[STRAIGHT_ELEMENT]} straights set apart"
    )
