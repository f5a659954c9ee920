"""From the cells of a worksheet to plain values: one pass over the rows.

A pattern takes the plainest, by far most frequent cells at once; every other cell goes through one function.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime
from functools import lru_cache
from typing import NoReturn

from cant.errors import FileError
from cant.files.budget import Budget
from cant.files.cell_set import CellSet
from cant.files.formats import CellFormats, NumberFormats, from_serial
from cant.files.grid import CellError, CellRange, Uncalculated, Value
from cant.files.markup import unescape
from cant.files.sheet_xml import COLUMNS, MAX_COLUMN, RowSpan, SheetXml
from cant.files.strings import rich_text
from cant.files.text import from_cell_text

MAX_TEXT = 1_000_000

_ATTRIBUTE = re.compile(rb"""([\w:.-]+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")
_CELL_NAME = re.compile(rb"([A-Z]{1,3})[0-9]{1,7}\Z")
_HIDDEN = re.compile(rb"""\shidden=["'](?:1|true)["']""")
_MINUS = ord("-")
_LARGEST = sys.float_info.max
_BLANK_ROW: list[Value] = []


@dataclass(frozen=True, slots=True)
class BookValues:
    """What all sheets of a workbook share: texts, formats, epoch, and the budget."""

    strings: list[str | None]
    formats: CellFormats
    epoch_1904: bool
    budget: Budget


class CellReader:
    """Reads the rows of one sheet.

    Parameters
    ----------
    sheet : SheetXml
        The worksheet.
    book : BookValues
        Texts, formats, epoch and budget of its workbook.
    ignored : sequence of CellRange
        Cells of an earlier annotation, read as if they were not there.
    keep : bool
        False where only the extent and the formats of the rows are wanted: ``rows`` and ``formulas`` stay
        empty.

    Attributes
    ----------
    rows : list of list
        As in :class:`cant.files.grid.Sheet`.
    formulas : CellSet
        Cells with a formula.
    number_formats : NumberFormats
        Formats by cell.
    hidden_rows : set of int
        From 1.
    last_value : int
        Last column from 0 with a value; -1 where there is none.
    row_ends : set of int
        Columns from 0 that are the last of some row with a cell that is at least formatted.
    """

    def __init__(
        self, sheet: SheetXml, book: BookValues, ignored: Sequence[CellRange] = (), keep: bool = True
    ) -> None:
        self.sheet = sheet
        self.book = book
        self.place = sheet.place
        self.rows: list[list[Value]] = []
        self.formulas = CellSet()
        self.number_formats = NumberFormats(book.formats)
        self.hidden_rows: set[int] = set()
        self.last_value = -1
        self.row_ends: set[int] = set()
        self.ignored = ignored
        self._keep = keep
        self._find = _cells(sheet.prefix).findall
        self._patterns = _parts(sheet.prefix)
        self._date_styles = frozenset(str(style).encode() for style in book.formats.dates)

    def read(self) -> None:
        """Read all rows."""
        data = self.sheet.data
        for span in self.sheet.rows():
            if _HIDDEN.search(data, span.start, span.inner):
                self.hidden_rows.add(span.number)
            if span.inner_end > span.inner:
                self._row(span)

    def _row(self, span: RowSpan) -> None:
        cells: list[Value] = []
        styles: list[int] = []
        plain = self._fill(span, cells, styles)
        if self.ignored:
            self._ignore(span.number, cells, styles)
        while cells and cells[-1] is None and not styles[-1]:
            cells.pop()
            styles.pop()
        self.row_ends.add(len(cells) - 1)
        self.number_formats.add_row(span.number, styles)
        while cells and cells[-1] is None:
            cells.pop()
        if not cells:
            return
        self.last_value = max(self.last_value, len(cells) - 1)
        self.book.budget.take(plain, len(cells), self.place)
        if not self._keep:
            return
        index = span.number - 1
        if index >= len(self.rows):
            self.rows.extend([_BLANK_ROW] * (index - len(self.rows)))
            self.rows.append(cells)
        else:
            self.rows[index] = _overlaid(self.rows[index], cells)

    def _ignore(self, row: int, cells: list[Value], styles: list[int]) -> None:
        for one in self.ignored:
            if one.first_row <= row <= one.last_row:
                for column in range(one.first_column, min(one.last_column + 1, len(cells))):
                    cells[column] = None
                    styles[column] = 0
                    self.formulas.discard((row, column))

    def _fill(self, span: RowSpan, cells: list[Value], styles: list[int]) -> int:
        """Read the cells of a row and count the plain ones; the loop is the hot one of all reading."""
        others = 0
        strings = self.book.strings
        dates = self._date_styles
        for letters, style, kind, text, other in self._find(self.sheet.data, span.inner, span.inner_end):
            if other:
                self._other(span.number, other, cells, styles)
                others += 1
                continue
            column = COLUMNS[letters]
            if column != len(cells):
                self._go_to(column, span.number, cells, styles)
            styles.append(int(style) if style else 0)
            try:
                if not text:
                    cells.append(None)
                elif kind == b"s":
                    cells.append(strings[int(text)] if text[0] != _MINUS else strings[len(strings)])
                elif style in dates:
                    cells.append(from_serial(float(text), self.book.epoch_1904))
                else:
                    number = float(text)
                    cells.append(number if -_LARGEST <= number <= _LARGEST else CellError(text.decode()))
            except (ValueError, IndexError):
                cells.append(self._unusable(kind, text, span.number, column))
        return max(0, len(cells) - cells.count(None) - others)

    def _unusable(self, kind: bytes, text: bytes, row: int, column: int) -> CellError:
        if kind == b"s":
            self._damaged(f"the cell names text {text.decode()}, which the file does not have", row, column)
        return CellError(text.decode())

    def _damaged(self, what: str, row: int, column: int) -> NoReturn:
        message = f"is damaged: {what}; open it in a spreadsheet program and save it anew"
        raise FileError(message, self.place.at(row, column))

    def _go_to(self, column: int, row: int, cells: list[Value], styles: list[int]) -> None:
        """Make ``column`` the next one of the row."""
        if column >= MAX_COLUMN:
            self._damaged(f"it has a cell beyond the last column, {MAX_COLUMN}", row, MAX_COLUMN - 1)
        missing = column - len(cells)
        if missing < 0:
            self._damaged("its cells are not in the order of their columns", row, column)
        cells.extend([None] * missing)
        styles.extend([0] * missing)

    def _other(self, row: int, cell: bytes, cells: list[Value], styles: list[int]) -> None:
        """Read a cell with a formula, a text of its own, or an unusual notation."""
        self.book.budget.take(1, 0, self.place)
        head, inner = self._patterns.split(cell)
        attributes = {key: plain or quoted for key, plain, quoted in _ATTRIBUTE.findall(head)}
        name = attributes.get(b"r")
        column = len(cells)
        if name is not None:
            match = _CELL_NAME.match(name.upper())
            if match is None:
                self._damaged(f"a cell is named {name.decode('utf-8', 'replace')[:20]!r}", row, column)
            column = COLUMNS[match.group(1)]
        if column != len(cells):
            self._go_to(column, row, cells, styles)
        style = attributes.get(b"s", b"0")
        styles.append(int(style) if style.isdigit() and len(style) < 8 else 0)
        cells.append(self._value(row, column, attributes.get(b"t", b"n"), style, inner))

    def _value(self, row: int, column: int, kind: bytes, style: bytes, inner: bytes) -> Value:
        patterns = self._patterns
        stored = patterns.value.search(inner)
        raw = stored.group(1) if stored else b""
        formula = patterns.formula.search(inner)
        if formula:
            if self._keep:
                self.formulas.add((row, column))
            if not raw and kind != b"str":
                code = unescape((formula.group(1) or b"").decode("utf-8"))
                return Uncalculated("=" + from_cell_text(code))
        if kind == b"inlineStr":
            return self._text(rich_text(inner, self.sheet.prefix), row, column)
        text = raw.decode("utf-8")
        if not text:
            return None
        if kind == b"s":
            return self._shared(text.strip(), row, column)
        if kind == b"str":
            return self._text(text, row, column)
        if kind == b"b":
            return text.strip().lower() in ("1", "true")
        if kind == b"e":
            return CellError(unescape(text))
        if kind == b"d":
            return _iso_date(text.strip())
        return self._numeric(text.strip(), style)

    def _shared(self, text: str, row: int, column: int) -> str | None:
        if not text.isdecimal() or len(text) > 9 or int(text) >= len(self.book.strings):
            self._damaged(f"the cell names text {text[:20]}, which the file does not have", row, column)
        return self.book.strings[int(text)]

    def _numeric(self, text: str, style: bytes) -> Value:
        try:
            number = _number(text.encode())
        except ValueError:
            return CellError(unescape(text))
        if style in self._date_styles and not isinstance(number, str):
            return from_serial(number, self.book.epoch_1904)
        return number

    def _text(self, text: str, row: int, column: int) -> str | None:
        if len(text) > MAX_TEXT:
            message = f"is refused for safety: a cell holds {len(text)} characters, a sheet's holds 32767"
            raise FileError(message, self.place.at(row, column))
        text = from_cell_text(unescape(text))
        return text if text and not text.isspace() else None


def _number(text: bytes) -> float | CellError:
    number = float(text)
    if number - number != 0 or b"_" in text:  # infinite, or no number to a spreadsheet
        return CellError(text.decode())
    return number


def _iso_date(text: str) -> Value:
    try:
        moment = datetime.fromisoformat(text)
    except ValueError:
        return text
    return date.fromisoformat(text) if len(text) == len("2000-01-01") else moment


def _overlaid(old: list[Value], new: list[Value]) -> list[Value]:
    """Put a second row of the same number over the first."""
    width = max(len(old), len(new))
    first = old + [None] * (width - len(old))
    second = new + [None] * (width - len(new))
    return [two if two is not None else one for one, two in zip(first, second, strict=True)]


@lru_cache(maxsize=8)
def _cells(prefix: bytes) -> re.Pattern[bytes]:
    p = re.escape(prefix)
    return re.compile(
        rb"<" + p + rb'c r="([A-Z]{1,3})[0-9]+"(?: s="([0-9]{1,7})")?(?: t="([sn])")?'
        rb"(?:/>|><" + p + rb"v>([-+.0-9eE]{1,40})</" + p + rb"v></" + p + rb"c>)"
        rb"|(<" + p + rb"""c(?=[\s/>])(?:[^>"']|"[^"]*"|'[^']*')*(?:(?<=/)>|>.*?</""" + p + rb"c>))",
        re.DOTALL,
    )


@dataclass(frozen=True, slots=True)
class _Parts:
    """Patterns for the insides of a cell."""

    tag: re.Pattern[bytes]
    value: re.Pattern[bytes]
    formula: re.Pattern[bytes]

    def split(self, cell: bytes) -> tuple[bytes, bytes]:
        """Give the start tag and what follows it."""
        match = self.tag.match(cell)
        end = match.end() if match else len(cell)
        return cell[:end], cell[end:]


@lru_cache(maxsize=8)
def _parts(prefix: bytes) -> _Parts:
    p = re.escape(prefix)
    return _Parts(
        re.compile(rb"""<(?:[^>"']|"[^"]*"|'[^']*')*>"""),
        re.compile(rb"<" + p + rb"v(?:\s[^>]*)?>([^<]*)</" + p + rb"v>"),
        re.compile(
            rb"<" + p + rb"""f(?=[\s/>])(?:[^>"']|"[^"]*"|'[^']*')*(?:(?<=/)>|>([^<]*)</""" + p + rb"f>)"
        ),
    )
