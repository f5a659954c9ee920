"""What can go wrong: one tree of exceptions with two branches, and the place each speaks of.

A message always says what is wrong, where (file, sheet, cell), and what would be right. The command line and
the web service catch :class:`CantError` alone and show its text.
"""

from __future__ import annotations

from dataclasses import dataclass


def column_letter(index: int) -> str:
    """Give the spreadsheet letters of a column counted from 0: 0 is A, 26 is AA."""
    letters = ""
    index += 1
    while index > 0:
        index, rest = divmod(index - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


@dataclass(frozen=True, slots=True)
class Place:
    """Where something stands: file, sheet, and cell as far as they are known.

    Attributes
    ----------
    file : str
        Name of the file as the user gave it, "" where there is none (a DataFrame).
    sheet : str
        Name of the sheet, "" where there is none (csv).
    row : int or None
        Row number as a spreadsheet shows it, from 1.
    column : int or None
        Column counted from 0.
    """

    file: str = ""
    sheet: str = ""
    row: int | None = None
    column: int | None = None

    def __str__(self) -> str:
        parts = [self.file] if self.file else []
        if self.sheet:
            parts.append(f"sheet '{self.sheet}'")
        if self.row is not None and self.column is not None:
            parts.append(f"cell {column_letter(self.column)}{self.row}")
        elif self.row is not None:
            parts.append(f"row {self.row}")
        elif self.column is not None:
            parts.append(f"column {column_letter(self.column)}")
        return ", ".join(parts)

    def at(self, row: int | None = None, column: int | None = None) -> Place:
        """Give the same sheet's place at another row and column."""
        return Place(self.file, self.sheet, row, column)


class CantError(Exception):
    """Anything the program refuses, in one line that says what, where, and what would be right.

    Parameters
    ----------
    message : str
        What is wrong and what would be right.
    place : Place, optional
        Where; put before the message.
    """

    def __init__(self, message: str, place: Place | None = None) -> None:
        self.place = place
        where = str(place) if place is not None else ""
        super().__init__(f"{where}: {message}" if where else message)


class InputError(CantError):
    """The content of a table is not usable: an unknown word, a missing value, a contradiction."""


class FileError(CantError):
    """A file cannot be read, is refused for safety, or cannot be written."""
