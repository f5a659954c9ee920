"""The worksheets of a package read one by one, by whoever needs their values: the reader and the editor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NoReturn

from cant.errors import Place
from cant.files.book import Book, SheetEntry
from cant.files.budget import Budget
from cant.files.cells import BookValues, CellReader
from cant.files.formats import CellFormats
from cant.files.grid import CellRange, Sheet
from cant.files.markup import Element, utf8_part
from cant.files.package import Package
from cant.files.sheet_xml import MAX_COLUMN, SheetXml, parse_range
from cant.files.strings import shared_strings

FAR_COLUMNS = 20
"""Formatted blank cells further than this from all others do not count as used."""


@dataclass
class SheetRead:
    """A worksheet with its XML and its values.

    Attributes
    ----------
    entry : SheetEntry
        Its entry in the workbook part.
    xml : SheetXml
        Its part.
    cells : CellReader
        Its values.
    merged : list of CellRange
        Its merged ranges.
    tables : list of CellRange
        Where its tables (ListObjects) stand.
    """

    entry: SheetEntry
    xml: SheetXml
    cells: CellReader
    merged: list[CellRange]
    tables: list[CellRange]

    @property
    def earlier_columns(self) -> tuple[int, ...]:
        """Columns from 0 that an earlier annotation added."""
        return tuple(dict.fromkeys(one.first_column for one in self.cells.ignored))

    @property
    def next_column(self) -> int:
        """Column from 0 for the first added one: right of the last used, with a gap beside a table."""
        used = max([self.cells.last_value, *(one.last_column for one in self.tables)])
        near = [*self.cells.row_ends, *(one.last_column for one in self.merged)]
        used = max([used, *(one for one in near if one <= used + FAR_COLUMNS)])
        return used + 2 if any(one.last_column == used for one in self.tables) else used + 1


class BookReader:
    """Reads worksheets of one package.

    Parameters
    ----------
    package : Package
        The package.
    book : Book
        Its workbook part.
    """

    def __init__(self, package: Package, book: Book) -> None:
        self.package = package
        self.book = book
        self.added = book.added_columns()
        self.values = BookValues(self._strings(), self._formats(), book.epoch_1904, Budget())

    def _strings(self) -> list[str | None]:
        part = self.package.related(self.book.part, "sharedStrings")
        return shared_strings(self.package, part) if part else []

    def _formats(self) -> CellFormats:
        part = self.package.related(self.book.part, "styles")
        styles: Element | None = self.package.tree(part) if part else None
        return CellFormats(styles)

    def read(self, entry: SheetEntry, keep: bool = True) -> SheetRead:
        """Read one worksheet.

        Parameters
        ----------
        entry : SheetEntry
            The worksheet.
        keep : bool
            False where its values are not wanted.

        Raises
        ------
        FileError
            Its part is missing, damaged, or too large.
        """
        place = Place(self.package.place.file, entry.name)
        if entry.part is None:
            self._missing(entry)
        raw = self.package.archive.read(entry.part)
        self.values.budget.foresee(raw, place)
        xml = SheetXml(utf8_part(raw, entry.part, place), entry.part, place)
        cells = CellReader(xml, self.values, self.added.get(entry.name.casefold(), ()), keep)
        cells.read()
        return SheetRead(entry, xml, cells, xml.merged(), self._tables(entry.part))

    def _missing(self, entry: SheetEntry) -> NoReturn:
        self.package.damaged(f"the part of sheet '{entry.name}' is missing")

    def _tables(self, part: str) -> list[CellRange]:
        found = []
        for one in self.package.relationships(part).values():
            name = self.package.name_of(one.target) if one.type == "table" and not one.external else None
            cells = parse_range(self.package.tree(name).get("ref")) if name else None
            if cells is not None and cells.last_column < MAX_COLUMN - 1:
                found.append(cells)
        return found


def as_sheet(read: SheetRead) -> Sheet:
    """Give what was read of a worksheet as the plain record that the other rooms know."""
    return Sheet(
        name=read.entry.name,
        rows=read.cells.rows,
        merged=read.merged,
        hidden_rows=frozenset(read.cells.hidden_rows),
        hidden_columns=read.xml.hidden_columns(),
        visible=read.entry.visible,
        formulas=read.cells.formulas,
        number_formats=read.cells.number_formats,
        next_column=read.next_column,
        earlier_columns=read.earlier_columns,
    )
