"""Rows of a sheet written as whole pieces of XML, for tables of a million cells.

XlsxWriter's constant-memory mode writes a row when the next one begins, checking and joining every cell by
itself; most of the time of a large workbook went there. A worksheet class of our own (a hook that XlsxWriter
offers) puts a finished row into the same stream. All else of the sheet stays XlsxWriter's.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from typing import Any
from xml.sax.saxutils import escape

from xlsxwriter.worksheet import Worksheet

from cant.errors import column_letter

_CONTROL = re.compile("[\x00-\x08\x0b-\x1f\ufffe\uffff]")
_NOT_PLAIN = re.compile("[&<>\x00-\x08\x0b-\x1f\ufffe\uffff]|_x")
_LOOKS_ESCAPED = re.compile(r"_(?=x[0-9A-Fa-f]{4}_)")


def cell_text(text: str) -> str:
    """Give a text as an inline string holds it: markup escaped, control characters as ``_xHHHH_``.

    Parameters
    ----------
    text : str
        Any text; one that looks like such an escape already stays what it is (ECMA-376 part 1, 22.9.2.19).
    """
    if not _NOT_PLAIN.search(text):
        return text
    if "_x" in text:
        text = _LOOKS_ESCAPED.sub("_x005F_", text)
    return _CONTROL.sub(lambda found: f"_x{ord(found.group()):04X}_", escape(text))


class FastSheet(Worksheet):  # type: ignore[misc]  # XlsxWriter comes without types
    """A worksheet that also takes finished rows; they must follow each other downwards."""

    def put_row(self, row: int, cells: Sequence[Any], styles: Sequence[Any], height: float | None) -> None:
        """Write a row of a constant-memory workbook.

        Parameters
        ----------
        row : int
            Row from 0, below every row written before.
        cells : sequence of float, str or None
            Values; None, nan and infinities leave the cell blank.
        styles : sequence of Format or None
            Format of each column.
        height : float or None
            Height of the row [points].
        """
        self._write_single_row(row)
        number = row + 1
        tall = f' ht="{height:g}" customHeight="1"' if height is not None else ""
        parts = [f'<row r="{number}"{tall}>']
        for value, start in zip(cells, self._starts(styles), strict=False):
            if value is None:
                continue
            if isinstance(value, str):
                keep = ' xml:space="preserve"' if value != value.strip() or "\n" in value else ""
                text = cell_text(value)
                parts.append(f'{start[0]}{number}{start[1]} t="inlineStr"><is><t{keep}>{text}</t></is></c>')
            elif math.isfinite(value):
                parts.append(f"{start[0]}{number}{start[1]}><v>{value!r}</v></c>")
        parts.append("</row>")
        self.row_data_fh.write("".join(parts))
        self._check_dimensions(row, 0)
        self._check_dimensions(row, max(len(cells) - 1, 0))

    def put_cells(self, row: int, cells: str, width: int, height: float | None = None) -> None:
        """Write a row whose cells are XML already.

        Parameters
        ----------
        row : int
            Row from 0, below every row written before.
        cells : str
            The cells.
        width : int
            Number of columns that they take.
        height : float or None
            Height of the row [points].
        """
        self._write_single_row(row)
        tall = f' ht="{height:g}" customHeight="1"' if height is not None else ""
        self.row_data_fh.write(f'<row r="{row + 1}"{tall}>{cells}</row>')
        self._check_dimensions(row, 0)
        self._check_dimensions(row, max(width - 1, 0))

    def _starts(self, styles: Sequence[Any]) -> list[tuple[str, str]]:
        """Give the two halves of each column's opening tag, around the row number; made once a table."""
        key = id(styles)
        made: tuple[int, list[tuple[str, str]]] | None = getattr(self, "_made_starts", None)
        if made is None or made[0] != key:
            starts = []
            for column, style in enumerate(styles):
                index = style._get_xf_index() if style is not None else 0
                starts.append((f'<c r="{column_letter(column)}', f'" s="{index}"' if index else '"'))
            made = (key, starts)
            self._made_starts = made
        return made[1]
