"""Cells of one column, taken together: pure numbers at once, each repeated text once.

A column of 100,000 cells holds few different texts; so no cell makes an object of its own, and only what is
special about a cell (its own unit, a second number, a problem) is kept beside the array.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, time

import numpy as np

from cant.files.grid import CellError, Uncalculated, Value
from cant.model.curves import FloatArray
from cant.reading.text import is_blank, shown, squeeze
from cant.units import ratio

NONE, STRAIGHT, PAIR = "none", "straight", "pair"
"""States of a cell: the word none; straight track; two numbers in one cell."""


@dataclass(frozen=True, slots=True)
class Taken:
    """What one text says.

    Attributes
    ----------
    value : float
        nan where it says nothing.
    second : float
        The second of two numbers, else nan.
    unit : str
        Unit that the text itself names, "" where it names none.
    state : str
        "" or one of :data:`NONE`, :data:`STRAIGHT`, :data:`PAIR`.
    problem : str
        Why the text cannot be used and what would be right, "" where it can.
    hand : int
        Hand that the text names besides (``R 650 L``), 0 where it names none.
    """

    value: float = np.nan
    second: float = np.nan
    unit: str = ""
    state: str = ""
    problem: str = ""
    hand: int = 0


NOTHING = Taken()
Taker = Callable[[str], Taken]


@dataclass
class Numbers:
    """One column of numbers as it stands, before its unit is applied.

    Attributes
    ----------
    values, second : ndarray, shape (n,)
        Numbers in the unit of the column, or in the cell's own; nan where there is none.
    units : dict of int to str
        Own unit of cells that name one, by position.
    states : dict of int to str
        What else a cell says, by position.
    problems : dict of int to str
        Why a cell cannot be used.
    hands : dict of int to int
        Hands named beside the number.
    """

    values: FloatArray
    second: FloatArray
    units: dict[int, str] = field(default_factory=dict)
    states: dict[int, str] = field(default_factory=dict)
    problems: dict[int, str] = field(default_factory=dict)
    hands: dict[int, int] = field(default_factory=dict)

    def converted(self, unit: str, target: str, second: bool = False) -> FloatArray:
        """Give the numbers in the target unit: those without a unit of their own are in ``unit``."""
        numbers = self.second if second else self.values
        result = numbers * ratio(unit, target)
        for index, own in self.units.items():
            result[index] = numbers[index] * ratio(own, target)
        return result


def take_column(cells: Sequence[Value], taker: Taker) -> Numbers:
    """Read a column of cells.

    Parameters
    ----------
    cells : sequence of Value, length n
    taker : callable
        Reads one text; called once for each different text.
    """
    count = len(cells)
    values = np.full(count, np.nan)
    result = Numbers(values, np.full(count, np.nan))
    cache: dict[Value, Taken] = {}
    for index, cell in enumerate(cells):
        if isinstance(cell, float):
            values[index] = cell
        elif cell is not None:
            taken = cache.get(cell)
            if taken is None:
                taken = cache[cell] = take(cell, taker)
            if taken is not NOTHING:
                _put(result, index, taken)
    _refuse_absurd(result)
    return result


LARGEST, SMALLEST = 1e8, 1e-6
"""Beyond these no quantity of a curve list lies, whatever its unit."""


def _refuse_absurd(result: Numbers) -> None:
    """Refuse numbers that are none of a railway, before anything is computed with them."""
    for numbers in (result.values, result.second):
        with np.errstate(invalid="ignore"):
            sizes = np.abs(numbers)
            absurd = (sizes > LARGEST) | ((sizes < SMALLEST) & (sizes > 0))
        for index in np.flatnonzero(absurd):
            result.problems[int(index)] = f"{numbers[index]:g} is no possible value here"
            numbers[index] = np.nan


def _put(result: Numbers, index: int, taken: Taken) -> None:
    result.values[index] = taken.value
    if taken.second == taken.second:
        result.second[index] = taken.second
    if taken.unit:
        result.units[index] = taken.unit
    if taken.state:
        result.states[index] = taken.state
    if taken.problem:
        result.problems[index] = taken.problem
    if taken.hand:
        result.hands[index] = taken.hand


def take(cell: Value, taker: Taker) -> Taken:
    """Read one cell that is not a float: text, or something that can be no number."""
    if isinstance(cell, bool):
        return Taken(problem=f"{shown(cell)} stands where a number belongs")
    if isinstance(cell, int | float):
        return Taken(value=float(cell))
    if isinstance(cell, CellError):
        return Taken(problem=f"the cell shows the error {cell}; a value belongs there")
    if isinstance(cell, Uncalculated):
        return Taken(
            problem="the formula has no stored value; open the file in a spreadsheet program and save it, or "
            "type the value"
        )
    if isinstance(cell, datetime | date | time):
        return Taken(problem=_date_problem(cell))
    if is_blank(cell):
        return NOTHING
    return taker(squeeze(_FOOTNOTE.sub("", str(cell))))


def _date_problem(cell: date | time) -> str:
    if isinstance(cell, date):
        typed = f"perhaps {cell.month}/{cell.day} or {cell.day}/{cell.month} was typed"
        return f"a date ({shown(cell)}) stands here, {typed}; type it as text"
    return f"a time of day ({shown(cell)}) stands here; type what was meant as text"


_FOOTNOTE = re.compile(r"(?<=[\w\"'″′)])\s*(?:[*†‡]+|\d\))\s*$")
