"""The reading as a form: what each column may be read as, which questions are open, and the answers sent.

Answers have the format of ``--reading`` (:mod:`cant.reading.answers`): what is clicked here can be written
in a file there.
"""

from __future__ import annotations

import copy
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from cant.errors import column_letter
from cant.model.reading import ColumnReading, Question, Reading
from cant.reading.columns import columns_of
from cant.units import UNITS

LEFT_AS_IS = "left as it is"
ROLE_WORDS = {"curves": "curve list", "traffic": "trains", "limits": "limits", "settings": "settings"}


@dataclass(frozen=True)
class ShownColumn:
    """A column with what it may be corrected to."""

    reading: ColumnReading
    field: str
    letter: str
    meanings: list[tuple[str, str]]
    units: list[str]


@dataclass(frozen=True)
class ShownSheet:
    """A sheet that holds curves, with its columns."""

    name: str
    where: str
    columns: list[ShownColumn]


@dataclass(frozen=True)
class ShownQuestion:
    """A question with the name of its field."""

    name: str
    question: Question


def shown_sheets(reading: Reading) -> list[ShownSheet]:
    """Give the sheets that hold curves, with their columns."""
    classes = reading.traffic.class_names if reading.traffic else []
    meanings = [("", LEFT_AS_IS)]
    meanings += [(info.name, info.name) for info in columns_of("curves")]
    meanings += [(f"Speed {name}", f"Speed {name}") for name in classes]
    meanings += [(c.name, c.name) for c in columns_of("curves", helpers=True) if c.helper]
    columns: dict[str, list[ShownColumn]] = {}
    for number, item in enumerate(reading.columns):
        known = any(item.meaning == meaning for meaning, _ in meanings)
        choices = meanings if known else [*meanings, (item.meaning, item.meaning)]
        shown = ShownColumn(item, f"c-{number}", column_letter(item.index), choices, _units(item))
        columns.setdefault(item.sheet, []).append(shown)
    holds_curves = {s.sheet for s in reading.sheets if s.role == "curves"}
    where = {s.sheet: _where(reading, s.sheet) for s in reading.sheets}
    return [
        ShownSheet(name, where.get(name, ""), shown)
        for name, shown in columns.items()
        if name in holds_curves
    ]


def other_sheets(reading: Reading) -> list[str]:
    """Give in words the sheets that hold something else, or nothing that is used."""
    return [f"{s.sheet}: {ROLE_WORDS.get(s.role, 'not used')}" for s in reading.sheets if s.role != "curves"]


def _where(reading: Reading, sheet: str) -> str:
    tables = [s for s in reading.sheets if s.sheet == sheet and s.role == "curves"]
    return "; ".join(f"headings in row {s.header_row}, rows {s.first_row} to {s.last_row}" for s in tables)


def _units(item: ColumnReading) -> list[str]:
    if item.unit not in UNITS:
        return []
    dimension = UNITS[item.unit].dimension
    return [symbol for symbol, unit in UNITS.items() if unit.dimension == dimension]


def shown_questions(reading: Reading) -> list[ShownQuestion]:
    """Give the open questions."""
    return [ShownQuestion(f"q-{number}", question) for number, question in enumerate(reading.questions)]


def answers(
    given: Mapping[str, str], reading: Reading, before: Mapping[str, Any] | None
) -> dict[str, Any] | None:
    """Give the answers and corrections that hold after a form was sent.

    Parameters
    ----------
    given : mapping of str to str
        ``q-N`` for question N; ``c-N-meaning`` and ``c-N-unit`` for column N of the reading.
    reading : Reading
        As the form showed it.
    before : mapping or None
        What held before: it stays, but for what is changed now.

    Returns
    -------
    dict or None
        In the format of ``--reading``; None where nothing is answered or corrected.
    """
    merged: dict[str, Any] = copy.deepcopy(dict(before or {}))
    for shown in shown_questions(reading):
        choice = given.get(shown.name, "")
        if choice in shown.question.choices:
            _add_answer(merged, shown.question, choice)
    for number, item in enumerate(reading.columns):
        correction = _correction(given, f"c-{number}", item)
        if correction:
            sheet = merged.setdefault("columns", {}).setdefault(item.sheet, {})
            letter = column_letter(item.index)
            sheet[letter] = {**sheet.get(letter, {}), **correction}
    return merged or None


def words_of(given: Mapping[str, str], reading: Reading) -> list[str]:
    """Say what a form answers and corrects, one sentence each."""
    said = []
    for shown in shown_questions(reading):
        choice = given.get(shown.name, "")
        if choice in shown.question.choices:
            said.append(f"{shown.question.question} {choice}")
    for number, item in enumerate(reading.columns):
        correction = _correction(given, f"c-{number}", item)
        if correction:
            parts = [f"read as {correction['meaning'] or 'nothing'}"] if "meaning" in correction else []
            parts += [f"in {correction['unit']}"] if "unit" in correction else []
            said.append(f"Column {column_letter(item.index)} {item.heading}: {', '.join(parts)}")
    return said


def _add_answer(merged: dict[str, Any], question: Question, choice: str) -> None:
    sheet = merged.setdefault("answers", {}).setdefault(question.sheet, {})
    earlier = sheet.get(question.column, [])
    earlier = [earlier] if isinstance(earlier, str) else list(earlier)
    sheet[question.column] = [*(a for a in earlier if a not in question.choices), choice]


def _correction(given: Mapping[str, str], field: str, item: ColumnReading) -> dict[str, str]:
    meaning, unit = given.get(f"{field}-meaning"), given.get(f"{field}-unit")
    changed: dict[str, str] = {}
    if meaning is not None and meaning != item.meaning:
        changed["meaning"] = meaning
    if unit and unit != item.unit:
        changed["unit"] = unit
    return changed
