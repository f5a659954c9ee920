"""Curve sheets to one curve list: finds the blocks, lets each be understood, and puts the rows together."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise, zip_longest
from typing import Any

import numpy as np

from cant.errors import Place
from cant.files.grid import Sheet, Value
from cant.model.curves import CurveList
from cant.model.reading import ColumnReading, SheetReading
from cant.reading.checks import check
from cant.reading.dates import undo_dates
from cant.reading.draft import Context, Draft
from cant.reading.elements import curves_of_elements, is_element_list
from cant.reading.evidence import language_of
from cant.reading.foreign_units import refuse_foreign_units
from cant.reading.layout import Block, find_blocks
from cant.reading.meanings import correct, decide, settle_doubles
from cant.reading.numbers import decimal_mark
from cant.reading.places import is_track, line_named, track_named
from cant.reading.quantities import fill
from cant.reading.ranges import split_ranges
from cant.reading.records import is_example
from cant.reading.rows import fill_merged, sift
from cant.reading.sheet_column import Column
from cant.reading.text import is_blank, is_text, shown, squeeze
from cant.reading.weak import Doubt, settle_weak

EXAMPLES = 50
"""Example rows of the template are looked for in so many rows below the header."""

NOT_USED = "not used"
"""Answer that leaves a column as it is."""


def read_sheet(sheet: Sheet, context: Context) -> list[Draft]:
    """Understand every curve table of one sheet."""
    blocks = find_blocks(sheet)
    for before, after in pairwise(blocks):
        if after.header_first > before.header_first:
            rows = ", ".join(
                str(r) for r in range(before.last_row + 1, after.header_last + 1) if sheet.rows[r - 1]
            )
            context.notes.append(f"sheet '{sheet.name}', rows {rows}: title and headings of a further table")
    return [read_block(block, context) for block in blocks]


def read_block(block: Block, context: Context) -> Draft:
    """Understand one curve table."""
    rows, cells = _cells(block)
    columns = decide(block, cells)
    place = Place(context.file, block.sheet.name, block.header_last)
    correct(columns, context.answers, place)
    split_ranges(columns)
    fill_merged(block.sheet, [int(r) for r in rows], columns)
    texts = (str(c) for item in columns for c in item.cells[:2000] if is_text(c))
    decimal = decimal_mark(texts)
    undo_dates(block.sheet, [int(r) for r in rows], columns)
    doubts = settle_weak(columns, decimal, language_of(columns))
    settle_doubles(columns)
    for doubt in doubts:
        _choose(doubt, context, block.sheet.name)
    refuse_foreign_units(columns, place)
    elements = is_element_list(columns)
    sifted = sift(block, columns, decimal, elements)
    context.notes += sifted.notes(rows, block.sheet.name, elements)
    _note_hidden(block, [int(rows[i]) for i in sifted.curves], context)
    tracks = _tracks_by_row(sifted.sections, len(rows))
    names = _filled_names(columns)
    keep = sifted.curves
    for item in columns:
        source = names.get(item.index, item.cells)
        item.cells = [source[i] for i in keep] if len(keep) < len(rows) else source
    draft = Draft(block, columns, rows[keep], decimal, context)
    for doubt in doubts:
        if not doubt.column.meaning:
            _ask_meaning(draft, doubt)
    if elements:
        draft = curves_of_elements(draft)
        tracks = [""] * len(draft)
    else:
        tracks = [tracks[i] for i in keep]
        fill(draft)
    _name(draft, tracks)
    check(draft)
    return draft


def _choose(doubt: Doubt, context: Context, sheet: str) -> None:
    answer = context.answers.choice(sheet, doubt.column.heading.text, doubt.meanings)
    if answer is not None:
        doubt.column.meaning, doubt.column.confidence, doubt.column.note = answer, "certain", "as told"


def _ask_meaning(draft: Draft, doubt: Doubt) -> None:
    where = [i for i, cell in enumerate(doubt.column.cells) if not is_blank(cell)]
    choices = (*doubt.meanings, NOT_USED)
    if draft.context.answers.choice(draft.sheet, doubt.column.heading.text, choices) == NOT_USED:
        return
    samples = ", ".join(doubt.column.samples())
    draft.ask(
        doubt.column,
        f"The heading may mean {' or '.join(doubt.meanings)}; the values ({samples}) fit each. Which is it?",
        choices,
        where,
    )


def _note_hidden(block: Block, rows: list[int], context: Context) -> None:
    hidden = [row for row in rows if row in block.sheet.hidden_rows] if block.sheet.hidden_rows else []
    if hidden:
        listed = ", ".join(map(str, hidden[:12])) + (
            f" and {len(hidden) - 12} more" if len(hidden) > 12 else ""
        )
        context.notes.append(f"sheet '{block.sheet.name}', rows {listed}: hidden, read like the others")


def _filled_names(columns: list[Column]) -> dict[int, list[Value]]:
    """Let blanks below the name of a line or track repeat it; a new line takes no track of the last."""
    line = next((c for c in columns if c.meaning == "Line"), None)
    track = next((c for c in columns if c.meaning == "Track"), None)
    found = {line.index: _filled_down(line.cells, [False] * len(line.cells))} if line else {}
    if track:
        lines = found[line.index] if line else [None] * len(track.cells)
        new = [False, *(a != b for a, b in pairwise(lines))]
        found[track.index] = _filled_down(track.cells, new)
    return found


def _filled_down(given: Sequence[Value], fresh: list[bool]) -> list[Value]:
    cells = list(given)
    for index in range(1, len(cells)):
        if not fresh[index] and is_blank(cells[index]):
            cells[index] = cells[index - 1]
    return cells


def _tracks_by_row(sections: list[tuple[int, str]], count: int) -> list[str]:
    found = [""] * count
    for index, text in sections:
        if is_track(text):
            found[index:] = [text] * (count - index)
    return found


def _name(draft: Draft, tracks: list[str]) -> None:
    """Give every row line, track and curve: from its columns, else from titles and the rows between."""
    count = len(draft)
    block = draft.block
    line, track = draft.column("Line"), draft.column("Track")
    curve, number = draft.column("Curve"), draft.column("Number")
    if curve is None and number is not None:
        curve, number.meaning, number.confidence = number, "Curve", "likely"
    title = [*block.title, *([block.group] if block.group else [])]
    draft.line = _texts(line, count) if line else [line_named(title)] * count
    fallback = block.group if block.group and len(block.group) <= 30 else ""
    named = fallback or track_named([*title, *([] if draft.canonical else [block.sheet.name])])
    draft.track = _texts(track, count) if track else [t or named for t in tracks]
    draft.curve = _texts(curve, count)


def _texts(item: Column | None, count: int) -> list[str]:
    if item is None:
        return [""] * count
    return ["" if is_blank(cell) else squeeze(shown(cell)) for cell in item.cells]


def tell_sheets_apart(drafts: list[Draft]) -> None:
    """Let the sheet's name be the track, where curves of the same name stand on several sheets without one.

    Canonical sheets are never told apart by their names: there the order along the line is by chainage,
    whatever the sheet.
    """
    sheets: dict[tuple[str, str, str], set[str]] = {}
    for draft in drafts:
        for key in zip(draft.line, draft.track, draft.curve, strict=True):
            sheets.setdefault(key, set()).add(draft.sheet)
    if not any(len(found) > 1 and key[2] for key, found in sheets.items()):
        return
    for draft in drafts:
        if draft.column("Track") is None and not draft.canonical:
            draft.track = [t or draft.sheet for t in draft.track]


def _cells(block: Block) -> tuple[np.ndarray, dict[int, Sequence[Value]]]:
    sheet, first = block.sheet, block.header_last
    wanted = [c.index for c in block.columns]
    body = sheet.rows[first : block.last_row]
    low, high = min(wanted), max(wanted)
    kept = [
        i
        for i, cells in enumerate(body)
        if any(c is not None for c in cells[low : high + 1]) and not (i < EXAMPLES and is_example(cells))
    ]
    turned: list[Sequence[Value]] = list(zip_longest(*(body[i] for i in kept), fillvalue=None))
    empty: list[Value] = [None] * len(kept)
    columns = {index: turned[index] if index < len(turned) else empty for index in wanted}
    return np.array([first + 1 + i for i in kept], dtype=np.int64), columns


def sheet_readings(drafts: list[Draft]) -> list[SheetReading]:
    """Tell where the curve tables lie, one entry a sheet."""
    found: dict[str, SheetReading] = {}
    for draft in drafts:
        rows = draft.rows if len(draft) else np.array([draft.block.header_last + 1])
        first, last = int(rows.min()), int(rows.max())
        known = found.get(draft.sheet)
        if known is not None:
            first, last = min(first, known.first_row), max(last, known.last_row)
        header = known.header_row if known else draft.block.header_last
        found[draft.sheet] = SheetReading(draft.sheet, "curves", header, first, last, draft.block.sheet.width)
    return list(found.values())


def column_readings(drafts: list[Draft]) -> list[ColumnReading]:
    """Tell how every column with a heading or values was understood."""
    return [
        _column_reading(draft, item)
        for draft in drafts
        for item in draft.columns
        if item.heading.text or item.samples(1)
    ]


def _column_reading(draft: Draft, item: Column) -> ColumnReading:
    meaning = f"Speed {item.train_name}" if item.train else item.meaning
    return ColumnReading(
        draft.sheet,
        item.index,
        item.heading.text,
        meaning,
        item.notation or item.unit if item.meaning else "",
        item.unit_from if item.meaning else "",
        item.samples(),
        item.confidence,
        item.note,
    )


def join(drafts: list[Draft], file: str) -> CurveList:
    """Put the rows of all blocks into one list, in input order."""
    parts = [draft.as_columns() for draft in drafts]
    joined: dict[str, Any] = {}
    for name in parts[0]:
        values = [part[name] for part in parts]
        joined[name] = (
            np.concatenate(values)
            if isinstance(values[0], np.ndarray)
            else [v for part in values for v in part]
        )
    names = dict.fromkeys(name for draft in drafts for name in draft.class_speeds)
    speeds = {
        name: np.concatenate([d.class_speeds.get(name, np.full(len(d), np.nan)) for d in drafts])
        for name in names
    }
    return CurveList(file=file, class_speeds=speeds, **joined)
