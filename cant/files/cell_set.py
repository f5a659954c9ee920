"""A set of cells of one sheet that needs little memory for a million of them."""

from __future__ import annotations

from collections.abc import Iterator, MutableSet

_WIDTH = 16_384


class CellSet(MutableSet[tuple[int, int]]):
    """Cells as (row from 1, column from 0), each held as one number."""

    def __init__(self) -> None:
        self._numbers: set[int] = set()

    def __contains__(self, cell: object) -> bool:
        if not isinstance(cell, tuple) or len(cell) != 2:
            return False
        row, column = cell
        return 0 <= column < _WIDTH and row * _WIDTH + column in self._numbers

    def __iter__(self) -> Iterator[tuple[int, int]]:
        return (divmod(number, _WIDTH) for number in self._numbers)

    def __len__(self) -> int:
        return len(self._numbers)

    def add(self, cell: tuple[int, int]) -> None:
        """Put a cell in."""
        self._numbers.add(cell[0] * _WIDTH + cell[1])

    def discard(self, cell: tuple[int, int]) -> None:
        """Take a cell out if it is there."""
        self._numbers.discard(cell[0] * _WIDTH + cell[1])
