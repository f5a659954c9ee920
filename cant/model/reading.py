"""What reading a file yields: the tables, and everything understood, doubted or refused on the way."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import PurePath
from typing import Any

from cant.model.curves import CurveList
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from cant.model.turnouts import Turnout


@dataclass(frozen=True)
class RejectedRow:
    """A row that cannot be assessed (``rejected`` of the JSON).

    Attributes
    ----------
    sheet : str
    row : int
        As the spreadsheet shows it, from 1.
    column : str
        Heading of the column concerned, "" where the whole row is meant.
    value : str
        What stands there.
    problem : str
        What is wrong and what would be right.
    """

    sheet: str
    row: int
    column: str
    value: str
    problem: str

    def as_json(self) -> dict[str, Any]:
        """Give the entry of ``rejected``."""
        return {
            "sheet": self.sheet,
            "row": self.row,
            "column": self.column,
            "value": self.value,
            "problem": self.problem,
        }


@dataclass(frozen=True)
class Question:
    """A column or value with two honest readings that the file does not settle.

    Attributes
    ----------
    sheet, column : str
        Sheet, and heading of the column.
    question : str
        In one sentence, with what speaks for each choice.
    choices : tuple of str
        The possible answers, each as ``--reading`` takes it.
    rows : tuple of int
        Rows it touches.
    """

    sheet: str
    column: str
    question: str
    choices: tuple[str, ...]
    rows: tuple[int, ...] = ()

    def as_json(self) -> dict[str, Any]:
        """Give the entry of ``questions``."""
        return {
            "sheet": self.sheet,
            "column": self.column,
            "question": self.question,
            "choices": list(self.choices),
            "rows": list(self.rows),
        }


@dataclass(frozen=True)
class ColumnReading:
    """How one column of a sheet was understood.

    Attributes
    ----------
    sheet : str
    index : int
        Column counted from 0.
    heading : str
        As the user wrote it.
    meaning : str
        Canonical name (``Radius``), ``Speed CLASS``, or "" where the column is the user's own.
    unit : str
        Unit of the values, "" where there is none.
    unit_from : str
        What the unit rests on: ``heading``, ``unit row``, ``values``, ``answer``, ``canonical``.
    samples : tuple of str
        Some values as they stand.
    confidence : str
        ``certain``, ``likely`` or ``asked``.
    note : str
        Anything a person should know.
    """

    sheet: str
    index: int
    heading: str
    meaning: str
    unit: str = ""
    unit_from: str = ""
    samples: tuple[str, ...] = ()
    confidence: str = "certain"
    note: str = ""


@dataclass(frozen=True)
class SheetReading:
    """Where the table of a sheet lies: what the writer needs to add columns beside it.

    Attributes
    ----------
    sheet : str
    role : str
        ``curves``, ``traffic``, ``limits``, ``settings``, ``turnouts`` or ``other``.
    header_row : int
        Last row of the header, from 1.
    first_row, last_row : int
        First and last data row, from 1.
    columns : int
        Number of used columns: new ones go to the right of it.
    """

    sheet: str
    role: str
    header_row: int = 1
    first_row: int = 2
    last_row: int = 1
    columns: int = 0


@dataclass
class Reading:
    """A file as it was understood.

    Attributes
    ----------
    file : str
        Name of the curve file as the user gave it.
    curves : CurveList
        Every curve row, the rejected ones marked.
    traffic, limits : Traffic or None, LimitSet or None
        None where the file has no such table.
    settings : Settings or None
        None where the file has no such table.
    turnouts : list of Turnout
        Turnouts that lie in curves; empty where the file has no such table.
    rejected, questions, columns, sheets : list
        What was refused, asked, and understood.
    notes : list of str
        Anything else a person should know about how the file was read.
    sha256 : str
        Digest of the curve file, hexadecimal; "" where there is no file.
    """

    file: str
    curves: CurveList
    traffic: Traffic | None = None
    limits: LimitSet | None = None
    settings: Settings | None = None
    rejected: list[RejectedRow] = field(default_factory=list)
    questions: list[Question] = field(default_factory=list)
    columns: list[ColumnReading] = field(default_factory=list)
    sheets: list[SheetReading] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    turnouts: list[Turnout] = field(default_factory=list)
    sha256: str = ""

    @property
    def name(self) -> str:
        """Name of the curve file without its folders: outputs go to others, folders are nobody's business."""
        return PurePath(self.file).name
