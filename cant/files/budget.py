"""How much is read of one file, so that no small file fills the memory or the day."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NoReturn

from cant.errors import FileError, Place

MAX_CELLS = 5_000_000
MAX_BLANK_CELLS = 20_000_000
MAX_SLOTS = 12_000_000


@dataclass
class Budget:
    """What may still be read of one workbook, so that no small file fills the memory.

    Attributes
    ----------
    cells : int
        Cells with a value.
    slots : int
        Places in rows, blanks before a value included.
    """

    cells: int = MAX_CELLS
    slots: int = MAX_SLOTS

    def take(self, cells: int, slots: int, place: Place) -> None:
        """Count a row.

        Raises
        ------
        FileError
            More than is read.
        """
        self.cells -= cells
        self.slots -= slots
        if self.cells < 0 or self.slots < 0:
            self._refuse(place)

    def foresee(self, part: bytes, place: Place) -> None:
        """Refuse a worksheet part, as it is, that is sure to hold more than may still be read.

        Raises
        ------
        FileError
            More than is read.
        """
        filled = part.count(b"</v>") + part.count(b"</is>") + (part.count(b":v>") + part.count(b":is>")) // 2
        if filled > self.cells or part.count(b"<c ") + part.count(b"<c/") > MAX_BLANK_CELLS:
            self._refuse(place)

    def _refuse(self, place: Place) -> NoReturn:
        message = (
            f"is too large: at most {MAX_CELLS // 1_000_000} million filled cells are read, and none far "
            "to the right of all others in very many rows; keep the curve list in a file of its own"
        )
        raise FileError(message, place)
