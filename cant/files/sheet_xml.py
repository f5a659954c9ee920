"""The XML of a worksheet split into its rows and all the rest, with positions, for reading and editing alike.

Rows are most of the bytes, so they are found by byte search in a part that has been checked and is in plain
notation; the rest is small and is seen as elements.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache

from cant.errors import FileError, Place, column_letter
from cant.files.grid import CellRange
from cant.files.markup import elements, is_plain, plain

MAX_ROW = 1_048_576
MAX_COLUMN = 16_384
MAX_MERGED = 100_000

_ROOT = re.compile(rb"<((?:[\w.-]+:)?)(\w+)[\s/>]")
_ROW_NUMBER = re.compile(rb'\sr="(\d{1,10})"')
_REFERENCE = re.compile(r"\$?([A-Za-z]{1,3})?\$?(\d{1,7})?(?::\$?([A-Za-z]{1,3})?\$?(\d{1,7})?)?\Z")


class ColumnNumbers(dict[bytes, int]):
    """Columns from 0 by their letters, worked out on first use."""

    def __missing__(self, letters: bytes) -> int:
        number = 0
        for letter in letters:
            number = number * 26 + letter - 64
        self[letters] = number - 1
        return number - 1


COLUMNS = ColumnNumbers()


@dataclass(frozen=True, slots=True)
class RowSpan:
    """Where a row stands in the bytes.

    Attributes
    ----------
    number : int
        Row from 1.
    start, inner, inner_end, end : int
        As for :class:`cant.files.markup.Element`.
    """

    number: int
    start: int
    inner: int
    inner_end: int
    end: int


class SheetXml:
    """A worksheet part.

    Parameters
    ----------
    data : bytes
        The part, checked and in UTF-8; it is brought to plain notation if need be.
    name : str
        Name of the part.
    place : Place
        File and sheet.

    Attributes
    ----------
    data : bytes
        The part in plain notation.
    prefix : bytes
        Prefix of the spreadsheet's own elements with its colon, or empty.
    rows_start, rows_end : int
        Where the content of ``sheetData`` begins and ends.
    rest : Element
        The whole part without its rows; see :meth:`position`.
    """

    def __init__(self, data: bytes, name: str, place: Place) -> None:
        self.data = data if is_plain(data) else plain(data, name, place)
        self.name = name
        self.place = place
        root = _ROOT.search(self.data)
        self.prefix = root.group(1) if root else b""
        self.rows_start, self.rows_end = self._rows()
        rest = self.rest_data
        if rest.count(b"mergeCell ") > MAX_MERGED:
            message = f"is refused for safety: it has more than {MAX_MERGED} merged ranges"
            raise FileError(message, place)
        self.rest = elements(rest, name, place)

    @property
    def rest_data(self) -> bytes:
        """The part without its rows, in which the positions of ``rest`` count."""
        return self.data[: self.rows_start] + self.data[self.rows_end :]

    def position(self, rest_position: int) -> int:
        """Give the position in ``data`` of one in ``rest_data``; at the seam, the one behind the rows."""
        if rest_position < self.rows_start:
            return rest_position
        return rest_position + self.rows_end - self.rows_start

    def _rows(self) -> tuple[int, int]:
        at = self.data.find(b"<" + self.prefix + b"sheetData")
        if at < 0:
            return len(self.data), len(self.data)
        start = self.data.index(b">", at) + 1
        if self.data[start - 2 : start] == b"/>":
            return start, start
        end = self.data.rfind(b"</" + self.prefix + b"sheetData>")
        return start, max(start, end)

    def rows(self) -> Iterator[RowSpan]:
        """Give the rows as they stand.

        Raises
        ------
        FileError
            A row number that no sheet has, or elements other than rows.
        """
        data, number, at = self.data, 0, self.rows_start
        tag = _row_tag(self.prefix)
        close = b"</" + self.prefix + b"row>"
        while True:
            match = tag.match(data, at, self.rows_end)
            if match is None:
                break
            found = _ROW_NUMBER.search(match.group(1))
            number = int(found.group(1)) if found else number + 1
            if not 0 < number <= MAX_ROW:
                message = f"is damaged: it has a row numbered {number}; a sheet has rows 1 to {MAX_ROW}"
                raise FileError(message, self.place)
            inner = match.end()
            start = match.start(1) - len(self.prefix) - 4
            if data[inner - 2 : inner] == b"/>":
                yield RowSpan(number, start, inner, inner, inner)
                at = inner
                continue
            inner_end = data.find(close, inner, self.rows_end)
            at = inner_end + len(close)
            yield RowSpan(number, start, inner, inner_end, at)
        if data[at : self.rows_end].strip():
            message = "is damaged: it holds something that is not a row among its rows"
            raise FileError(message, self.place)

    def merged(self) -> list[CellRange]:
        """Give the merged ranges, clipped to the sheet; the cells in them are never listed."""
        holder = self.rest.child("mergeCells")
        if holder is None:
            return []
        found = (parse_range(one.get("ref")) for one in holder.all("mergeCell"))
        return [one for one in found if one is not None]

    def hidden_columns(self) -> frozenset[int]:
        """Give the hidden columns from 0."""
        holder = self.rest.child("cols")
        hidden = bytearray(MAX_COLUMN)
        for one in holder.all("col") if holder else ():
            if one.flag("hidden"):
                first, last = _small_number(one.get("min")), _small_number(one.get("max"))
                first, last = max(first, 1) - 1, min(last, MAX_COLUMN)
                hidden[first:last] = b"\1" * (last - first)
        return frozenset(column for column, is_hidden in enumerate(hidden) if is_hidden)


@lru_cache(maxsize=8)
def _row_tag(prefix: bytes) -> re.Pattern[bytes]:
    attribute = rb"""\s+[\w:.-]+\s*=\s*(?:"[^"]*"|'[^']*')"""
    return re.compile(rb"\s*<" + re.escape(prefix) + rb"row((?:" + attribute + rb")*)/?>")


def _small_number(text: str) -> int:
    return int(text) if text.isdecimal() and len(text) < 8 else 0


def parse_range(text: str) -> CellRange | None:
    """Give the rectangle that ``B2:D9``, ``B:D`` or ``2:9`` means, None where the text is no reference."""
    match = _REFERENCE.match(text.strip())
    if match is None or not text.strip():
        return None
    letters, row, letters2, row2 = match.groups()
    if ":" not in text:
        letters2, row2 = letters, row
    first_column = COLUMNS[letters.upper().encode()] if letters else 0
    last_column = COLUMNS[letters2.upper().encode()] if letters2 else MAX_COLUMN - 1
    first_row, last_row = int(row or 1), int(row2 or MAX_ROW)
    columns = sorted((first_column, min(last_column, MAX_COLUMN - 1)))
    rows = sorted((max(1, first_row), max(1, min(last_row, MAX_ROW))))
    return CellRange(rows[0], columns[0], rows[1], columns[1])


def reference(one: CellRange) -> str:
    """Give the reference of a rectangle, a single cell without a colon."""
    first = f"{column_letter(one.first_column)}{one.first_row}"
    last = f"{column_letter(one.last_column)}{one.last_row}"
    return first if first == last else f"{first}:{last}"
