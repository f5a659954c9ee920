"""One block of a curve sheet while it is being understood: rows, columns, numbers, faults of rows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from cant.files.grid import Value
from cant.model.curves import HAND_UNKNOWN, PLAIN, BoolArray, FloatArray, HandArray
from cant.model.limits import LimitSet
from cant.model.reading import Question, RejectedRow
from cant.model.traffic import Traffic
from cant.reading.answers import Answers
from cant.reading.layout import Block
from cant.reading.sheet_column import Column
from cant.reading.text import shown, squeeze

NUMERIC: dict[str, tuple[str, str]] = {
    "Start": ("start_km", "km"),
    "End": ("end_km", "km"),
    "Radius": ("radius_m", "m"),
    "Length": ("length_m", "m"),
    "Transition in": ("transition_in_m", "m"),
    "Transition out": ("transition_out_m", "m"),
    "Cant ramp in": ("ramp_in_m", "m"),
    "Cant ramp out": ("ramp_out_m", "m"),
    "Cant": ("cant_mm", "mm"),
    "Cant at most": ("cant_at_most_mm", "mm"),
    "Cant at least": ("cant_at_least_mm", "mm"),
    "Speed": ("speed_kmh", "km/h"),
}
"""Canonical columns of numbers: attribute of the curve list, and canonical unit."""


@dataclass(frozen=True)
class Problem:
    """What is wrong with one row."""

    column: str
    value: str
    text: str


@dataclass
class Context:
    """What holds for the whole file while its curves are read.

    Attributes
    ----------
    file : str
    traffic : Traffic or None
    limits : LimitSet or None
    answers : Answers
    situations : frozenset of str
        Situation words that a curve may carry.
    questions : list of Question
    notes : list of str
    """

    file: str
    traffic: Traffic | None
    limits: LimitSet | None
    answers: Answers
    situations: frozenset[str]
    questions: list[Question] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


@dataclass
class Draft:
    """The rows of one block.

    Attributes
    ----------
    block : Block
    columns : list of Column
    rows : ndarray of int, shape (n,)
        Row numbers in the sheet.
    decimal : str
        Decimal mark of the sheet.
    numbers : dict of str to ndarray, shape (n,)
        By attribute of the curve list, in canonical units.
    class_speeds : dict of str to ndarray
        By traffic class, or by the train as the heading names it where there is no traffic.
    problems : dict of int to list of Problem
        By position of the row.
    """

    block: Block
    columns: list[Column]
    rows: np.ndarray
    decimal: str
    context: Context
    numbers: dict[str, FloatArray] = field(default_factory=dict)
    class_speeds: dict[str, FloatArray] = field(default_factory=dict)
    hand: HandArray = field(default_factory=lambda: np.zeros(0, dtype=np.int8))
    line: list[str] = field(default_factory=list)
    track: list[str] = field(default_factory=list)
    curve: list[str] = field(default_factory=list)
    shape: list[str] = field(default_factory=list)
    situations: list[frozenset[str]] = field(default_factory=list)
    cant_fixed: BoolArray = field(default_factory=lambda: np.zeros(0, dtype=np.bool_))
    problems: dict[int, list[Problem]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        count = len(self.rows)
        for attribute, _ in NUMERIC.values():
            self.numbers.setdefault(attribute, np.full(count, np.nan))
        self.hand = np.full(count, HAND_UNKNOWN, dtype=np.int8)
        self.cant_fixed = np.zeros(count, dtype=np.bool_)
        self.line, self.track, self.curve = [""] * count, [""] * count, [""] * count
        self.shape, self.situations = ["linear"] * count, [PLAIN] * count

    def __len__(self) -> int:
        return len(self.rows)

    @property
    def canonical(self) -> bool:
        """Whether every understood heading is canonical: then units that are not named are the usual ones."""
        return all(item.is_canonical for item in self.columns if item.meaning)

    @property
    def sheet(self) -> str:
        """Name of the sheet."""
        return self.block.sheet.name

    def column(self, meaning: str) -> Column | None:
        """Give the column of a meaning (the line speed for ``Speed``), None where there is none."""
        for item in self.columns:
            if item.meaning == meaning and not item.train:
                return item
        return None

    def fail(self, index: int, column: Column | None, text: str, cell: Value = None) -> None:
        """Note a problem of a row: its column, what stands there, what would be right."""
        value = column.cells[index] if column is not None and cell is None else cell
        self.problems.setdefault(index, []).append(
            Problem(column.heading.text if column else "", squeeze(shown(value)), text)
        )

    def ask(self, column: Column, text: str, choices: Sequence[str], where: Sequence[int]) -> None:
        """Ask a question about a column; the rows it touches are rejected until it is answered."""
        question = Question(
            self.sheet, column.heading.text, text, tuple(choices), tuple(int(self.rows[i]) for i in where)
        )
        column.confidence = "asked"
        self.context.questions.append(question)
        for index in where:
            self.fail(index, column, text)

    def rejected_rows(self) -> list[RejectedRow]:
        """Give every problem of every row, in row order."""
        return [
            RejectedRow(self.sheet, int(self.rows[index]), p.column, p.value, p.text)
            for index in sorted(self.problems)
            for p in self.problems[index]
        ]

    def as_columns(self) -> dict[str, Any]:
        """Give the arrays and lists of the curve list by attribute."""
        rejected = np.zeros(len(self), dtype=np.bool_)
        rejected[list(self.problems)] = True
        return {
            **self.numbers,
            "sheet": [self.sheet] * len(self),
            "row": self.rows.astype(np.int64),
            "line": self.line,
            "track": self.track,
            "curve": self.curve,
            "rejected": rejected,
            "hand": self.hand,
            "shape": self.shape,
            "cant_fixed": self.cant_fixed,
            "situations": self.situations,
        }
