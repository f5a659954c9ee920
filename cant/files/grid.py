"""A workbook as read: sheets of plain Python values, with what a value alone does not say beside them."""

from __future__ import annotations

from collections.abc import Mapping
from collections.abc import Set as AbstractSet
from dataclasses import dataclass, field
from datetime import date, datetime, time
from typing import TypeAlias


class CellError(str):
    """An error value such as ``#DIV/0!``: never a blank, never a number."""

    __slots__ = ()


class Uncalculated(str):
    """A formula without a stored value: the text is the formula, with its equals sign."""

    __slots__ = ()


class TypedNumber(float):
    """A number of a text file whose digits say more than its value: ``1.10`` may be a name.

    Attributes
    ----------
    typed : str
        As it stands in the file.
    """

    typed: str

    @classmethod
    def of(cls, typed: str) -> TypedNumber:
        """Make it from the text."""
        number = cls(typed)
        number.typed = typed
        return number


Value: TypeAlias = float | str | bool | datetime | date | time | CellError | Uncalculated | None
"""Content of a cell; numbers are float. A blank cell, and a text of nothing but blanks, is None."""


@dataclass(frozen=True, slots=True)
class CellRange:
    """A rectangle of cells: rows from 1, columns from 0, all ends included."""

    first_row: int
    first_column: int
    last_row: int
    last_column: int


@dataclass
class Sheet:
    """One sheet of values.

    Attributes
    ----------
    name : str
        "" for a csv file.
    rows : list of list
        ``rows[r - 1]`` is the spreadsheet's row r; ragged, blanks at the end cut off. Blank rows may share
        one empty list: do not write into them.
    merged : list of CellRange
        Merged ranges; the value stands in the first cell.
    hidden_rows, hidden_columns : frozenset of int
        Rows from 1, columns from 0.
    visible : bool
        False for a hidden sheet.
    formulas : set-like of (int, int)
        (row from 1, column from 0) of cells whose value was calculated.
    number_formats : mapping of (int, int) to str
        Number format of cells where it is not General; may be left empty by formats that have none.
    next_column : int
        First column from 0 right of all that is used.
    earlier_columns : tuple of int
        Columns from 0 that an earlier annotation added; their cells are not in ``rows``.
    """

    name: str
    rows: list[list[Value]]
    merged: list[CellRange] = field(default_factory=list)
    hidden_rows: frozenset[int] = frozenset()
    hidden_columns: frozenset[int] = frozenset()
    visible: bool = True
    formulas: AbstractSet[tuple[int, int]] = field(default_factory=set)
    number_formats: Mapping[tuple[int, int], str] = field(default_factory=dict)
    next_column: int = 0
    earlier_columns: tuple[int, ...] = ()

    def value(self, row: int, column: int) -> Value:
        """Give the value of a cell: row from 1, column from 0; None outside."""
        if not 0 < row <= len(self.rows):
            return None
        cells = self.rows[row - 1]
        return cells[column] if column < len(cells) else None

    def added_columns(self, count: int) -> list[int]:
        """Give the columns from 0 that ``count`` added columns take, for formulas that refer to them.

        Those of an earlier annotation are used again, so that the user's own formulas which refer to them
        stay right; the rest go right of all that is used.
        """
        kept = list(self.earlier_columns[:count])
        first = max([self.next_column, *(column + 1 for column in self.earlier_columns)])
        return kept + list(range(first, first + count - len(kept)))

    @property
    def width(self) -> int:
        """Number of columns up to the last used one."""
        return max((len(cells) for cells in self.rows), default=0)


@dataclass
class Workbook:
    """A file as read.

    Attributes
    ----------
    file : str
        Name as the user gave it.
    kind : str
        ``xlsx``, ``xlsm``, ``xls``, ``ods`` or ``csv`` (any separated text), by content.
    sheets : list of Sheet
    notes : list of str
        What a person should know: encoding and separator assumed, sheets left out, signature found.
    """

    file: str
    kind: str
    sheets: list[Sheet]
    notes: list[str] = field(default_factory=list)

    def sheet(self, name: str) -> Sheet | None:
        """Give the sheet of a name, case ignored, or None."""
        for sheet in self.sheets:
            if sheet.name.casefold() == name.casefold():
                return sheet
        return None
