"""How our sheets look: paper, heights, the formats of headers and cells."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from cant.writing.columns import Cell

MAX_TEXT = 32_000
"""Longest text of a cell that every spreadsheet program keeps (the format's own limit is 32,767)."""

MAX_ROWS = 1_048_000
"""Most rows that a sheet of ours takes (the format's own limit is 1,048,576)."""

LONG_TEXT = 40.0
"""Columns at least this wide [characters] hold sentences."""

LINE_HEIGHT = 15.0
"""Height of a line of text [points]."""

PAGE_WIDTH = 230.0
"""Widest table [characters] that is still legible on one page across, A4 landscape."""

A4, LETTER = 9, 1
"""Numbers of the paper sizes."""

KINDS: dict[str, dict[str, Any]] = {
    "input": {"bg_color": "#FFF6D5", "border": 4, "border_color": "#C9B458"},
    "fixed": {"font_color": "#5A5A5A"},
}
"""How cells of a ledger look: what a checker may change stands on a ground of its own."""

SMALLEST_PRINT = 60
"""Scale of wider tables [%], which run over several pages across."""


@dataclass(frozen=True, slots=True)
class Heading:
    """Head of one column of a table.

    Attributes
    ----------
    title : str
        Text of the header cell.
    width : float
        In characters.
    number_format : str or None
        Number format of the column, None for text.
    """

    title: str
    width: float = 12.0
    number_format: str | None = None

    @property
    def is_long(self) -> bool:
        """Whether the column holds sentences, which take several lines."""
        return self.number_format is None and self.width >= LONG_TEXT


class Looks:
    """The cell formats of a workbook, each made once.

    Parameters
    ----------
    workbook : xlsxwriter.Workbook
    """

    def __init__(self, workbook: Any) -> None:
        self._workbook = workbook
        self.plain = workbook.add_format({"valign": "top"})
        self.word = workbook.add_format({"valign": "top", "align": "left", "indent": 1})
        self.bold = workbook.add_format({"bold": True, "valign": "top"})
        self.wrapped = workbook.add_format({"text_wrap": True, "valign": "top"})
        self.head = workbook.add_format(
            {"bold": True, "text_wrap": True, "valign": "top", "bottom": 1, "bg_color": "#DDE6E4"}
        )
        self.small_head = workbook.add_format(
            {"text_wrap": True, "valign": "top", "font_size": 8, "bottom": 1, "bg_color": "#EEF3F2"}
        )
        self.title = workbook.add_format({"bold": True, "font_size": 14, "valign": "top"})
        self.frame = workbook.add_format({"border": 1})
        self.box = workbook.add_format({"border": 1, "valign": "top", "text_wrap": True})
        self._numbers: dict[str, Any] = {}
        self._styled: dict[tuple[str | None, str, bool], Any] = {}

    def cell_format(self, heading: Heading) -> Any:
        """Give the format of a column's cells, made once for each number format."""
        code = heading.number_format
        if code is None:
            return self.wrapped if heading.is_long else self.word
        if code not in self._numbers:
            self._numbers[code] = self._workbook.add_format({"num_format": code, "valign": "top"})
        return self._numbers[code]

    def styled(self, number_format: str | None, kind: str, width: float = 0.0) -> Any:
        """Give the format of a cell of a kind: an input has a ground, what the program fixed is grey."""
        key = (number_format, kind, number_format is None and width >= LONG_TEXT)
        if key not in self._styled:
            look: dict[str, Any] = {"valign": "top", **KINDS.get(kind, {})}
            if number_format is not None:
                look["num_format"] = number_format
            elif key[2]:
                look["text_wrap"] = True
            else:
                look |= {"align": "left", "indent": 1}
            self._styled[key] = self._workbook.add_format(look)
        return self._styled[key]


def lines_of(value: Cell, width: float) -> int:
    """Estimate how many lines a text takes in a column."""
    if not isinstance(value, str):
        return 1
    per_line = max(width - 1, 1)
    return sum(max(1, math.ceil(len(part) / per_line)) for part in value.split("\n"))
