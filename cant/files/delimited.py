"""Separated text: its encoding, its separator, and which of its cells are numbers beyond doubt."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from typing import NoReturn

from cant.errors import FileError, Place
from cant.files.grid import CellError, Sheet, TypedNumber, Value, Workbook

MAX_COLUMNS = 500
MAX_CELLS = 6_000_000
MAX_BYTES = 100_000_000
MAX_TEXT = 1_000_000
csv.field_size_limit(MAX_TEXT)  # once and for all: setting it for each file would not be safe among threads
_SEPARATORS = {";": "semicolon", "\t": "tab", ",": "comma", "|": "bar"}
_NUMBER = re.compile(r"-?(?:0|[1-9][0-9]{0,14})(?:\.[0-9]{1,15})?\Z")
_DECIMAL_COMMA = re.compile(r"-?[0-9]{1,15},[0-9]+\Z")
_ERRORS = frozenset(["#DIV/0!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#REF!", "#VALUE!"])
_CONTROL = re.compile("[\x00-\x08\x0e-\x1a\x1c-\x1f]")
_SAMPLE_LINES = 50


@dataclass(frozen=True, slots=True)
class _Text:
    text: str
    encoding: str


def read_delimited(data: bytes, file: str) -> Workbook:
    """Read separated text.

    A cell becomes a number where it is one beyond doubt: digits with a decimal point, no leading zeros, no
    decimal comma anywhere else in the file (there, a point may group thousands, so only whole numbers become
    numbers). Every other cell stays the text it is, for the reading room to judge with its column.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        Its name, for messages.

    Raises
    ------
    FileError
        No text, no table, or a line of absurd length.
    """
    place = Place(file)
    if len(data) > MAX_BYTES:
        message = f"is too large: at most {MAX_BYTES // 1_000_000} MB of separated text are read"
        raise FileError(message, place)
    decoded = _decode(data, place)
    text, declared = _declared_separator(decoded.text.replace("\r\n", "\n").replace("\r", "\n"))
    separator = declared or _separator(text)
    _check_width(text, separator, place)
    rows = _rows(text, separator, place)
    decimal_comma = any(_DECIMAL_COMMA.match(cell) for row in rows for cell in row if "," in cell)
    sheet = Sheet("", [_values(row, decimal_comma) for row in rows])
    sheet.next_column = sheet.width
    if not sheet.width:
        message = "holds no values; it should hold a table with a row of headings"
        raise FileError(message, place)
    name = _SEPARATORS.get(separator, separator)
    notes = [f"Read as text in {decoded.encoding}, columns separated by {name}."]
    if decimal_comma:
        notes.append("Some numbers have a decimal comma, so a point is not taken for a decimal sign unasked.")
    return Workbook(file, "csv", [sheet], notes)


def _decode(data: bytes, place: Place) -> _Text:
    for mark, encoding, name in (
        (b"\xef\xbb\xbf", "utf-8-sig", "UTF-8"),
        (b"\xff\xfe", "utf-16", "UTF-16"),
        (b"\xfe\xff", "utf-16", "UTF-16"),
    ):
        if data.startswith(mark):
            try:
                return _Text(data.decode(encoding), name)
            except UnicodeDecodeError:
                message = f"is damaged: it begins as {name} text and does not go on as such"
                raise FileError(message, place) from None
    unmarked = _unmarked_utf16(data)
    if unmarked:
        return _Text(data.decode(unmarked, "replace"), "UTF-16")
    if b"\0" in data:
        message = "is neither a workbook nor text; give an .xlsx, .xlsm, .xls, .ods, .csv or .tsv file"
        raise FileError(message, place)
    try:
        return _Text(data.decode("utf-8"), "UTF-8")
    except UnicodeDecodeError:
        return _Text(data.decode("cp1252", "replace"), "Windows code page 1252 (it is not valid UTF-8)")


def _unmarked_utf16(data: bytes) -> str | None:
    """Tell UTF-16 without a mark by every other byte of its beginning being zero."""
    head = data[:400]
    if len(head) < 8 or len(data) % 2:
        return None
    even, odd = head[::2].count(0), head[1::2].count(0)
    half = len(head) // 2
    if odd > 0.7 * half and even == 0:
        return "utf-16-le"
    if even > 0.7 * half and odd == 0:
        return "utf-16-be"
    return None


def _declared_separator(text: str) -> tuple[str, str | None]:
    """Take off the first line ``sep=;`` that some programs write."""
    match = re.match(r'"?sep=(.)"?\n', text, re.IGNORECASE)
    return (text[match.end() :], match.group(1)) if match else (text, None)


def _separator(text: str) -> str:
    """Choose the separator that cuts the first lines into the most even rows of two columns and more."""
    sample = [line for line in text[:200_000].splitlines() if line.strip()][:_SAMPLE_LINES]
    best, best_score = ",", 0.0
    for separator in _SEPARATORS:
        widths = Counter(_count(line, separator) for line in sample)
        widths.pop(0, None)
        if not widths:
            continue
        cuts, lines = max(widths.items(), key=lambda item: (item[1], item[0]))
        score = lines + 0.01 * min(cuts, 99)
        if score > best_score:
            best, best_score = separator, score
    return best


def _count(line: str, separator: str) -> int:
    """Count a separator outside of quotes."""
    if '"' not in line:
        return line.count(separator)
    return sum(part.count(separator) for part in line.split('"')[::2])


def _check_width(text: str, separator: str, place: Place) -> None:
    """Refuse a line with far too many columns before it is split."""
    first = text.lstrip("\r\n")[: 4 * MAX_TEXT].splitlines()[:1]
    columns = _count(first[0], separator) + 1 if first else 0
    if columns > MAX_COLUMNS:
        message = f"has {columns} columns in its first line; a table has at most {MAX_COLUMNS}"
        raise FileError(message, place)


def _rows(text: str, separator: str, place: Place) -> list[list[str]]:
    rows: list[list[str]] = []
    left = MAX_CELLS - text.count("\n")
    if left < 0:
        _too_large(place)
    try:
        for number, row in enumerate(csv.reader(_lines(text), delimiter=separator), start=1):
            left -= len(row)
            if left < 0:
                _too_large(place)
            if len(row) > MAX_COLUMNS and any(cell.strip() for cell in row[MAX_COLUMNS:]):
                message = f"has {len(row)} columns; a table has at most {MAX_COLUMNS}"
                raise FileError(message, place.at(number))
            rows.append(row[:MAX_COLUMNS])
    except csv.Error:
        message = (
            f"has a cell of more than {MAX_TEXT} characters; look for a quotation mark that is never closed"
        )
        raise FileError(message, place.at(len(rows) + 1)) from None
    return rows


def _lines(text: str) -> Iterator[str]:
    """Give the lines one by one; a copy of them all would be several times the file."""
    at = 0
    while at < len(text):
        end = text.find("\n", at) + 1 or len(text)
        yield text[at:end]
        at = end


def _too_large(place: Place) -> NoReturn:
    message = f"is too large: at most {MAX_CELLS // 1_000_000} million cells are read"
    raise FileError(message, place)


def _values(row: list[str], decimal_comma: bool) -> list[Value]:
    values = [_value(cell, decimal_comma) for cell in row]
    while values and values[-1] is None:
        values.pop()
    return values


def _value(cell: str, decimal_comma: bool) -> Value:
    if _NUMBER.match(cell) and not (decimal_comma and "." in cell):
        # A zero at the end is lost on the value, and a curve may be called 2.10.
        return TypedNumber.of(cell) if cell.endswith("0") and "." in cell else float(cell)
    stripped = cell.strip()
    if not stripped:
        return None
    if stripped in _ERRORS:
        return CellError(stripped)
    return _CONTROL.sub("", cell) if _CONTROL.search(cell) else cell
