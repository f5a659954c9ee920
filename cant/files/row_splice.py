"""New cells put into the rows of a worksheet, everything else copied as it stands."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from cant.errors import FileError, column_letter
from cant.files.additions import AddedColumn, OutCell
from cant.files.cell_xml import BLANK, NUMBER, held, held_cell
from cant.files.grid import CellRange
from cant.files.packed_rows import PackedColumn
from cant.files.sheet_xml import COLUMNS, MAX_ROW, RowSpan
from cant.files.sheets import SheetRead
from cant.files.style_edit import StyleEdit, StyleNeed

_SPANS = re.compile(rb'(\sspans=")(\d{1,5}):(\d{1,5})"')
_FLUSH_BYTES = 1 << 20


@dataclass(frozen=True, slots=True)
class PlacedColumn:
    """An added column and the column from 0 that it takes."""

    column: int
    content: AddedColumn


class RowSplice:
    """Puts cells into rows.

    Parameters
    ----------
    read : SheetRead
        The sheet as read.
    columns : sequence of PlacedColumn
        What to add.
    header_row : int
        Row of the headings, from 1.
    styles : StyleEdit
        The workbook's styles, which gain what the cells need.
    """

    def __init__(
        self, read: SheetRead, columns: Sequence[PlacedColumn], header_row: int, styles: StyleEdit
    ) -> None:
        self.read = read
        self.styles = styles
        self.columns = sorted(columns, key=lambda one: one.column)
        self.header_row = header_row
        self._heads = [_heading(one.content) for one in self.columns]
        self.letters = [column_letter(one.column) for one in self.columns]
        rows: set[int] = {header_row} if self.columns else set()
        for one in self.columns:
            rows.update(one.content.cells)
        self.rows = sorted(rows)
        self.last_used = read.next_column - 1
        self.has_formulas = False
        self._style_texts: dict[tuple[int, str | None, str | None, bool], str] = {}
        p = read.xml.prefix.decode()
        self._p = p
        self._last_cell = re.compile(rb"<" + p.encode() + rb'c r="([A-Z]{1,3})[0-9]+"')
        self._every_cell = re.compile(
            rb"<" + p.encode() + rb"""c(?=[\s/>])(?:[^>"']|"[^"]*"|'[^']*')*(?:(?<=/)>|>.*?</"""
            + p.encode() + rb"c>)", re.DOTALL,
        )  # fmt: skip
        self._check_rows()

    def _check_rows(self) -> None:
        if self.rows and not 0 < self.rows[0] <= self.rows[-1] <= MAX_ROW:
            message = f"has no row {self.rows[0] if self.rows[0] < 1 else self.rows[-1]} to write to"
            raise FileError(message, self.read.xml.place)

    def areas(self) -> Iterator[tuple[int, list[CellRange]]]:
        """Give for each added column, in order, the stretches of rows that it fills."""
        for one in self.columns:
            yield one.column, stretches(sorted({self.header_row, *one.content.cells}), one.column)

    def notes(self) -> dict[tuple[int, int], str]:
        """Give the notes at added cells, by row from 1 and column from 0."""
        found: dict[tuple[int, int], str] = {}
        for one, head in zip(self.columns, self._heads, strict=True):
            cells = one.content.cells
            if not isinstance(cells, PackedColumn):  # packed cells have no notes
                found |= {(row, one.column): cell.note for row, cell in cells.items() if cell.note}
            found.pop((self.header_row, one.column), None)
            if head.note:
                found[self.header_row, one.column] = head.note
        return found

    def chunks(self) -> Iterator[bytes]:
        """Give the new content of ``sheetData`` in pieces."""
        data = self.read.xml.data
        pending = iter([*self.rows, 0])
        wanted = next(pending)
        at = self.read.xml.rows_start
        out: list[bytes] = []
        size = last = 0
        for span in self.read.xml.rows():
            if span.number <= last:
                message = "is damaged: its rows are not in order; open it and save it anew"
                raise FileError(message, self.read.xml.place.at(span.number))
            last = span.number
            while wanted and wanted < span.number:
                out += (data[at : span.start], self._new_row(wanted))
                at, wanted = span.start, next(pending)
            if wanted == span.number or self._has_earlier(span.number):
                out += (data[at : span.start], self._spliced(span, wanted == span.number))
                size += len(out[-1])
                at = span.end
                if wanted == span.number:
                    wanted = next(pending)
            if size > _FLUSH_BYTES:
                yield b"".join(out)
                out, size = [], 0
        out.append(data[at : self.read.xml.rows_end])
        while wanted:
            out.append(self._new_row(wanted))
            wanted = next(pending)
        yield b"".join(out)

    def _has_earlier(self, row: int) -> bool:
        return any(one.first_row <= row <= one.last_row for one in self.read.cells.ignored)

    def _new_row(self, row: int) -> bytes:
        p = self._p
        return f'<{p}row r="{row}">{self._row_text(row)}</{p}row>'.encode()

    def _spliced(self, span: RowSpan, has_new: bool) -> bytes:
        """Give a row with its new cells, and without those of an earlier annotation."""
        data = self.read.xml.data
        tag, inner = data[span.start : span.inner], data[span.inner : span.inner_end]
        if not has_new:
            kept = self._kept_cells(inner, span.number)
            return self._row(tag, b"".join(content for _, content in kept))
        if self._is_simple(inner, span.number):
            return self._row(self._widened(tag), inner + self._row_text(span.number).encode("utf-8"))
        kept = self._kept_cells(inner, span.number)
        taken = {column: content for column, content in kept if column in self._own_columns}
        cells = [(column, content) for column, content in kept if column not in taken]
        cells += [(column, text.encode("utf-8")) for column, text in self._row_cells(span.number, taken)]
        cells.sort(key=lambda one: one[0])
        return self._row(self._widened(tag), b"".join(content for _, content in cells))

    def _row(self, tag: bytes, inner: bytes) -> bytes:
        if tag.endswith(b"/>"):
            tag = tag[:-2].rstrip() + b">"
        return tag + inner + f"</{self._p}row>".encode()

    @property
    def _own_columns(self) -> set[int]:
        return {one.column for one in self.columns}

    def _is_simple(self, inner: bytes, row: int) -> bool:
        """Tell whether all new cells of a row simply go behind its last one."""
        if self._has_earlier(row):
            return False
        if not self.columns:
            return False
        at = inner.rfind(f"<{self._p}c ".encode())
        if at < 0:
            return not inner.strip()
        match = self._last_cell.match(inner, at)
        return match is not None and COLUMNS[match.group(1)] < self.columns[0].column

    def _kept_cells(self, inner: bytes, row: int) -> list[tuple[int, bytes]]:
        """Give a row's cells by column, less those of an earlier annotation."""
        found: list[tuple[int, bytes]] = []
        gone = [one for one in self.read.cells.ignored if one.first_row <= row <= one.last_row]
        column = -1
        for match in self._every_cell.finditer(inner):
            name = re.match(rb"""[^>]*?\sr=["']([A-Za-z]{1,3})[0-9]+["']""", match.group())
            column = COLUMNS[name.group(1).upper()] if name else column + 1
            if not any(one.first_column <= column <= one.last_column for one in gone):
                found.append((column, match.group()))
        return found

    def _widened(self, tag: bytes) -> bytes:
        """Let the row's optional ``spans`` reach the new cells."""
        last = self.columns[-1].column + 1
        return _SPANS.sub(
            lambda match: match[1] + match[2] + b":%d" % max(int(match[3]), last) + b'"', tag, count=1
        )

    def _row_text(self, row: int) -> str:
        """Give the new cells of a row as one text."""
        base, number, out = self._base_style(row), str(row), []
        for place, (placed, letters) in enumerate(zip(self.columns, self.letters, strict=True)):
            text = self._text_at(row, place, letters + number, placed.content, base)
            if text is not None:
                out.append(text)
        return "".join(out)

    def _row_cells(self, row: int, taken: dict[int, bytes]) -> Iterator[tuple[int, str]]:
        """Give the new cells of a row, left to right; ``taken`` are the user's blank cells in their place."""
        base = self._base_style(row)
        for place, (placed, letters) in enumerate(zip(self.columns, self.letters, strict=True)):
            own = taken.get(placed.column)
            style = _style_of(own) if own is not None else base
            text = self._text_at(row, place, f"{letters}{row}", placed.content, style)
            if text is not None:
                yield placed.column, text
            elif own is not None:
                yield placed.column, own.decode("utf-8")

    def _text_at(self, row: int, place: int, name: str, column: AddedColumn, base: int) -> str | None:
        """Give the XML of one new cell, None where its column has none in the row."""
        if row == self.header_row:
            return self._cell(name, self._heads[place], column, base)
        cells = column.cells
        if isinstance(cells, PackedColumn):
            contents = cells.rows.contents(row)
            content = contents[cells.number] if contents is not None else BLANK
            if content == BLANK:
                return None
            style = self._style((base, column.number_format, cells.fills.get(content), content[0] == NUMBER))
            return held_cell(self._p, name, style, content)
        cell = cells.get(row)
        return None if cell is None else self._cell(name, cell, column, base)

    def _base_style(self, row: int) -> int:
        """Give the style of the row's last used cell."""
        styles = self.read.cells.number_formats.rows.get(row)
        if not styles:
            return 0
        return styles[min(len(styles), self.last_used + 1) - 1]

    def _cell(self, name: str, cell: OutCell, column: AddedColumn, base: int) -> str:
        value = cell.value
        is_number = value is not None and not isinstance(value, str | bool)
        style = self._style((base, cell.number_format or column.number_format, cell.fill, is_number))
        if cell.formula is not None:
            self.has_formulas = True
        return held_cell(self._p, name, style, held(value), cell.formula)

    def _style(self, key: tuple[int, str | None, str | None, bool]) -> str:
        style = self._style_texts.get(key)
        if style is None:
            number = self.styles.cell_style(StyleNeed(*key))
            style = self._style_texts[key] = f' s="{number}"' if number else ""
        return style


def _heading(content: AddedColumn) -> OutCell:
    return OutCell(content.heading, fill=content.heading_fill, note=content.heading_note)


def _style_of(cell: bytes) -> int:
    match = re.match(rb"""[^>]*?\ss=["'](\d{1,7})["']""", cell)
    return int(match.group(1)) if match else 0


def stretches(rows: Sequence[int], column: int, most: int = 40) -> list[CellRange]:
    """Give the runs of rows without a gap as ranges of one column; one range over all if too many."""
    if not rows:
        return []
    found: list[CellRange] = []
    at = 0
    while at < len(rows):
        end = at + 1
        while end < len(rows) and rows[end] == rows[end - 1] + 1:
            end += 1
        found.append(CellRange(rows[at], column, rows[end - 1], column))
        at = end
    return found if len(found) <= most else [CellRange(rows[0], column, rows[-1], column)]
