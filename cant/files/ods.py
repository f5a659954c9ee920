"""An OpenDocument spreadsheet (.ods), read in one pass over its content.

Rows and cells may be repeated by a count; blank repeats are skipped and filled ones are counted against a
budget, so that a few bytes never become a million cells.
"""

from __future__ import annotations

import re
from datetime import date, datetime, time
from typing import NoReturn
from xml.parsers import expat

from cant.errors import FileError, Place
from cant.files.archive import Archive
from cant.files.budget import Budget
from cant.files.grid import CellError, CellRange, Sheet, Uncalculated, Value, Workbook
from cant.files.markup import MAX_DEPTH
from cant.files.sheet_xml import MAX_COLUMN, MAX_MERGED, MAX_ROW

MAX_TAGS = 8_000_000
"""Start and end tags of the content that are read; a filled cell has about four."""

_NS = "urn:oasis:names:tc:opendocument:xmlns:"
_OFFICE, _TABLE, _TEXT, _STYLE = (f"{_NS}{name}:1.0 " for name in ("office", "table", "text", "style"))
_CALC = "urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0 "
_SKIPPED = frozenset([
    _OFFICE + "annotation", _TABLE + "shapes", _TABLE + "tracked-changes", _OFFICE + "forms",
    _TEXT + "ruby-text", _TABLE + "content-validations", _TABLE + "database-ranges",
    _NS + "drawing:1.0 frame", _NS + "drawing:1.0 custom-shape",
])  # fmt: skip
_DURATION = re.compile(r"PT(\d+)H(\d+)M(\d+(?:[.,]\d+)?)S\Z")
_CELLS = (_TABLE + "table-cell", _TABLE + "covered-table-cell")


def read_ods(archive: Archive, file: str) -> Workbook:
    """Read an OpenDocument spreadsheet.

    Parameters
    ----------
    archive : Archive
        The file.
    file : str
        Its name, for messages.

    Raises
    ------
    FileError
        Damaged, refused for safety, or too large.
    """
    place = Place(file)
    if "content.xml" not in archive:
        message = "is damaged: it has no content; open it in a spreadsheet program and save it anew"
        raise FileError(message, place)
    content = archive.read("content.xml")
    if content.count(b"<") > MAX_TAGS:
        message = "is too large to be read safely; keep the curve list in a file of its own"
        raise FileError(message, place)
    reader = _ContentReader(place)
    reader.parse(content)
    if not reader.sheets:
        message = "holds no sheet with cells; add a sheet with the curve list"
        raise FileError(message, place)
    return Workbook(file, "ods", reader.sheets)


class _ContentReader:
    """Follows the content part element by element."""

    def __init__(self, place: Place) -> None:
        self.place = place
        self.sheets: list[Sheet] = []
        self.budget = Budget()
        self.depth = 0
        self.skipping = 0
        self.hidden_styles: set[str] = set()
        self.style = ""
        self.tables = 0
        self.row: list[Value] = []
        self.row_number = 0
        self.row_attributes: dict[str, str] = {}
        self.column = 0
        self.cell: dict[str, str] = {}
        self.in_cell = False
        self.paragraphs: list[str] = []
        self.in_paragraph = 0
        self.hidden_rows: set[int] = set()
        self.hidden_columns: set[int] = set()
        self.formulas: set[tuple[int, int]] = set()
        self.formats: dict[tuple[int, int], str] = {}

    def parse(self, data: bytes) -> None:
        parser = expat.ParserCreate(namespace_separator=" ")
        parser.buffer_text = True
        parser.StartDoctypeDeclHandler = self._doctype
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.CharacterDataHandler = self._text
        try:
            parser.Parse(data, True)
        except (expat.ExpatError, LookupError, ValueError):
            message = "is damaged: its content is not well-formed; open it and save it anew"
            raise FileError(message, self.place) from None

    def _doctype(self, *_: object) -> NoReturn:
        message = "is refused for safety: its content declares a document type, which no workbook does"
        raise FileError(message, self.place)

    def _start(self, tag: str, attributes: dict[str, str]) -> None:
        self.depth += 1
        if self.depth > MAX_DEPTH:
            message = f"is refused for safety: its content is nested {MAX_DEPTH} deep and more"
            raise FileError(message, self.place)
        if self.skipping or tag in _SKIPPED:
            self.skipping += 1
        elif tag in _CELLS:
            self.cell, self.in_cell, self.paragraphs = attributes, True, []
        elif self.in_cell:
            self._start_text(tag, attributes)
        elif tag == _TABLE + "table-row":
            self.row, self.column, self.row_attributes = [], 0, attributes
        elif tag == _TABLE + "table-column":
            self._column(attributes)
        elif tag == _TABLE + "table":
            self._start_table(attributes)
        elif tag == _STYLE + "style":
            self.style = attributes.get(_STYLE + "name", "")
        elif tag == _STYLE + "table-properties" and attributes.get(_TABLE + "display") == "false":
            self.hidden_styles.add(self.style)

    def _start_text(self, tag: str, attributes: dict[str, str]) -> None:
        if tag == _TEXT + "p":
            self.in_paragraph += 1
            self.paragraphs.append("")
        elif self.in_paragraph and tag == _TEXT + "s":
            self.paragraphs[-1] += " " * min(_count(attributes, _TEXT + "c"), 1000)
        elif self.in_paragraph and tag == _TEXT + "tab":
            self.paragraphs[-1] += "\t"
        elif self.in_paragraph and tag == _TEXT + "line-break":
            self.paragraphs[-1] += "\n"

    def _text(self, text: str) -> None:
        if self.in_paragraph and not self.skipping:
            self.paragraphs[-1] += text

    def _end(self, tag: str) -> None:
        self.depth -= 1
        if self.skipping:
            self.skipping -= 1
        elif tag in _CELLS:
            self._end_cell()
        elif tag == _TEXT + "p" and self.in_paragraph:
            self.in_paragraph -= 1
        elif tag == _TABLE + "table-row" and self.tables:
            self._end_row()
        elif tag == _TABLE + "table" and self.tables:
            self._end_table()

    def _start_table(self, attributes: dict[str, str]) -> None:
        self.tables += 1
        if len(self.sheets) >= 255:
            message = "is refused for safety: it has more than 255 sheets"
            raise FileError(message, self.place)
        self.place = Place(self.place.file, attributes.get(_TABLE + "name", ""))
        visible = attributes.get(_TABLE + "style-name", "") not in self.hidden_styles
        self.sheets.append(Sheet(self.place.sheet, [], visible=visible))
        self.row_number, self.column = 0, 0
        self.hidden_rows, self.hidden_columns, self.formulas, self.formats = set(), set(), set(), {}

    def _end_table(self) -> None:
        self.tables -= 1
        sheet = self.sheets[-1]
        sheet.hidden_rows = frozenset(self.hidden_rows)
        sheet.hidden_columns = frozenset(self.hidden_columns)
        sheet.formulas, sheet.number_formats = self.formulas, self.formats
        sheet.next_column = sheet.width

    def _column(self, attributes: dict[str, str]) -> None:
        last = min(self.column + _count(attributes, _TABLE + "number-columns-repeated"), MAX_COLUMN)
        if _is_hidden(attributes):
            self.hidden_columns.update(range(self.column, last))
        self.column = last

    def _end_row(self) -> None:
        first = self.row_number + 1
        repeated = _count(self.row_attributes, _TABLE + "number-rows-repeated")
        self.row_number = min(self.row_number + repeated, MAX_ROW)
        row = self.row
        while row and row[-1] is None:
            row.pop()
        if _is_hidden(self.row_attributes):
            self.hidden_rows.update(range(first, self.row_number + 1))
        if not row:
            return
        copies = self.row_number - first + 1
        self.budget.take(copies * (len(row) - row.count(None)), copies * len(row), self.place)
        rows = self.sheets[-1].rows
        rows.extend([_NO_ROW] * (first - 1 - len(rows)))
        rows.extend(list(row) for _ in range(copies))

    def _end_cell(self) -> None:
        self.in_cell, self.in_paragraph = False, 0
        if not self.tables:
            return
        repeated = _count(self.cell, _TABLE + "number-columns-repeated")
        end = min(self.column + repeated, MAX_COLUMN)
        value = self._value()
        row = self.row_number + 1
        if value is not None:
            self.row.extend([None] * (self.column - len(self.row)))
            self.row.extend([value] * (end - self.column))
        if _TABLE + "formula" in self.cell:
            self.formulas.add((row, self.column))
        if value is not None and self.cell.get(_OFFICE + "value-type") == "percentage":
            self.formats[row, self.column] = "0.00%"
        self._merge(row)
        self.column = end

    def _merge(self, row: int) -> None:
        wide = _count(self.cell, _TABLE + "number-columns-spanned")
        high = _count(self.cell, _TABLE + "number-rows-spanned")
        merged = self.sheets[-1].merged
        if (wide > 1 or high > 1) and len(merged) < MAX_MERGED:
            last_row, last_column = min(row + high - 1, MAX_ROW), min(self.column + wide, MAX_COLUMN) - 1
            merged.append(CellRange(row, self.column, last_row, last_column))

    def _value(self) -> Value:
        kind = self.cell.get(_OFFICE + "value-type", "")
        shown = "\n".join(self.paragraphs)
        formula = self.cell.get(_TABLE + "formula")
        if self.cell.get(_CALC + "value-type") == "error" or (formula and shown.startswith("#") and not kind):
            return CellError(shown or "#VALUE!")
        if formula and not kind:
            return Uncalculated("=" + formula.partition("=")[2])
        if kind in ("float", "percentage", "currency"):
            return _number(self.cell.get(_OFFICE + "value", ""), shown)
        if kind == "boolean":
            return self.cell.get(_OFFICE + "boolean-value") == "true"
        if kind == "date":
            return _date(self.cell.get(_OFFICE + "date-value", ""), shown)
        if kind == "time":
            return _time(self.cell.get(_OFFICE + "time-value", ""), shown)
        text = shown or self.cell.get(_OFFICE + "string-value", "")
        return text if text and not text.isspace() else None


_NO_ROW: list[Value] = []


def _count(attributes: dict[str, str], name: str) -> int:
    text = attributes.get(name, "1")
    return int(text) if text.isdecimal() and len(text) < 8 else 1


def _is_hidden(attributes: dict[str, str]) -> bool:
    return attributes.get(_TABLE + "visibility", "visible") in ("collapse", "filter")


def _number(text: str, shown: str) -> Value:
    try:
        number = float(text)
    except ValueError:
        return CellError(shown or text or "#VALUE!")
    return number if number - number == 0 and "_" not in text else CellError(text)


def _date(text: str, shown: str) -> Value:
    try:
        moment = datetime.fromisoformat(text[:26])
    except ValueError:
        return shown or None
    return date.fromisoformat(text) if "T" not in text else moment


def _time(text: str, shown: str) -> Value:
    match = _DURATION.match(text)
    if match is None:
        return shown or None
    hours, minutes, seconds = int(match[1]), int(match[2]), float(match[3].replace(",", "."))
    if hours > 23 or minutes > 59 or seconds >= 60:
        return (hours + minutes / 60 + seconds / 3600) / 24
    return time(hours, minutes, int(seconds), int(seconds % 1 * 1_000_000))
