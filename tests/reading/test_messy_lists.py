"""Whole lists as engineers have them: every value read as meant, no row lost, few questions."""

from __future__ import annotations

from typing import Any

import messy
import messy_far
import messy_hard
import messy_more
import messy_odd
import messy_wide
import pytest
from messy import Messy

from cant.model.reading import Reading

LISTS = [
    *messy.LAYOUTS,
    *messy_more.LAYOUTS,
    *messy_hard.LAYOUTS,
    *messy_wide.LAYOUTS,
    *messy_far.LAYOUTS,
    *messy_odd.LAYOUTS,
]


def read_values(reading: Reading, index: int) -> dict[str, Any]:
    curves = reading.curves
    speeds = {
        name: float(column[index]) if column[index] == column[index] else None
        for name, column in curves.class_speeds.items()
    }
    names = {"Line": curves.line[index], "Track": curves.track[index], "Curve": curves.curve[index]}
    return {**speeds, **names, **curves.as_read(index)}


def by_row(reading: Reading) -> dict[int, int]:
    """Position of each curve by row; the second block or sheet of the same row has 1000 added."""
    found: dict[int, int] = {}
    for index, row in enumerate(reading.curves.row):
        key = int(row)
        while key in found:
            key += 1000
        found[key] = index
    return found


@pytest.mark.parametrize("case", LISTS, ids=lambda case: case.name)
def test_every_value_of_a_list_is_read_as_meant(case: Messy) -> None:
    reading = case.read()
    at = by_row(reading)
    assert set(at) == set(case.expected)
    for row, expected in case.expected.items():
        values = read_values(reading, at[row])
        for name, value in expected.items():
            got = values.get(name)
            if isinstance(value, float | int) and got is not None:
                tolerance = 2e-4 if name.endswith("_km") else 1e-3 * max(1.0, abs(value))
                assert got == pytest.approx(value, abs=tolerance), (row, name)
            else:
                assert got == value, (row, name)


@pytest.mark.parametrize("case", LISTS, ids=lambda case: case.name)
def test_questions_are_few_and_rows_in_doubt_are_named(case: Messy) -> None:
    reading = case.read()
    assert len(reading.questions) == case.questions
    refused = {row.row for row in reading.rejected}
    asked = {row for question in reading.questions for row in question.rows}
    assert refused == set(case.rejected) | asked
    assert all(row.problem for row in reading.rejected)


@pytest.mark.parametrize("case", LISTS, ids=lambda case: case.name)
def test_no_row_with_content_vanishes_without_a_word(case: Messy) -> None:
    reading = case.read()
    for sheet in reading.sheets:
        if sheet.role != "curves":
            continue
        source = next(s for s in case.sheets if s.name == sheet.sheet)
        taken = {
            int(r)
            for r, name in zip(reading.curves.row, reading.curves.sheet, strict=True)
            if name == sheet.sheet
        }
        words = " ".join(note for note in reading.notes)
        for row in range(sheet.header_row + 1, len(source.rows) + 1):
            if any(source.rows[row - 1]) and row not in taken:
                elements = "list of elements" in words
                assert elements or str(row) in words.replace(",", " ").replace(":", " ").split(), row


def test_a_question_gives_what_speaks_for_each_choice_and_takes_its_choices_back() -> None:
    for case in LISTS:
        for question in case.read().questions:
            assert len(question.choices) >= 2
            assert question.rows
            for choice in question.choices:
                answers = {"answers": {question.sheet or "*": {question.column: choice}}}
                again = Messy(case.name, case.sheets, {}, answers=answers).read()
                assert question not in again.questions


def test_the_kind_of_a_lone_degree_is_asked_for() -> None:
    reading = messy_more.DEGREE_ASKED.read()
    [question] = reading.questions
    assert question.choices == ("20 m", "100 ft")
    assert question.rows == (2, 3)
    assert {r.row for r in reading.rejected} == {2, 3}
