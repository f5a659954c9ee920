"""A new workbook of plain tables, written row by row so that a register never stands in memory.

Knows how a sheet of ours looks (header, widths, print set-up) and that a text of the user's stays text; knows
nothing of plans.
"""

from __future__ import annotations

import math
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Any

import xlsxwriter
from xlsxwriter.packager import Packager

from cant.files.loose_parts import LooseParts
from cant.writing.columns import Cell
from cant.writing.fast_rows import FastSheet

MAX_TEXT = 32_000
"""Longest text of a cell that every spreadsheet program keeps (the format's own limit is 32,767)."""

MAX_ROWS = 1_048_000
"""Most rows that a sheet of ours takes (the format's own limit is 1,048,576)."""

LONG_TEXT = 40.0
"""Columns at least this wide [characters] hold sentences."""

LINE_HEIGHT = 15.0
"""Height of a line of text [points]."""

PAGE_WIDTH = 230.0
"""Widest table [characters] that is still legible on one page across, A4 landscape."""

A4, LETTER = 9, 1
"""Numbers of the paper sizes."""

KINDS: dict[str, dict[str, Any]] = {
    "input": {"bg_color": "#FFF6D5", "border": 4, "border_color": "#C9B458"},
    "fixed": {"font_color": "#5A5A5A"},
}
"""How cells of a ledger look: what a checker may change stands on a ground of its own."""

SMALLEST_PRINT = 60
"""Scale of wider tables [%], which run over several pages across."""


@dataclass(frozen=True, slots=True)
class Heading:
    """Head of one column of a table.

    Attributes
    ----------
    title : str
        Text of the header cell.
    width : float
        In characters.
    number_format : str or None
        Number format of the column, None for text.
    """

    title: str
    width: float = 12.0
    number_format: str | None = None

    @property
    def is_long(self) -> bool:
        """Whether the column holds sentences, which take several lines."""
        return self.number_format is None and self.width >= LONG_TEXT


class TableSheet:
    """One sheet that is filled from top to bottom.

    Parameters
    ----------
    book : NewSheets
        The workbook it belongs to.
    name : str
        Name of the sheet.
    """

    def __init__(self, book: NewSheets, name: str) -> None:
        self._book = book
        self._sheet: Any = book.workbook.add_worksheet(name, worksheet_class=FastSheet)
        self._formats: list[Any] = []
        self._long: list[tuple[int, float]] = []
        self._next = 0
        self.name = name
        self.left_out = 0
        self._sheet.set_landscape()
        self._sheet.set_paper(book.paper)
        self._sheet.set_margins(left=0.4, right=0.4, top=0.5, bottom=0.6)
        self._sheet.set_footer(book.footer)

    def header(self, headings: Sequence[Heading], keep: int = 0) -> None:
        """Write the header of the table that follows; keep it and the first columns in view and in print."""
        sheet, row = self._sheet, self._next
        self._formats = [self._book.cell_format(heading) for heading in headings]
        self._long = [(i, h.width) for i, h in enumerate(headings) if h.is_long]
        lines = max(lines_of(heading.title, heading.width) for heading in headings)
        sheet.set_row(row, LINE_HEIGHT * lines)
        for column, heading in enumerate(headings):
            sheet.set_column(column, column, heading.width)
            sheet.write_string(row, column, heading.title, self._book.head)
        sheet.freeze_panes(row + 1, keep)
        sheet.repeat_rows(row)
        if sum(heading.width for heading in headings) <= PAGE_WIDTH:
            sheet.fit_to_pages(1, 0)
            self._next += 1
            return
        sheet.set_print_scale(SMALLEST_PRINT)
        sheet.print_across()
        if keep:
            sheet.repeat_columns(0, keep - 1)
        self._next += 1

    def row(self, cells: Sequence[Cell]) -> int | None:
        """Write one row of the table and give its row number from 1; None where the sheet is full."""
        if self._next >= MAX_ROWS:
            self.left_out += 1
            return None
        lines = max((lines_of(cells[i], width) for i, width in self._long), default=1)
        height = LINE_HEIGHT * lines if lines > 1 else None
        self._sheet.put_row(self._next, _cut_all(cells), self._formats, height)
        self._next += 1
        return self._next

    def header_rows(
        self, headings: Sequence[Heading], further: Sequence[Sequence[str]], keep: int, tall: int = 6
    ) -> None:
        """Write a header of several rows: the headings, then a row of small text for each of the others.

        Parameters
        ----------
        headings : sequence of Heading
            First row.
        further : sequence of sequence of str
            The rows below it.
        keep : int
            Columns that stay in view and in print.
        tall : int
            Most lines that a header row takes.
        """
        self.header(headings, keep)
        top = self._next - 1
        for texts in further:
            lines = [
                lines_of(text, heading.width * 1.15) for text, heading in zip(texts, headings, strict=True)
            ]
            self._sheet.set_row(self._next, LINE_HEIGHT * 0.78 * min(max(lines), tall) + 2)
            for column, text in enumerate(texts):
                self._sheet.write_string(self._next, column, text, self._book.small_head)
            self._next += 1
        self._sheet.freeze_panes(self._next, keep)
        self._sheet.repeat_rows(top, self._next - 1)

    def raw_row(self, number: int, cells: str, width: int, lines: int = 1) -> None:
        """Write a row of cells that are XML already.

        Parameters
        ----------
        number : int
            Row from 1, below every row written before.
        cells : str
            The cells.
        width : int
            Number of columns that they take.
        lines : int
            Lines of text that the row holds.
        """
        self._sheet.put_cells(number - 1, cells, width, LINE_HEIGHT * lines if lines > 1 else None)
        self._next = number

    def cell_style(self, number_format: str | None, kind: str, width: float) -> int:
        """Give the index of a cell format: of a number or a text, of a kind (input, formula, fixed)."""
        return int(self._book.styled(number_format, kind, width)._get_xf_index())

    def frame(self, first: int, columns: tuple[int, int]) -> None:
        """Frame cells that are to be written in by hand.

        Parameters
        ----------
        first : int
            First row from 1; the last is the one written last.
        columns : tuple of int
            First and last column from 0.
        """
        if self._next < first:
            return
        look = {"type": "formula", "criteria": "=TRUE", "format": self._book.frame}
        self._sheet.conditional_format(first - 1, columns[0], self._next - 1, columns[1], look)

    @property
    def next_row(self) -> int:
        """Row from 1 that is written next."""
        return self._next + 1

    @property
    def raw(self) -> Any:
        """XlsxWriter's worksheet, for charts, breaks and conditional formats."""
        return self._sheet

    def skip(self, rows: int = 1) -> None:
        """Count rows that were written through :attr:`raw`, or leave them blank."""
        self._next += rows

    def line(self, *cells: Cell, bold: bool = False) -> None:
        """Write a row outside any table."""
        for column, value in enumerate(cells):
            self._cell(column, value, self._book.bold if bold else self._book.plain)
        self._next += 1

    def paragraph(self, text: str, columns: int, width: float = 110.0) -> None:
        """Write a text over several columns of a width together, its row as high as it needs to be."""
        self._sheet.fit_to_pages(1, 0)
        self._sheet.set_row(self._next, LINE_HEIGHT * lines_of(text, width))
        self._sheet.merge_range(self._next, 0, self._next, columns - 1, text[:MAX_TEXT], self._book.wrapped)
        self._next += 1

    def widths(self, *widths: float) -> None:
        """Set the widths of the first columns."""
        for column, width in enumerate(widths):
            self._sheet.set_column(column, column, width)

    def _cell(self, column: int, value: Cell, style: Any) -> None:
        if value is None:
            return
        if isinstance(value, str):
            self._sheet.write_string(self._next, column, _cut(value), style)
        else:
            self._sheet.write_number(self._next, column, value, style)


class NewSheets:
    """A workbook of our own sheets, in a folder of its own that goes at the end of the context.

    Parameters
    ----------
    footer : str
        Of every page, in XlsxWriter's notation.
    paper : int
        Number of the paper size.
    """

    def __init__(self, footer: str = "", paper: int = A4) -> None:
        self._folder = tempfile.TemporaryDirectory(prefix="cant-")
        self.footer = footer or "&L&F  &A&RPage &P of &N"
        self.paper = paper
        options = {
            "constant_memory": True,
            "strings_to_formulas": False,
            "strings_to_numbers": False,
            "strings_to_urls": False,
            "tmpdir": self._folder.name,
        }
        self.workbook = _PartsWorkbook(str(Path(self._folder.name) / "none.xlsx"), options)
        self.plain = self.workbook.add_format({"valign": "top"})
        self.word = self.workbook.add_format({"valign": "top", "align": "left", "indent": 1})
        self.bold = self.workbook.add_format({"bold": True, "valign": "top"})
        self.wrapped = self.workbook.add_format({"text_wrap": True, "valign": "top"})
        self.head = self.workbook.add_format(
            {"bold": True, "text_wrap": True, "valign": "top", "bottom": 1, "bg_color": "#DDE6E4"}
        )
        self.small_head = self.workbook.add_format(
            {"text_wrap": True, "valign": "top", "font_size": 8, "bottom": 1, "bg_color": "#EEF3F2"}
        )
        self.title = self.workbook.add_format({"bold": True, "font_size": 14, "valign": "top"})
        self.frame = self.workbook.add_format({"border": 1})
        self.box = self.workbook.add_format({"border": 1, "valign": "top", "text_wrap": True})
        self._numbers: dict[str, Any] = {}
        self._styled: dict[tuple[str | None, str, bool], Any] = {}

    def cell_format(self, heading: Heading) -> Any:
        """Give the format of a column's cells, made once for each number format."""
        code = heading.number_format
        if code is None:
            return self.wrapped if heading.is_long else self.word
        if code not in self._numbers:
            self._numbers[code] = self.workbook.add_format({"num_format": code, "valign": "top"})
        return self._numbers[code]

    def styled(self, number_format: str | None, kind: str, width: float = 0.0) -> Any:
        """Give the format of a cell of a kind: an input has a ground, what the program fixed is grey."""
        key = (number_format, kind, number_format is None and width >= LONG_TEXT)
        if key not in self._styled:
            look: dict[str, Any] = {"valign": "top", **KINDS.get(kind, {})}
            if number_format is not None:
                look["num_format"] = number_format
            elif key[2]:
                look["text_wrap"] = True
            else:
                look |= {"align": "left", "indent": 1}
            self._styled[key] = self.workbook.add_format(look)
        return self._styled[key]

    def table(self, name: str) -> TableSheet:
        """Add a sheet."""
        return TableSheet(self, name)

    def parts(self) -> LooseParts:
        """Finish the workbook and give its parts, which lie there until the end of the context."""
        if not self.workbook.fileclosed:
            self.workbook.close()
        return LooseParts(self.workbook.parts)

    def discard(self) -> None:
        """Let go of all that was written."""
        for sheet in self.workbook.worksheets():
            sheet.row_data_fh.close()
        self._folder.cleanup()

    def __enter__(self) -> NewSheets:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.discard()


class _PartsWorkbook(xlsxwriter.Workbook):  # type: ignore[misc]  # XlsxWriter comes without types
    """A workbook whose parts are not put together: they are taken over into another one."""

    def __init__(self, filename: str, options: dict[str, Any]) -> None:
        super().__init__(filename, options)
        self.parts: dict[str, Path] = {}

    def _get_packager(self) -> Packager:
        """Give the packager; a hook that XlsxWriter offers."""
        return _PartsPackager(self.parts)


class _PartsPackager(Packager):  # type: ignore[misc]
    """Leaves the parts where they were written and nothing to be put into the file."""

    def __init__(self, parts: dict[str, Path]) -> None:
        super().__init__()
        self._parts = parts

    def _create_package(self) -> list[tuple[str, str, bool]]:
        for file, name, _ in super()._create_package():
            self._parts[name] = Path(file)
        return []


def _cut(value: Cell) -> Cell:
    """Cut a text that is longer than a cell holds, with a mark."""
    if isinstance(value, str) and len(value) > MAX_TEXT:
        return value[:MAX_TEXT] + " ..."
    return value


def _cut_all(cells: Sequence[Cell]) -> Sequence[Cell]:
    """Cut the texts among cells, of which hardly any is too long."""
    if any(type(value) is str and len(value) > MAX_TEXT for value in cells):
        return [_cut(value) for value in cells]
    return cells


def lines_of(value: Cell, width: float) -> int:
    """Estimate how many lines a text takes in a column."""
    if not isinstance(value, str):
        return 1
    per_line = max(width - 1, 1)
    return sum(max(1, math.ceil(len(part) / per_line)) for part in value.split("\n"))
