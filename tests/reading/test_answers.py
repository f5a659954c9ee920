"""Answers and corrections: what a person says rules over what was understood."""

from __future__ import annotations

import json
from typing import Any

import pytest
from messy import sheet

from cant.errors import FileError, InputError
from cant.files.grid import Workbook
from cant.reading import read_answers, read_workbook

LIST = sheet("""
Curve | km from | km to | D | Radius (m) | Cant | Freight load | Speed (km/h)
1 | 10.100 | 10.350 | 2.5 | 700 | 90 | 60 | 100
2 | 11.000 | 11.200 | 3.0 | 600 | 75 | 60 | 100
""")


def read(answers: dict[str, Any] | None = None):
    return read_workbook(Workbook("list.xlsx", "xlsx", [LIST]), answers=answers)


def test_a_correction_gives_a_column_its_meaning_and_unit() -> None:
    reading = read(
        {"columns": {"Curves": {"Cant": {"unit": "in"}, "G": {"meaning": "Speed Freight", "unit": "mph"}}}}
    )
    assert reading.curves.cant_mm[0] == pytest.approx(90 * 25.4) or reading.rejected
    assert reading.curves.class_speeds["Freight"][0] == pytest.approx(60 * 1.609344)
    told = {c.heading: c for c in reading.columns}
    assert (told["Cant"].unit, told["Cant"].unit_from) == ("in", "answer")


def test_a_column_can_be_left_as_it_is() -> None:
    reading = read({"columns": {"*": {"Cant": "ignore"}}})
    assert reading.curves.as_read(0)["cant_mm"] is None
    assert next(c for c in reading.columns if c.heading == "Cant").meaning == ""


def test_json_and_toml_say_the_same() -> None:
    told = {
        "answers": {"Curves": {"R (m)": "negative is right-hand"}},
        "columns": {"Curves": {"D": "ignore"}},
    }
    toml = '[answers.Curves]\n"R (m)" = "negative is right-hand"\n[columns.Curves]\nD = "ignore"\n'
    assert read_answers(json.dumps(told).encode(), "a.json") == read_answers(toml.encode(), "a.toml") == told


@pytest.mark.parametrize("data", [b"\xff\xfe", b"{", b"a = "])
def test_a_file_that_is_neither_is_refused(data: bytes) -> None:
    with pytest.raises(FileError, match="answers"):
        read_answers(data, "answers.json")


@pytest.mark.parametrize(
    ("answers", "says"),
    [
        ({"answer": {}}, "'answer' is no part"),
        ({"answers": {"Curves": "in"}}, "each sheet its headings"),
        ({"answers": {"Curves": {"R": 5}}}, "the text of a choice"),
        ({"columns": {"Curves": {"R": {"meaning": "Colour"}}}}, "the meaning 'Colour'"),
        ({"columns": {"Curves": {"R": {"unit": "furlong"}}}}, "the unit 'furlong'"),
        ({"columns": {"Curves": {"R": {"units": "m"}}}}, "the correction of 'R'"),
    ],
)
def test_answers_that_make_no_sense_are_refused(answers: dict[str, Any], says: str) -> None:
    with pytest.raises(InputError, match=says):
        read(answers)


@pytest.mark.parametrize("told", [{"Cant": {"unit": "km/h"}}, {"E": {"unit": "mph"}}])
def test_a_told_unit_of_another_kind_is_refused(told: dict[str, Any]) -> None:
    with pytest.raises(InputError, match=r"^list.xlsx, sheet 'Curves', column [EF]: .* belongs there"):
        read({"columns": {"Curves": told}})


def test_answers_that_fit_nothing_are_told() -> None:
    notes = read(
        {
            "answers": {"Curves": {"D": "bananas"}},
            "columns": {"*": {"Kant": "ignore", "Cant": {"unit": "mm"}}},
        }
    ).notes
    told = [note for note in notes if "was not used" in note]
    assert len(told) == 2
    assert "'bananas' for the column 'd' of sheet 'curves'" in told[0]
    assert "'kant'" in told[1]


def test_a_fault_in_a_file_of_answers_names_the_file() -> None:
    with pytest.raises(InputError, match=r"^told\.json: 'nonsense'"):
        read_answers(b'{"nonsense": 3}', "told.json")
