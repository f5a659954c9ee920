"""A sheet of ours: what is written is what is read, and text stays text."""

from __future__ import annotations

import io
from pathlib import Path
from zipfile import ZipFile

import pytest
from book_tools import put_together
from openpyxl import load_workbook
from python_calamine import CalamineWorkbook

from cant.writing.looks import MAX_TEXT, Heading
from cant.writing.sheets import NewSheets

SLY = [
    "=1+1",
    "+1",
    "-1",
    "@SUM(A1)",
    "{=1}",
    "http://a.b",
    "internal:Sheet!A1",
    "007",
    "1e5",
    "TRUE",
    "<b>&amp;",
]


def book_of(texts: list[str]) -> bytes:
    with NewSheets() as book:
        sheet = book.table("T")
        sheet.header([Heading("Text"), Heading("Number", number_format="0.0")])
        for number, text in enumerate(texts):
            sheet.row([text, float(number)])
        return put_together(book)


def test_text_stays_text() -> None:
    data = book_of(SLY)
    rows = list(load_workbook(io.BytesIO(data))["T"].iter_rows(min_row=2))
    assert [row[0].value for row in rows] == SLY
    assert all(row[0].data_type in "s" for row in rows)
    assert all(row[0].hyperlink is None for row in rows)
    assert [row[1].value for row in rows] == list(range(len(SLY)))
    parts = ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml")
    assert b"<f>" not in parts
    assert b"hyperlink" not in parts


@pytest.mark.parametrize("text", ["_x0041_", "a\x07b", "zwei\nZeilen", "  Rand  ", "дёрн 曲線 ½"])
def test_odd_text_comes_back(text: str) -> None:
    rows = CalamineWorkbook.from_filelike(io.BytesIO(book_of([text]))).get_sheet_by_name("T").to_python()
    assert rows[1][0] == text


def test_a_text_longer_than_a_cell_is_cut_with_a_mark() -> None:
    cell = load_workbook(io.BytesIO(book_of(["x" * 50_000])))["T"]["A2"].value
    assert isinstance(cell, str)
    assert len(cell) <= 32_767
    assert cell == "x" * MAX_TEXT + " ..."


def test_a_blank_is_a_blank() -> None:
    with NewSheets() as book:
        sheet = book.table("T")
        sheet.header([Heading(title) for title in "ABCDE"])
        sheet.row([None, "a", None, 1.5, float("nan")])
        sheet.row([])
        sheet.row(["", "b"])
        data = put_together(book)
    rows = list(load_workbook(io.BytesIO(data))["T"].iter_rows(values_only=True))
    assert rows[1:3] == [(None, "a", None, 1.5, None), (None,) * 5]
    assert rows[3][1] == "b"


def test_rows_of_both_ways_stand_in_order() -> None:
    with NewSheets() as book:
        sheet = book.table("T")
        sheet.line("title", bold=True)
        sheet.header([Heading("A", 12, "0.00"), Heading("Text", 50)])
        sheet.row([1.0, "x " * 60])
        sheet.row([2.5, "short"])
        sheet.line("end", 3.0)
        data = put_together(book)
    read = load_workbook(io.BytesIO(data))["T"]
    column = [cell.value for cell in read["A"]]
    assert column == ["title", "A", 1, 2.5, "end"]
    assert read["A3"].number_format == "0.00"
    assert read.row_dimensions[3].height == 45
    assert read.row_dimensions[4].height is None
    assert read.dimensions == "A1:B5"


@pytest.mark.parametrize("fails", [True, False])
def test_nothing_of_the_making_is_left_behind(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, fails: bool
) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    try:
        with NewSheets() as book:
            book.table("T").line("something")
            assert list(tmp_path.rglob("*"))
            if fails:
                raise KeyboardInterrupt
            assert "xl/worksheets/sheet1.xml" in book.parts().members
    except KeyboardInterrupt:
        assert fails
    assert not list(tmp_path.rglob("*"))
