"""A table of live formulas with their values stored: columns over many rows, written as finished XML.

Knows nothing of cant. A formula is a text with references in it, ``⟦name⟧``; each name stands for a column of
this or another sheet and, for every row, the row it points to. What a cell shows before anybody recalculates
is the value given beside the formula.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from cant.errors import column_letter
from cant.writing.fast_rows import cell_text
from cant.writing.looks import LONG_TEXT, Heading, lines_of
from cant.writing.sheets import TableSheet

Value: TypeAlias = float | str | None
Values: TypeAlias = Sequence[Value] | npt.NDArray[np.float64]
BoolArray: TypeAlias = npt.NDArray[np.bool_]
_TOKEN = re.compile("⟦([^⟧]+)⟧")
_ROWS_AT_ONCE = 500
_SHARED_FROM = 60
"""A formula at least this long [characters] is written once and shared by the rows below it."""

INPUT, FORMULA, FIXED = "input", "formula", "fixed"
"""What a cell of a ledger is: to be changed by a checker, computed, or fixed by the program."""


@dataclass(frozen=True)
class Reference:
    """A column that formulas refer to.

    Attributes
    ----------
    column : str
        Sheet and letter, ``'Limits used'!$F``; the letter alone for the sheet itself.
    rows : sequence of int or None
        Row of each row of the ledger; None where it is the row itself.
    """

    column: str
    rows: Sequence[int] | None = None


@dataclass
class LedgerColumn:
    """One column of a ledger.

    Attributes
    ----------
    key : str
        Name by which formulas refer to it.
    heading, symbol, source : str
        What stands in the three rows of the header: words, symbol with unit, clause or origin.
    values : sequence of float, str or None, or ndarray
        Stored values as shown; None and nan leave a cell blank, or a formula that gives no text.
    number_format : str or None
        None for text.
    kind : str
        INPUT, FORMULA or FIXED.
    formulas : list of (str, ndarray of bool or None)
        Formula texts, each with the rows in which it stands; rows of none hold the value alone.
    width : float
    """

    key: str
    heading: str
    symbol: str
    source: str
    values: Values
    number_format: str | None = None
    kind: str = FIXED
    formulas: list[tuple[str, BoolArray | None]] | None = None
    width: float = 10.0


class Ledger:
    """A sheet of such columns.

    Parameters
    ----------
    sheet : TableSheet
        Where it is written.
    first_row : int
        Row of the first row of data, from 1.
    count : int
        Number of rows.
    """

    def __init__(self, sheet: TableSheet, first_row: int, count: int) -> None:
        self.sheet = sheet
        self.first_row = first_row
        self.count = count
        self.columns: list[LedgerColumn] = []
        self._letters: dict[str, str] = {}
        self._references: dict[str, Reference] = {}
        self._shared_at: dict[int, int] = {}

    def rows(self) -> list[int]:
        """Give the row numbers of the data."""
        return list(range(self.first_row, self.first_row + self.count))

    def add(self, column: LedgerColumn) -> None:
        """Add a column at the right."""
        letter = column_letter(len(self.columns))
        self.columns.append(column)
        self._letters[column.key] = letter
        self._references[column.key] = Reference(f"${letter}")

    def letter(self, key: str) -> str:
        """Give the letter of a column."""
        return self._letters[key]

    def refer(self, name: str, column: str, rows: Sequence[int]) -> None:
        """Name a column of another sheet, with the row that each row here points to."""
        self._references[name] = Reference(column, rows)

    def address(self, key: str) -> str:
        """Give a column with its sheet, for formulas of other sheets: ``'Calculation'!$F``."""
        return f"{quoted(self.sheet.name)}!${self._letters[key]}"

    def write(self, keep: int) -> None:
        """Write header and rows."""
        self._header(keep)
        width = len(self.columns)
        long = [c for c in self.columns if c.number_format is None and c.width >= LONG_TEXT]
        for begin in range(0, self.count, _ROWS_AT_ONCE):
            end = min(begin + _ROWS_AT_ONCE, self.count)
            columns = [
                self._cells(column, number, begin, end) for number, column in enumerate(self.columns, start=1)
            ]
            for i, cells in enumerate(zip(*columns, strict=True), start=begin):
                lines = max((lines_of(c.values[i], c.width) for c in long), default=1)
                self.sheet.raw_row(self.first_row + i, "".join(cells), width, lines)

    def _header(self, keep: int) -> None:
        heads = [Heading(c.heading, c.width, c.number_format) for c in self.columns]
        rows = (
            [c.symbol for c in self.columns],
            [f"{c.kind}: {c.source}".rstrip(": ") for c in self.columns],
        )
        self.sheet.header_rows(heads, rows, keep)

    def _cells(self, column: LedgerColumn, number: int, begin: int, end: int) -> list[str]:
        """Give the XML of some cells of a column: those of the rows of data from ``begin`` to ``end``."""
        style = self.sheet.cell_style(column.number_format, column.kind, column.width)
        part = column.values[begin:end]
        values = part.tolist() if isinstance(part, np.ndarray) else part
        row_words = [str(self.first_row + i) for i in range(begin, end)]
        head = f'<c r="{column_letter(number - 1)}'
        tail = f'" s="{style}"' if style else '"'
        formulas = [""] * len(row_words)
        for share, (text, where) in enumerate(column.formulas or ()):
            self._fill(formulas, text, where, number * 100 + share, begin, column_letter(number - 1))
        return [
            _cell(head, word, tail, value, formula)
            for word, value, formula in zip(row_words, values, formulas, strict=True)
        ]

    def _fill(
        self, formulas: list[str], text: str, where: BoolArray | None, share: int, begin: int, letter: str
    ) -> None:
        """Put a formula into the rows in which it stands."""
        end = begin + len(formulas)
        at = range(begin, end) if where is None else (begin + np.flatnonzero(where[begin:end])).tolist()
        if not len(at):
            return
        pieces = _TOKEN.split(cell_text(text))
        references = [self._references[name] for name in pieces[1::2]]
        if len(text) < _SHARED_FROM or any(one.rows is not None for one in references):
            for i in at:
                own = str(self.first_row + i)
                formulas[i - begin] = f"<f>{_joined(pieces, references, i, own)}</f>"
            return
        follower = f'<f t="shared" si="{share}"/>'
        for i in at:
            formulas[i - begin] = follower
        if share not in self._shared_at:
            self._shared_at[share] = at[0]
            first = str(self.first_row + at[0])
            last = self.first_row + (self.count - 1 if where is None else int(np.flatnonzero(where)[-1]))
            master = _joined(pieces, references, at[0], first)
            formulas[at[0] - begin] = (
                f'<f t="shared" ref="{letter}{first}:{letter}{last}" si="{share}">{master}</f>'
            )


def _joined(pieces: list[str], references: list[Reference], i: int, own: str) -> str:
    parts = [pieces[0]]
    for reference, after in zip(references, pieces[2::2], strict=True):
        parts += (reference.column, own if reference.rows is None else str(reference.rows[i]), after)
    return "".join(parts)


def _cell(head: str, row: str, tail: str, value: Value, formula: str) -> str:
    if isinstance(value, str):
        if formula:
            return f'{head}{row}{tail} t="str">{formula}<v>{cell_text(value)}</v></c>'
        if not value:
            return f"{head}{row}{tail}/>"
        return f'{head}{row}{tail} t="inlineStr"><is><t xml:space="preserve">{cell_text(value)}</t></is></c>'
    if value is None or not math.isfinite(value):
        return f'{head}{row}{tail} t="str">{formula}<v></v></c>' if formula else f"{head}{row}{tail}/>"
    return f"{head}{row}{tail}>{formula}<v>{value!r}</v></c>"


def quoted(sheet: str) -> str:
    """Give a sheet's name as formulas have it."""
    return "'" + sheet.replace("'", "''") + "'"


def token(name: str) -> str:
    """Give the reference to a column by its name within a formula."""
    return f"⟦{name}⟧"
