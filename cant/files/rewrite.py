"""A new workbook with the rows of a file that cannot be annotated in place.

The frame (sheets, widths, merged ranges) is made by XlsxWriter; the rows, which are nearly all of it, are
written straight into the frame's sheets.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from datetime import date, datetime, time
from pathlib import PurePath
from typing import Any

import xlsxwriter

from cant.errors import Place, column_letter
from cant.files.additions import OutValue
from cant.files.book import Book
from cant.files.cell_xml import cell_xml
from cant.files.edit import PackageEdit
from cant.files.formats import to_serial
from cant.files.graft import free_name
from cant.files.grid import CellError, CellRange, Sheet, Value, Workbook
from cant.files.package import Package
from cant.files.sheet_xml import MAX_COLUMN, reference
from cant.files.style_edit import StyleEdit, StyleNeed

_FORBIDDEN = re.compile(r"[\[\]:*?/\\\x00-\x1f]")
_EXTENT = re.compile(rb'<dimension ref="[^"]*"/>')
_DATE, _MOMENT, _TIME = "yyyy-mm-dd", "yyyy-mm-dd hh:mm", "hh:mm:ss"
_ERRORS = frozenset(["#DIV/0!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#REF!", "#VALUE!"])
_NARROWEST, _WIDEST = 8.43, 40
_SAMPLE_ROWS = 2000
_LARGEST_MERGED = 10_000


def rows_as_new_workbook(workbook: Workbook) -> bytes:
    """Write the values of a workbook into a new xlsx, each cell where it was and typed as it was read.

    Dates stay dates, errors stay errors, texts stay texts; a formula without a value becomes its text.

    Parameters
    ----------
    workbook : Workbook
        As read; a csv file's one sheet is named after the file.

    Returns
    -------
    bytes
        An xlsx that :func:`cant.files.annotate.annotate` takes.
    """
    package = Package(_frame(workbook))
    edit, book = PackageEdit(package), Book(package)
    part = package.related(book.part, "styles") or ""
    styles = StyleEdit(package.plain_xml(part), part, Place())
    for entry, sheet in zip(book.sheets, workbook.sheets, strict=True):
        if entry.part is not None:
            edit.replace(entry.part, _filled(package.xml(entry.part), sheet, styles))
    edit.replace(part, styles.result())
    return b"".join(edit.build())


def sheet_name_in_new_workbook(workbook: Workbook, index: int) -> str:
    """Give the name that sheet ``index`` bears there: its own, or for a csv file one from its name."""
    taken: list[str] = []
    for sheet in workbook.sheets[: index + 1]:
        wanted = sheet.name or PurePath(workbook.file.replace("\\", "/")).stem
        wanted = _FORBIDDEN.sub(" ", wanted).strip().strip("'").strip()[:31] or "Sheet"
        taken.append(free_name(wanted if wanted.casefold() != "history" else wanted + " sheet", taken))
    return taken[-1]


def _frame(workbook: Workbook) -> bytes:
    """Make a workbook with all sheets, their widths and merged ranges, and no values."""
    out = io.BytesIO()
    with xlsxwriter.Workbook(out, {"in_memory": True}) as book:
        visible = [sheet.visible for sheet in workbook.sheets]
        first = visible.index(True) if any(visible) else 0
        for index, sheet in enumerate(workbook.sheets):
            page = book.add_worksheet(sheet_name_in_new_workbook(workbook, index))
            _set_widths(page, sheet)
            _merge(page, sheet)
            if not sheet.visible and any(visible):
                page.hide()
            elif index == first:
                page.activate()
                page.set_first_sheet()
    return out.getvalue()


def _set_widths(page: Any, sheet: Sheet) -> None:
    widths: dict[int, int] = {}
    for cells in sheet.rows[:_SAMPLE_ROWS]:
        for column, value in enumerate(cells):
            if isinstance(value, str):
                widths[column] = max(widths.get(column, 0), min(len(value), _WIDEST))
            elif isinstance(value, datetime | date):
                widths[column] = max(widths.get(column, 0), len(_MOMENT))
    for column in {*widths, *sheet.hidden_columns}:
        if column < MAX_COLUMN:
            width = max(widths.get(column, 0) + 1, _NARROWEST)
            page.set_column(column, column, width, None, {"hidden": column in sheet.hidden_columns})


def _merge(page: Any, sheet: Sheet) -> None:
    """Merge as in the file, but for ranges that overlap or cover a great part of the sheet."""
    for one in sheet.merged:
        size = (one.last_row - one.first_row + 1) * (one.last_column - one.first_column + 1)
        if not 1 < size <= _LARGEST_MERGED:
            continue
        try:
            page.merge_range(one.first_row - 1, one.first_column, one.last_row - 1, one.last_column, "")
        except xlsxwriter.exceptions.OverlappingRange:
            continue


def _filled(frame: bytes, sheet: Sheet, styles: StyleEdit) -> Iterator[bytes]:
    """Give a sheet's part with its rows."""
    head, _, rest = frame.partition(b"<sheetData")
    tail = rest.partition(b"</sheetData>" if rest.startswith(b">") else b"/>")[2]
    if sheet.width:
        extent = reference(CellRange(1, 0, len(sheet.rows), sheet.width - 1))
        head = _EXTENT.sub(f'<dimension ref="{extent}"/>'.encode(), head)
    yield head + b"<sheetData>"
    letters = [column_letter(column) for column in range(sheet.width)]
    texts: dict[str | None, str] = {None: ""}
    for row, cells in enumerate(sheet.rows, start=1):
        hidden = ' hidden="1"' if row in sheet.hidden_rows else ""
        if not cells and not hidden:
            continue
        written = []
        for column, value in enumerate(cells):
            if value is None:
                continue
            out, code = _stored(value, sheet.number_formats.get((row, column)))
            if code not in texts:
                texts[code] = f' s="{styles.cell_style(StyleNeed(0, code, None, False))}"'
            written.append(cell_xml("", f"{letters[column]}{row}", texts[code], out))
        yield f'<row r="{row}"{hidden}>{"".join(written)}</row>'.encode()
    yield b"</sheetData>" + tail


def _stored(value: Value, code: str | None) -> tuple[OutValue, str | None]:
    """Give what a cell stores for a value, and its number format."""
    if isinstance(value, CellError):
        return (value if value in _ERRORS else str(value)), code
    if isinstance(value, str):
        return str(value), code
    if isinstance(value, datetime | date | time):
        serial = to_serial(value)
        default = _MOMENT if isinstance(value, datetime) else _DATE if isinstance(value, date) else _TIME
        return (value.isoformat(), None) if serial is None else (serial, code or default)
    return value, code
