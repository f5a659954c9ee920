"""A new workbook with the same rows, for files that cannot be annotated in place."""

import datetime
from pathlib import Path

import pytest
from parts import one_column

from cant.files.annotate import annotate
from cant.files.grid import CellError, CellRange, Sheet, Uncalculated, Workbook
from cant.files.open import open_workbook
from cant.files.rewrite import rows_as_new_workbook, sheet_name_in_new_workbook

HERE = Path(__file__).parent


@pytest.mark.parametrize("suffix", ["xls", "ods"])
def test_same_rows_then_annotated(suffix):
    workbook = open_workbook((HERE / f"values.{suffix}").read_bytes(), f"values.{suffix}")
    data = rows_as_new_workbook(workbook)
    again = open_workbook(data, "new.xlsx")
    assert [sheet.rows for sheet in again.sheets] == [sheet.rows for sheet in workbook.sheets]
    assert [sheet.visible for sheet in again.sheets] == [sheet.visible for sheet in workbook.sheets]
    assert again.sheets[0].merged == workbook.sheets[0].merged
    assert again.sheets[0].hidden_rows == workbook.sheets[0].hidden_rows
    assert again.sheets[0].hidden_columns == workbook.sheets[0].hidden_columns
    result = annotate(data, [one_column("A", 1)])
    assert open_workbook(result.data, "c").sheets[0].earlier_columns == (9,)


def test_every_kind_of_value_stays_what_it_is():
    row = [
        1.5, "text", "=1+1", True, datetime.date(2026, 3, 1), datetime.datetime(2026, 3, 1, 10, 30),
        datetime.time(6), CellError("#DIV/0!"), None, "http://line.example/", "_x0041_",
    ]  # fmt: skip
    sheet = Sheet("S", [row], number_formats={(1, 0): '0.0 "m"'})
    again = open_workbook(rows_as_new_workbook(Workbook("a.ods", "ods", [sheet])), "b").sheets[0]
    assert again.rows == [row]
    assert isinstance(again.rows[0][7], CellError)
    assert again.number_formats[1, 0] == '0.0 "m"'


def test_formula_without_value_and_odd_error_become_text():
    sheet = Sheet("S", [[Uncalculated("=A1"), CellError("nan"), datetime.date(1850, 1, 1)]])
    again = open_workbook(rows_as_new_workbook(Workbook("a.ods", "ods", [sheet])), "b").sheets[0]
    assert again.rows == [["=A1", "nan", "1850-01-01"]]
    assert not again.formulas


def test_names_of_sheets():
    sheets = [Sheet(name, []) for name in ("", "a/b", "A b", "history", "x" * 40, "'q'")]
    workbook = Workbook("C:\\lists\\vale line [up].csv", "csv", sheets)
    names = [sheet_name_in_new_workbook(workbook, index) for index in range(len(sheets))]
    assert names == ["vale line  up", "a b", "A b (2)", "history sheet", "x" * 31, "q"]
    assert (
        open_workbook(rows_as_new_workbook(Workbook("l.csv", "csv", [Sheet("", [["a"]])])), "b")
        .sheets[0]
        .name
        == "l"
    )


def test_overlapping_and_vast_merged_ranges_are_left_out():
    merged = [CellRange(1, 0, 1, 2), CellRange(1, 1, 2, 1), CellRange(3, 0, 1_048_576, 16_383)]
    sheet = Sheet("S", [["a", None, "covered"]], merged=merged)
    again = open_workbook(rows_as_new_workbook(Workbook("a.ods", "ods", [sheet])), "b").sheets[0]
    assert again.merged == merged[:1]
    assert again.rows == [["a", None, "covered"]]
