"""Where the tables of a sheet lie: titles, headers of one to three rows, unit rows, blocks side by side.

Knows the sheet as a drawing. What the columns mean is decided elsewhere; here a heading only counts as one
that is known or not.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from cant.files.grid import Sheet, Value
from cant.reading.headers import has_figures, header_parts, header_rows, heading_score, is_unit_row, scores
from cant.reading.headings import matches
from cant.reading.text import fold, is_blank, is_text, shown, squeeze

SEARCHED_ROWS = 120
"""A header is looked for in so many rows from the top."""


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
    first, last = header_rows(sheet, best)
    unit_row = is_unit_row(sheet, last + 1)
    parts = header_parts(sheet, first, last)
    columns = [
        BlockColumn(index, texts, squeeze(shown(sheet.value(last + 1, index))) if unit_row else "")
        for index, texts in sorted(parts.items())
    ]
    columns += _unheaded(sheet, {c.index for c in columns}, last)
    columns.sort(key=lambda c: c.index)
    title = _title(sheet, strict_from, first)
    end, following = _next_table(sheet, last + unit_row + 1, columns)
    title += _legend(sheet, last + unit_row, end)
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
        if not cells or any(isinstance(c, float) for c in cells) or _has_plain_figures(cells):
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


def _legend(sheet: Sheet, header: int, end: int) -> list[str]:
    """Give the texts of the last rows, where legends stand."""
    rows = sheet.rows[max(header, end - 12) : end]
    return [
        squeeze(" ".join(shown(c) for c in cells if c is not None))
        for cells in rows
        if cells
        and is_text(next((c for c in cells if c is not None), None))
        and not any(isinstance(c, float) for c in cells)
    ]


def _best_row(sheet: Sheet, start: int) -> int | None:
    best: tuple[float, int] | None = None
    for row in range(start, min(len(sheet.rows), start + SEARCHED_ROWS) + 1):
        cells = sheet.rows[row - 1]
        if sum(is_text(cell) for cell in cells) < 2:
            continue
        score = sum(scores(cells))
        if has_figures(cells):
            score -= 1.5
        if score >= 1.4 and (best is None or score > best[0] + 0.01):
            best = (score, row)
    return best[1] if best else None


def _unheaded(sheet: Sheet, headed: set[int], last: int) -> list[BlockColumn]:
    sample = sheet.rows[last : last + 50]
    used = {i for cells in sample for i, cell in enumerate(cells) if not is_blank(cell)}
    return [BlockColumn(index, ()) for index in sorted(used - headed)]


def _side_by_side(columns: list[BlockColumn]) -> list[list[BlockColumn]]:
    """Split columns where the same run of headings starts again; columns before the runs belong to each."""
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
    return _runs_under_groups(columns, names) or [columns]


_GEOMETRY = frozenset({"Radius", "Degree", "Versine"})


def _runs_under_groups(columns: list[BlockColumn], names: list[str]) -> list[list[BlockColumn]]:
    """Split runs of columns that repeat under titles of their own (two tracks) beside shared columns."""
    for first in range(1, len(names)):
        group = columns[first].parts[:-1]
        if not group or columns[first - 1].parts[:-1] == group:
            continue
        runs: list[list[BlockColumn]] = []
        at = first
        while at < len(names) and columns[at].parts[:-1]:
            run = [c for c in columns[at:] if c.parts[:-1] == columns[at].parts[:-1]]
            runs.append(run)
            at += len(run)
        tails = [[fold(c.parts[-1]) for c in run] for run in runs]
        meant = {m.meaning for tail in tails[0] for m in matches(tail)[:1]}
        if len(runs) > 1 and all(t == tails[0] for t in tails) and len(tails[0]) >= 2 and meant & _GEOMETRY:
            return [[*columns[:first], *run, *columns[at:]] for run in runs]
    return []


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
