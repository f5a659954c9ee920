"""Small tables (traffic, limits, settings, turnouts) as records of cells, each with its place.

In these tables a mistake concerns the whole plan, so every doubt is an error; curve sheets, where one bad row
must not stop the others, are read by other modules.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice

from cant.errors import InputError, Place
from cant.files.grid import CellError, Sheet, Uncalculated, Value
from cant.model.reading import ColumnReading, SheetReading
from cant.reading.columns import column, columns_of, strong_headings
from cant.reading.headings import split_unit
from cant.reading.numbers import parse_quantity
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.words import meaning_of
from cant.units import Unit, find_unit, ratio, unit


@dataclass(frozen=True)
class Cell:
    """One cell of a record: its value, where it stands, and the unit its column is in."""

    value: Value
    place: Place
    heading: str
    unit: str = ""

    @property
    def text(self) -> str:
        """The content as words, "" for a blank."""
        return squeeze(shown(self.value))

    @property
    def blank(self) -> bool:
        """Whether the cell says nothing."""
        return is_blank(self.value)

    def number(self, target: str = "") -> float | None:
        """Give the number in the unit asked for, None for a blank.

        Raises
        ------
        InputError
            Where no number stands here, or its unit is of another dimension.
        """
        if self.blank:
            return None
        value, own = self._number_and_unit()
        source = own.symbol if own else self.unit
        if not target or not source or source == target:
            return value
        if unit(source).dimension != unit(target).dimension:
            message = f"'{self.text}' of '{self.heading}' is in {source}; a unit like {target} belongs there"
            raise InputError(message, self.place)
        return value * ratio(source, target)

    def _number_and_unit(self) -> tuple[float, Unit | None]:
        if isinstance(self.value, float | int) and not isinstance(self.value, bool):
            self._refuse_absurd(float(self.value))
            return float(self.value), None
        self.refuse_errors()
        found = parse_quantity(self.text) if isinstance(self.value, str) else None
        if found is None or found[2]:
            message = f"'{self.text}' stands under '{self.heading}' where a number belongs"
            raise InputError(message, self.place)
        self._refuse_absurd(found[0])
        return found[0], found[1]

    def _refuse_absurd(self, value: float) -> None:
        if not abs(value) <= LARGEST:
            message = f"'{self.text}' of '{self.heading}' is not possible; it is a number up to {LARGEST:.0f}"
            raise InputError(message, self.place)

    def refuse_errors(self) -> None:
        """Raise InputError where the cell holds an error value or a formula without a value."""
        if isinstance(self.value, CellError):
            message = f"the cell shows the error {self.value}; a value belongs there"
            raise InputError(message, self.place)
        if isinstance(self.value, Uncalculated):
            message = (
                f"the formula {self.value} has no stored value; open the file in a spreadsheet program and "
                "save it, or type the value"
            )
            raise InputError(message, self.place)

    def yes_no(self, default: bool) -> bool:
        """Give yes or no, the default for a blank; InputError for any other word."""
        if isinstance(self.value, bool):
            return self.value
        if self.blank:
            return default
        meaning = meaning_of("yes_no", self.text)
        if meaning is None:
            message = f"'{self.text}' stands under '{self.heading}' where yes or no belongs"
            raise InputError(message, self.place)
        return meaning == "yes"


Record = dict[str, Cell]
LARGEST = 1e8
"""No number of these tables is larger, in any unit; one that is much larger cannot be computed with."""
MOST_ROWS = {"traffic": 5_000, "limits": 5_000, "turnouts": 50_000}
"""Rows of each table: far more than any railway has; what has more is a file that was taken for another."""


@dataclass(frozen=True)
class RecordTable:
    """A small table as read.

    Attributes
    ----------
    records : list of dict
        One a row, canonical heading -> cell; columns that the sheet lacks are missing.
    columns : list of ColumnReading
    where : SheetReading
    unknown : dict of str to int
        Headings that are not known, with their column.
    """

    records: list[Record]
    columns: list[ColumnReading]
    where: SheetReading
    unknown: dict[str, int]


def known_headings(table: str) -> str:
    """List the canonical headings of a table for a message."""
    return ", ".join(c.name for c in columns_of(table))


def read_records(sheet: Sheet, file: str, table: str, may_be_empty: bool = False) -> RecordTable:
    """Read a small table: its header row, and every row below it that is not blank.

    Raises
    ------
    InputError
        No header, a required heading missing or a heading twice, an unknown unit, no row, too many rows.
    """
    header = find_header_row(sheet, table)
    place = Place(file, sheet.name)
    if header is None:
        need = ", ".join(c.name for c in columns_of(table) if c.required)
        message = (
            f"no header row of a {table} table: the headings {need} are needed, as of {known_headings(table)}"
        )
        raise InputError(message, place)
    columns, unknown = _columns(sheet, header, table, place)
    most = MOST_ROWS[table]
    numbers = list(islice(_data_rows(sheet, header, [c.index for c in columns]), most + 1))
    if len(numbers) > most:
        message = f"the {table} table has more than {most} rows, which is as many as are read"
        raise InputError(message, place.at(numbers[-1]))
    records = [
        {
            c.meaning: Cell(sheet.value(row, c.index), place.at(row, c.index), c.heading, c.unit)
            for c in columns
        }
        for row in numbers
    ]
    if not records and not may_be_empty:
        message = f"the {table} table is empty: it needs at least one row below its headings"
        raise InputError(message, place.at(header))
    last = max((next(iter(record.values())).place.row or header for record in records), default=header)
    where = SheetReading(sheet.name, table, header, header + 1, last, sheet.width)
    return RecordTable(records, columns, where, unknown)


def find_header_row(sheet: Sheet, table: str) -> int | None:
    """Find the row (from 1) that holds the headings of a small table, None where there is none."""
    known = strong_headings(table)
    required = {c.name for c in columns_of(table) if c.required}
    best: tuple[int, int] | None = None
    for row in range(1, min(len(sheet.rows), 60) + 1):
        names = {
            name
            for value in sheet.rows[row - 1]
            if isinstance(value, str)
            for name, _ in known.get(fold(split_unit(value)[0]), ())
        }
        if len(names & required) >= min(2, len(required)) and (best is None or len(names) > best[0]):
            best = (len(names), row)
    return best[1] if best else None


def _columns(
    sheet: Sheet, header: int, table: str, place: Place
) -> tuple[list[ColumnReading], dict[str, int]]:
    known = strong_headings(table)
    found: dict[str, ColumnReading] = {}
    unknown: dict[str, int] = {}
    for index, value in enumerate(sheet.rows[header - 1]):
        if is_blank(value):
            continue
        heading = squeeze(shown(value))
        name, bracket = split_unit(heading)
        meanings = [m for m, _ in known.get(fold(name), ())]
        if not meanings:
            unknown[heading] = index
            continue
        meaning = meanings[0]
        if meaning in found:
            first = found[meaning].heading
            message = (
                f"the heading '{heading}' is there twice ('{first}' too); each column belongs there once"
            )
            raise InputError(message, place.at(header, index))
        found[meaning] = _column_reading(sheet, header, index, meaning, table, bracket, place)
    _need_required(table, found, place.at(header))
    return list(found.values()), unknown


def _column_reading(
    sheet: Sheet, header: int, index: int, meaning: str, table: str, bracket: str, place: Place
) -> ColumnReading:
    heading = squeeze(shown(sheet.value(header, index)))
    info = column(table, meaning)
    named = find_unit(bracket) if bracket else None
    if bracket and named is None and info.unit:
        message = f"the unit '{bracket}' of '{heading}' is not known; one like {info.unit} belongs there"
        raise InputError(message, place.at(header, index))
    if named and info.unit and named.dimension != unit(info.unit).dimension:
        message = f"the heading '{heading}' names the unit {named.symbol}; one like {info.unit} belongs there"
        raise InputError(message, place.at(header, index))
    samples = [squeeze(shown(v)) for v in (sheet.value(r, index) for r in range(header + 1, header + 4))]
    return ColumnReading(
        sheet.name,
        index,
        heading,
        meaning,
        named.symbol if named else info.unit,
        "heading" if named else ("canonical" if info.unit else ""),
        tuple(s for s in samples if s),
    )


def _need_required(table: str, found: dict[str, ColumnReading], place: Place) -> None:
    for info in columns_of(table):
        if info.required and info.name not in found:
            message = (
                f"the {table} table lacks the column '{info.name}'; its headings are {known_headings(table)}"
            )
            raise InputError(message, place)


def _data_rows(sheet: Sheet, header: int, indices: list[int]) -> Iterator[int]:
    for row in range(header + 1, len(sheet.rows) + 1):
        cells = [sheet.value(row, index) for index in indices]
        if any(not is_blank(value) for value in cells) and not is_example(sheet.rows[row - 1]):
            yield row


EXAMPLE_MARK = "example row, ignored"
"""What marks the example rows of the template."""


def is_example(cells: list[Value]) -> bool:
    """Whether a row is one of the template's example rows, which are ignored when left in."""
    return any(isinstance(value, str) and EXAMPLE_MARK in value.casefold() for value in cells)
