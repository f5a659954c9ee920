"""What is to be added to a user's workbook, said in plain records that know nothing of packages or XML.

They stand apart so that whoever decides what to write never depends on how it gets into a file.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TypeAlias

OutValue: TypeAlias = float | str | bool | None


@dataclass(frozen=True, slots=True)
class OutCell:
    """One cell to write.

    Attributes
    ----------
    value : float, str, bool or None
        Its value; with a formula, the value stored beside it. A text stays text whatever it begins with.
        nan and infinities are written as the error #N/A.
    formula : str or None
        Formula without its equals sign, in the file's own notation (English names, commas). Never put text
        of the user's into it.
    number_format : str or None
        Number format code such as ``0.0``; None keeps the column's, or else the neighbour's.
    fill : str or None
        Colour of the ground, ``RRGGBB``.
    note : str or None
        Text of a note at the cell.
    """

    value: OutValue
    formula: str | None = None
    number_format: str | None = None
    fill: str | None = None
    note: str | None = None


@dataclass(frozen=True, slots=True)
class ConditionalFill:
    """A fill that shows where a formula holds, over all data cells of one added column.

    Attributes
    ----------
    formula : str
        Condition without its equals sign, written for the column's first data row, with references relative.
    fill : str or None
        Colour of the ground, ``RRGGBB``.
    font : str or None
        Colour of the writing, ``RRGGBB``.
    """

    formula: str
    fill: str | None = None
    font: str | None = None


@dataclass(frozen=True, slots=True)
class AddedColumn:
    """One column to add to the right of the user's last.

    Attributes
    ----------
    heading : str
        Text of the header cell.
    cells : mapping of int to OutCell
        Keyed by the row as a spreadsheet shows it, from 1.
    width : float or None
        Column width in characters; None leaves the sheet's default.
    number_format : str or None
        Number format of cells that name none of their own.
    heading_note : str or None
        Note at the header cell.
    heading_fill : str or None
        Ground of the header cell, ``RRGGBB``.
    conditional : sequence of ConditionalFill
        Fills that follow the values.
    """

    heading: str
    cells: Mapping[int, OutCell]
    width: float | None = None
    number_format: str | None = None
    heading_note: str | None = None
    heading_fill: str | None = None
    conditional: Sequence[ConditionalFill] = ()


@dataclass(frozen=True, slots=True)
class CellMark:
    """A fill or note on a cell that is the user's own; its value and its format stay untouched.

    Attributes
    ----------
    row : int
        Row from 1.
    column : int
        Column from 0.
    fill : str or None
        Colour of the ground, ``RRGGBB``, shown by a conditional format so that the cell's own stays.
    note : str or None
        Text of a note. A cell that has a note or thread already keeps it; :class:`Annotated` then says so.
    """

    row: int
    column: int
    fill: str | None = None
    note: str | None = None


@dataclass(frozen=True, slots=True)
class SheetAddition:
    """What one of the user's sheets gains.

    Attributes
    ----------
    sheet : str
        Name of the sheet, case ignored.
    header_row : int
        Row of the headings, from 1.
    columns : list of AddedColumn
        In order; :meth:`cant.files.grid.Sheet.added_columns` tells the columns they take.
    marks : list of CellMark
        Fills and notes on the user's own cells.
    """

    sheet: str
    header_row: int
    columns: list[AddedColumn]
    marks: list[CellMark] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class Annotated:
    """A workbook with additions.

    Attributes
    ----------
    pieces : list of bytes
        The file, in pieces.
    notes : list of str
        What a person should know: what could not be added, or behaves otherwise than one might expect.
    """

    pieces: list[bytes | memoryview]
    notes: list[str]

    @property
    def data(self) -> bytes:
        """The file as a whole."""
        return b"".join(self.pieces)
