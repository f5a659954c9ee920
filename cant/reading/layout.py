"""Where the tables of a sheet lie: titles, headers of one to three rows, unit rows, blocks side by side.

Knows the sheet as a drawing. What the columns mean is decided elsewhere; here a heading only counts as one
that is known or not.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import lru_cache

from cant.files.grid import Sheet, Value
from cant.reading.headings import analyse, matches
from cant.reading.text import fold, is_blank, is_text, shown, squeeze
from cant.reading.words import lexicon
from cant.units import find_unit

SEARCHED_ROWS = 120
"""A header is looked for in so many rows from the top."""

HEADER_ROWS = 3


@dataclass
class BlockColumn:
    """One column of a block: where it stands, the texts of its heading from the top, its unit row.

    ``written`` is the heading as the user wrote it, where a legend has put other words into ``parts``.
    """

    index: int
    parts: tuple[str, ...]
    unit_row: str = ""
    written: str = ""

    @property
    def heading(self) -> str:
        """The parts of the heading as one text."""
        return squeeze(" ".join(self.parts))


@dataclass
class Block:
    """One table of a sheet.

    Attributes
    ----------
    sheet : Sheet
    header_first, header_last : int
        First and last row of the header, the unit row included, from 1.
    last_row : int
        Last row that may belong to it.
    columns : list of BlockColumn
    title : str
        Text above it, the nearest last.
    group : str
        Text above this block alone, where several stand side by side.
    """

    sheet: Sheet
    header_first: int
    header_last: int
    last_row: int
    columns: list[BlockColumn]
    title: list[str] = field(default_factory=list)
    group: str = ""


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


def _scores(cells: list[Value]) -> list[float]:
    return [heading_score(cell) if is_text(cell) else 0.0 for cell in cells]


def _has_figures(cells: list[Value]) -> bool:
    """Whether a row holds values rather than headings."""
    for cell in cells:
        if isinstance(cell, float | int) and not isinstance(cell, bool):
            return True
        if is_text(cell) and any(c.isdigit() for c in str(cell)) and heading_score(str(cell)) < 0.45:
            head = str(cell).strip()
            if head[:1].isdigit() or head[:1] in "+-":
                return True
    return False


def find_blocks(sheet: Sheet, strict_from: int = 1) -> list[Block]:
    """Find the curve tables of a sheet.

    Parameters
    ----------
    sheet : Sheet
    strict_from : int
        Row from which to look.
    """
    best = _best_row(sheet, strict_from)
    if best is None:
        return []
    first, last = _header_rows(sheet, best)
    unit_row = _is_unit_row(sheet, last + 1)
    parts = _header_parts(sheet, first, last)
    columns = [
        BlockColumn(index, texts, squeeze(shown(sheet.value(last + 1, index))) if unit_row else "")
        for index, texts in sorted(parts.items())
    ]
    columns += _unheaded(sheet, {c.index for c in columns}, last)
    columns.sort(key=lambda c: c.index)
    title = _title(sheet, strict_from, first)
    end, following = _next_table(sheet, last + unit_row + 1, columns)
    title += _legend(sheet, end)
    blocks = [Block(sheet, first, last + unit_row, end, part, title) for part in _side_by_side(columns)]
    if len(blocks) > 1:
        for block in blocks:
            block.group = _group_above(sheet, first, block)
    return blocks + (find_blocks(sheet, following) if following else [])


def _next_table(sheet: Sheet, start: int, columns: list[BlockColumn]) -> tuple[int, int | None]:
    """Give the last row of this table, and the row from which another with other headings starts."""
    known = {c.index: {fold(part) for part in c.parts} for c in columns}
    for row in range(start, len(sheet.rows) + 1):
        cells = sheet.rows[row - 1]
        if not cells or any(type(c) is float for c in cells) or _has_plain_figures(cells):
            continue
        texts = [(i, squeeze(str(c))) for i, c in enumerate(cells) if is_text(c)]
        if len(texts) < 3 or sum(heading_score(t) for _, t in texts) < max(2.5, 0.6 * len(texts)):
            continue
        same = sum(fold(t) in known.get(i, set()) for i, t in texts)
        if same < 0.7 * len(texts):
            title = row
            while title - 1 >= start and len([c for c in sheet.rows[title - 2] if c is not None]) == 1:
                title -= 1
            return title - 1, title
    return len(sheet.rows), None


def _has_plain_figures(cells: list[Value]) -> bool:
    return any(isinstance(c, str) and c[:1].isdigit() for c in cells)


def _legend(sheet: Sheet, end: int) -> list[str]:
    """Give the texts of the last rows, where legends stand."""
    rows = sheet.rows[max(0, end - 12) : end]
    return [
        squeeze(" ".join(shown(c) for c in cells if c is not None))
        for cells in rows
        if cells
        and is_text(next((c for c in cells if c is not None), None))
        and not any(type(c) is float for c in cells)
    ]


def _best_row(sheet: Sheet, start: int) -> int | None:
    best: tuple[float, int] | None = None
    for row in range(start, min(len(sheet.rows), start + SEARCHED_ROWS) + 1):
        cells = sheet.rows[row - 1]
        if sum(is_text(cell) for cell in cells) < 2:
            continue
        score = sum(_scores(cells))
        if _has_figures(cells):
            score -= 1.5
        if score >= 1.4 and (best is None or score > best[0] + 0.01):
            best = (score, row)
    return best[1] if best else None


def _header_rows(sheet: Sheet, best: int) -> tuple[int, int]:
    first = last = best
    while first > 1 and last - first + 1 < HEADER_ROWS and _belongs_above(sheet, first - 1, first):
        first -= 1
    while last - first + 1 < HEADER_ROWS and _belongs_below(sheet, last + 1):
        last += 1
    return first, last


def _belongs_above(sheet: Sheet, row: int, below: int) -> bool:
    cells = sheet.rows[row - 1]
    texts = [i for i, cell in enumerate(cells) if is_text(cell)]
    if _has_figures(cells) or not texts:
        return False
    wide = [m for m in sheet.merged if m.first_row <= row <= m.last_row and m.last_column > m.first_column]
    grouped = [m for m in wide if m.last_column - m.first_column + 1 < max(4, sheet.width * 0.7)]
    scored = sum(score >= 0.4 for score in _scores(cells))
    if len(texts) == 1:
        return bool(grouped) and scored == 1
    beside = sum(len(shown(cells[i])) > 40 for i in texts)
    return beside == 0 and (scored >= 1 or len(grouped) >= 2)


def _belongs_below(sheet: Sheet, row: int) -> bool:
    if row > len(sheet.rows):
        return False
    cells = sheet.rows[row - 1]
    texts = [i for i, cell in enumerate(cells) if is_text(cell)]
    if len(texts) < 2 or _has_figures(cells) or _is_unit_row(sheet, row):
        return False
    known = sum(
        score >= 0.4 or _names_unit(str(cells[i])) for i, score in enumerate(_scores(cells)) if i in texts
    )
    return known >= max(2, 0.5 * len(texts))


_UNIT_LIKE = frozenset(
    {"sta", "station", "l r", "lh rh", "nr", "dms", "d m s", "text", "id", "g d", "h v", "l p", "type"}
)


def _is_unit_row(sheet: Sheet, row: int) -> bool:
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


def _header_parts(sheet: Sheet, first: int, last: int) -> dict[int, tuple[str, ...]]:
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


def _unheaded(sheet: Sheet, headed: set[int], last: int) -> list[BlockColumn]:
    sample = sheet.rows[last : last + 50]
    used = {i for cells in sample for i, cell in enumerate(cells) if not is_blank(cell)}
    return [BlockColumn(index, ()) for index in sorted(used - headed)]


def _side_by_side(columns: list[BlockColumn]) -> list[list[BlockColumn]]:
    """Split columns where the same run of headings starts again."""
    names = [fold(c.parts[-1]) if c.parts else "" for c in columns]
    start = next((i for i, name in enumerate(names) if name), 0)
    for at in range(start + 3, len(names) - 2):
        if names[at] != names[start] or not names[at]:
            continue
        left = [n for n in names[start:at] if n]
        right = [n for n in names[at:] if n]
        shared = sum(n in right for n in left)
        if shared >= 3 and shared >= 0.6 * min(len(left), len(right)):
            return [columns[:at], *_side_by_side(columns[at:])]
    return [columns]


def _title(sheet: Sheet, start: int, first: int) -> list[str]:
    texts: list[str] = []
    for row in range(start, first):
        texts += [squeeze(str(cell)) for cell in sheet.rows[row - 1] if is_text(cell)]
    return texts


def _group_above(sheet: Sheet, first: int, block: Block) -> str:
    low, high = block.columns[0].index, block.columns[-1].index
    for row in range(first - 1, 0, -1):
        cells = sheet.rows[row - 1]
        texts = {i: squeeze(str(c)) for i, c in enumerate(cells) if is_text(c)}
        inside = [t for i, t in texts.items() if low <= i <= high]
        if inside and len(texts) > 1:
            return inside[0]
    groups = [set(column.parts[:-1]) for column in block.columns if column.parts[:-1]]
    shared = set.intersection(*groups) if groups else set()
    return next(iter(shared), "")
