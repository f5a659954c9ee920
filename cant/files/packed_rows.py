"""The cells of many added columns, row by row, held packed: a register has millions of them.

A row is kept as text in the form in which a worksheet's XML has it, hundreds of rows compressed together.
They are put in and taken out in any order, and fastest in the order of the rows.
"""

from __future__ import annotations

import zlib
from array import array
from collections.abc import Iterator, Mapping, Sequence

from cant.files.additions import OutCell, OutValue
from cant.files.cell_xml import BLANK, held, value_held

_TOGETHER = 256
_BETWEEN_CELLS = "\x1f"
_BETWEEN_ROWS = b"\x1e"
"""Characters that no content of a cell has: XML forbids them."""


class PackedRows:
    """Rows of cells, one cell for each added column.

    Parameters
    ----------
    width : int
        Number of columns.
    """

    def __init__(self, width: int) -> None:
        self.width = width
        self._place = array("i")
        self._blocks: list[bytes] = []
        self._open: list[bytes] = []
        self._masks = [bytearray() for _ in range(width)]
        self._unpacked: tuple[int, list[bytes]] = (-1, [])
        self._last: tuple[int, list[str]] = (-1, [])

    def put(self, row: int, values: Sequence[OutValue]) -> None:
        """Put in the cells of a row that has none yet.

        Parameters
        ----------
        row : int
            Row from 1.
        values : sequence of float, str, bool or None
            One for each column; None leaves the cell as it is.
        """
        if row in self:
            message = f"row {row} has its cells already"
            raise ValueError(message)
        if row >= len(self._place):
            self._place.extend([-1] * (row + 1 + row // 8 - len(self._place)))
        self._place[row] = len(self._blocks) * _TOGETHER + len(self._open)
        for mask, value in zip(self._masks, values, strict=True):
            if value is not None:
                if row >= len(mask):
                    mask.extend(bytes(row + 1 + row // 8 - len(mask)))
                mask[row] = 1
        self._open.append(_BETWEEN_CELLS.join(map(held, values)).encode("utf-8"))
        if len(self._open) == _TOGETHER:
            self._blocks.append(zlib.compress(_BETWEEN_ROWS.join(self._open), 1))
            self._open = []

    def __contains__(self, row: int) -> bool:
        return 0 <= row < len(self._place) and self._place[row] >= 0

    def contents(self, row: int) -> list[str] | None:
        """Give what the cells of a row hold (:func:`cant.files.cell_xml.held`), None where it has none."""
        if self._last[0] == row:
            return self._last[1]
        place = self._place[row] if 0 <= row < len(self._place) else -1
        if place < 0:
            return None
        number, at = divmod(place, _TOGETHER)
        if number == len(self._blocks):
            packed = self._open[at]
        else:
            if self._unpacked[0] != number:
                self._unpacked = (number, zlib.decompress(self._blocks[number]).split(_BETWEEN_ROWS))
            packed = self._unpacked[1][at]
        self._last = (row, packed.decode("utf-8").split(_BETWEEN_CELLS))
        return self._last[1]

    def column(self, number: int, fills: Mapping[str, str] | None = None) -> PackedColumn:
        """Give the cells of a column.

        Parameters
        ----------
        number : int
            Its place from 0.
        fills : mapping of str to str, optional
            Ground of a cell, ``RRGGBB``, by the text that it holds.
        """
        return PackedColumn(self, number, self._masks[number], fills or {})


class PackedColumn(Mapping[int, OutCell]):
    """The cells of one column of packed rows, by row; blank ones are not in it.

    Attributes
    ----------
    rows : PackedRows
    number : int
        Which column of the rows it is.
    fills : dict of str to str
        Ground by content, as the rows hold it.
    """

    def __init__(self, rows: PackedRows, number: int, mask: bytearray, fills: Mapping[str, str]) -> None:
        self.rows = rows
        self.number = number
        self.fills = {held(text): colour for text, colour in fills.items()}
        self._mask = mask

    def __getitem__(self, row: int) -> OutCell:
        contents = self.rows.contents(row)
        content = contents[self.number] if contents is not None else BLANK
        if content == BLANK:
            raise KeyError(row)
        return OutCell(value_held(content), fill=self.fills.get(content))

    def __iter__(self) -> Iterator[int]:
        return (row for row, there in enumerate(self._mask) if there)

    def __len__(self) -> int:
        return sum(self._mask)
