"""A new workbook of plain tables, written row by row so that a register never stands in memory.

Knows how a sheet of ours looks (header, widths, print set-up) and that a text of the user's stays text; knows
nothing of plans.
"""

from __future__ import annotations

import tempfile
from collections.abc import Sequence
from pathlib import Path
from types import TracebackType
from typing import Any

import xlsxwriter
from xlsxwriter.packager import Packager

from cant.files.loose_parts import LooseParts
from cant.writing.columns import Cell
from cant.writing.fast_rows import FastSheet
from cant.writing.looks import (
    A4,
    LINE_HEIGHT,
    MAX_ROWS,
    MAX_TEXT,
    PAGE_WIDTH,
    SMALLEST_PRINT,
    Heading,
    Looks,
    lines_of,
)


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
        self._formats = [self._book.looks.cell_format(heading) for heading in headings]
        self._long = [(i, h.width) for i, h in enumerate(headings) if h.is_long]
        lines = max(lines_of(heading.title, heading.width) for heading in headings)
        sheet.set_row(row, LINE_HEIGHT * lines)
        for column, heading in enumerate(headings):
            sheet.set_column(column, column, heading.width)
            sheet.write_string(row, column, heading.title, self._book.looks.head)
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
                self._sheet.write_string(self._next, column, text, self._book.looks.small_head)
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
        return int(self._book.looks.styled(number_format, kind, width)._get_xf_index())

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
        look = {"type": "formula", "criteria": "=TRUE", "format": self._book.looks.frame}
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
            self._cell(column, value, self._book.looks.bold if bold else self._book.looks.plain)
        self._next += 1

    def paragraph(self, text: str, columns: int, width: float = 110.0) -> None:
        """Write a text over several columns of a width together, its row as high as it needs to be."""
        self._sheet.fit_to_pages(1, 0)
        self._sheet.set_row(self._next, LINE_HEIGHT * lines_of(text, width))
        self._sheet.merge_range(
            self._next, 0, self._next, columns - 1, text[:MAX_TEXT], self._book.looks.wrapped
        )
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
        self.looks = Looks(self.workbook)

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
