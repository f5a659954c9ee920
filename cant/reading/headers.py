"""Rows of a header: which they are, how stacked and merged titles name their columns, and rows of units."""

from __future__ import annotations

from functools import lru_cache

from cant.files.grid import Sheet, Value
from cant.reading.headings import analyse, matches
from cant.reading.text import fold, is_blank, is_text, shown, squeeze
from cant.reading.words import lexicon
from cant.units import find_unit

HEADER_ROWS = 3
"""A header has at most so many rows."""


@lru_cache(maxsize=8192)
def heading_score(text: str) -> float:
    """How surely a text is the heading of a column of a curve list, 0 to 1."""
    heading = analyse(text)
    if len(heading.text) > 60:
        return 0.0
    if (best := matches(heading.words)) and best[0].score >= 0.45:
        return best[0].score
    tokens = heading.words.split()
    trains = lexicon("categories") | lexicon("train_words")
    if tokens and any(t in trains and len(t) > 1 for t in tokens):
        return 0.4
    return 0.0


_UNIT_LIKE = frozenset(
    {"sta", "station", "l r", "lh rh", "nr", "dms", "d m s", "text", "id", "g d", "h v", "l p", "type"}
)


def scores(cells: list[Value]) -> list[float]:
    """Give the heading score of each cell of a row."""
    return [heading_score(cell) if is_text(cell) else 0.0 for cell in cells]


def has_figures(cells: list[Value]) -> bool:
    """Whether a row holds values rather than headings."""
    for cell in cells:
        if isinstance(cell, float | int) and not isinstance(cell, bool):
            return True
        if is_text(cell) and any(c.isdigit() for c in str(cell)) and heading_score(str(cell)) < 0.45:
            head = str(cell).strip()
            if head[:1].isdigit() or head[:1] in "+-":
                return True
    return False


def header_rows(sheet: Sheet, best: int) -> tuple[int, int]:
    """Give first and last row of the header of which one row is known."""
    first = last = best
    while first > 1 and last - first + 1 < HEADER_ROWS and _belongs_above(sheet, first - 1, first):
        first -= 1
    while last - first + 1 < HEADER_ROWS and _belongs_below(sheet, last + 1):
        last += 1
    return first, last


def _belongs_above(sheet: Sheet, row: int, below: int) -> bool:
    cells = sheet.rows[row - 1]
    texts = [i for i, cell in enumerate(cells) if is_text(cell)]
    if has_figures(cells) or not texts:
        return False
    wide = [m for m in sheet.merged if m.first_row <= row <= m.last_row and m.last_column > m.first_column]
    grouped = [m for m in wide if m.last_column - m.first_column + 1 < max(4, sheet.width * 0.7)]
    scored = sum(score >= 0.4 for score in scores(cells))
    if len(texts) == 1:
        return bool(grouped) and scored == 1
    beside = sum(len(shown(cells[i])) > 40 for i in texts)
    return beside == 0 and (scored >= 1 or len(grouped) >= 2)


def _belongs_below(sheet: Sheet, row: int) -> bool:
    if row > len(sheet.rows):
        return False
    cells = sheet.rows[row - 1]
    texts = [i for i, cell in enumerate(cells) if is_text(cell)]
    if len(texts) < 2 or has_figures(cells) or is_unit_row(sheet, row):
        return False
    known = sum(
        score >= 0.4 or _names_unit(str(cells[i])) or fold(str(cells[i])) in lexicon("ends")
        for i, score in enumerate(scores(cells))
        if i in texts
    )
    return known >= max(2, 0.5 * len(texts)) or _names_under_a_group(sheet, row, texts)


def _names_under_a_group(sheet: Sheet, row: int, texts: list[int]) -> bool:
    """Whether a row names the columns of a title that stands over several, the other cells above it blank."""
    under = [
        i
        for i in texts
        if i > 0 and is_blank(sheet.value(row - 1, i)) and not is_blank(sheet.value(row - 1, i - 1))
    ]
    short = all(len(shown(sheet.value(row, i))) <= 15 for i in texts)
    follows = row < len(sheet.rows) and has_figures(sheet.rows[row])
    return bool(under) and short and follows and all(i - 1 in texts for i in under)


def is_unit_row(sheet: Sheet, row: int) -> bool:
    """Whether a row (from 1) holds units and no headings."""
    if row > len(sheet.rows):
        return False
    cells = [squeeze(shown(c)) for c in sheet.rows[row - 1] if not is_blank(c)]
    units = sum(_names_unit(c) for c in cells)
    neutral = sum(fold(c) in _UNIT_LIKE for c in cells)
    if any(heading_score(c) >= 0.5 and not _names_unit(c) and fold(c) not in _UNIT_LIKE for c in cells):
        return False
    return units >= 2 and units + neutral >= 0.6 * len(cells) and not any(c[:1].isdigit() for c in cells)


def _names_unit(text: str) -> bool:
    bare = text.strip("()[] .")
    if find_unit(bare) is not None:
        return True
    taken = analyse(f"x ({bare})")
    return bool(taken.notation) or taken.chord_m is not None or (bool(taken.unit) and len(bare) < 12)


def header_parts(sheet: Sheet, first: int, last: int) -> dict[int, tuple[str, ...]]:
    """Give the texts over each column, from the top, groups spread over their columns."""
    filled = {row: _header_row(sheet, row, row < last, last) for row in range(first, last + 1)}
    parts: dict[int, tuple[str, ...]] = {}
    for index in range(sheet.width):
        texts = [filled[row].get(index, "") for row in range(first, last + 1)]
        kept = tuple(dict.fromkeys(t for t in texts if t))
        if kept:
            parts[index] = kept
    return parts


def _header_row(sheet: Sheet, row: int, is_group: bool, last: int) -> dict[int, str]:
    cells = sheet.rows[row - 1]
    found = {i: squeeze(shown(cell)) for i, cell in enumerate(cells) if not is_blank(cell)}
    merged = [m for m in sheet.merged if m.first_row <= row <= m.last_row and m.last_column > m.first_column]
    for area in merged:
        text = squeeze(shown(sheet.value(area.first_row, area.first_column)))
        for index in range(area.first_column, area.last_column + 1):
            if text:
                found[index] = text
    if is_group and not merged:
        _carry_right(sheet, row, last, found)
    return found


def _carry_right(sheet: Sheet, row: int, last: int, found: dict[int, str]) -> None:
    current = ""
    for index in range(sheet.width):
        if index in found:
            current = found[index]
        elif any(not is_blank(sheet.value(r, index)) for r in range(row + 1, last + 1)):
            if current:
                found[index] = current
        else:
            current = ""
