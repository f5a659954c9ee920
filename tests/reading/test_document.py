"""How a reading is shown: JSON that loses nothing, a table short enough to be checked."""

from __future__ import annotations

import json

import messy
import messy_more

from cant.reading import reading_document, reading_table


def test_the_document_is_json_and_holds_every_row_and_column() -> None:
    reading = messy.GB_CHAINS.read()
    told = json.loads(json.dumps(reading_document(reading), allow_nan=False))
    assert [c["row"] for c in told["curves"]] == [5, 6, 8]
    assert told["curves"][0]["as_read"]["cant_mm"] == 90
    assert told["curves"][0]["class_speeds_kmh"]["Freight"] == 60 * 1.609344
    meanings = {c["heading"]: c["meaning"] for c in told["columns"] if c["sheet"] == "Curves"}
    assert meanings["Mileage from (m.ch)"] == "Start"
    assert meanings["Fgt"] == "Speed Fgt"
    assert told["notes"]


def test_the_table_names_columns_questions_answers_and_refused_rows() -> None:
    text = reading_table(messy_more.UNSETTLED_SIGN.read())
    assert "Radius (m)" in text
    assert "answer: negative is right-hand" in text
    assert "! row 2, Radius (m) '-650'" in text
    assert "2 curves, 2 that cannot be assessed, 1 question" in text
    assert max(len(line) for line in text.splitlines()[:9]) < 160


def test_bad_rows_show_every_problem_at_once() -> None:
    reading = messy_more.BAD_ROWS.read()
    problems = [(r.row, r.column) for r in reading.rejected]
    assert (5, "Hand") in problems
    assert (5, "Transition in") in problems
    assert all(f"row {row}" in reading_table(reading) for row, _ in problems)
