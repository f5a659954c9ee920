"""A new workbook with the rows of a file that cannot be annotated in place."""

from __future__ import annotations

import io
import re
from datetime import date, datetime, time
from pathlib import PurePath
from typing import Any

import xlsxwriter

from cant.files.graft import free_name
from cant.files.grid import CellError, Sheet, Value, Workbook
from cant.files.sheet_xml import MAX_COLUMN
from cant.files.text import MAX_CELL_TEXT

_FORBIDDEN = re.compile(r"[\[\]:*?/\\\x00-\x1f]")
_DATE, _MOMENT, _TIME = "yyyy-mm-dd", "yyyy-mm-dd hh:mm", "hh:mm:ss"
_ERRORS = frozenset(["#DIV/0!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#REF!", "#VALUE!"])
_WIDEST = 40
_LARGEST_MERGED = 10_000
_FIRST_YEAR = 1900


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
    out = io.BytesIO()
    options = {"in_memory": True, "strings_to_formulas": False, "strings_to_urls": False}
    with xlsxwriter.Workbook(out, options) as book:
        formats = _Formats(book)
        visible = [sheet.visible for sheet in workbook.sheets]
        for index, sheet in enumerate(workbook.sheets):
            page = book.add_worksheet(sheet_name_in_new_workbook(workbook, index))
            _write(page, sheet, formats)
            if not sheet.visible and any(visible):
                page.hide()
            elif index == (visible.index(True) if any(visible) else 0):
                page.activate()
                page.set_first_sheet()
    return out.getvalue()


def sheet_name_in_new_workbook(workbook: Workbook, index: int) -> str:
    """Give the name that sheet ``index`` bears there: its own, or for a csv file one from its name."""
    taken: list[str] = []
    for sheet in workbook.sheets[: index + 1]:
        wanted = sheet.name or PurePath(workbook.file.replace("\\", "/")).stem
        wanted = _FORBIDDEN.sub(" ", wanted).strip().strip("'").strip()[:31] or "Sheet"
        taken.append(free_name(wanted if wanted.casefold() != "history" else wanted + " sheet", taken))
    return taken[-1]


class _Formats:
    """Cell formats by number format code, each made once."""

    def __init__(self, book: Any) -> None:
        self._book = book
        self._known: dict[str, Any] = {}

    def __getitem__(self, code: str) -> Any:
        if code not in self._known:
            self._known[code] = self._book.add_format({"num_format": code})
        return self._known[code]


def _write(page: Any, sheet: Sheet, formats: _Formats) -> None:
    _merge(page, sheet)  # before the values, for it blanks the cells that it covers
    widths: dict[int, int] = {}
    for row, cells in enumerate(sheet.rows, start=1):
        for column, value in enumerate(cells):
            if value is not None:
                code = sheet.number_formats.get((row, column))
                _write_cell(page, row - 1, column, value, code, formats)
                if isinstance(value, str):
                    widths[column] = max(widths.get(column, 0), min(len(value), _WIDEST))
                elif isinstance(value, datetime | date):
                    widths[column] = max(widths.get(column, 0), len(_MOMENT))
    for column in {*widths, *sheet.hidden_columns}:
        if column < MAX_COLUMN:
            width = max(widths.get(column, 0) + 1, 8.43)
            page.set_column(column, column, width, None, {"hidden": column in sheet.hidden_columns})
    for row in sheet.hidden_rows:
        if row <= len(sheet.rows):
            page.set_row(row - 1, None, None, {"hidden": True})


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


def _write_cell(page: Any, row: int, column: int, value: Value, code: str | None, formats: _Formats) -> None:
    style = formats[code] if code else None
    if isinstance(value, CellError) and value in _ERRORS:
        page.write_formula(row, column, f"={value}", style, str(value))
    elif isinstance(value, str):
        page.write_string(row, column, str(value)[:MAX_CELL_TEXT], style)
    elif isinstance(value, bool):
        page.write_boolean(row, column, value, style)
    elif isinstance(value, datetime | date) and value.year < _FIRST_YEAR:
        page.write_string(row, column, value.isoformat(), style)
    elif isinstance(value, datetime):
        page.write_datetime(row, column, value.replace(tzinfo=None), style or formats[_MOMENT])
    elif isinstance(value, date):
        page.write_datetime(row, column, value, style or formats[_DATE])
    elif isinstance(value, time):
        page.write_datetime(row, column, value.replace(tzinfo=None), style or formats[_TIME])
    elif value is not None:
        page.write_number(row, column, value, style)
