"""xls and ods: values against an independent reader, and the errors that it turns into blanks.

``values.xls`` and ``values.ods`` were saved by LibreOffice 7.4 from one workbook of ours.
"""

import datetime
import io
import shutil
from pathlib import Path

import pytest
import python_calamine
from hostile import ods_table
from parts import office_converted
from rich import rich_workbook

from cant.errors import FileError
from cant.files.annotate import can_annotate
from cant.files.grid import CellError, CellRange, Uncalculated
from cant.files.open import open_workbook

HERE = Path(__file__).parent


def data_of(suffix):
    return (HERE / f"values.{suffix}").read_bytes()


@pytest.mark.parametrize("suffix", ["xls", "ods"])
def test_kinds_of_cells(suffix):
    workbook = open_workbook(data_of(suffix), "misnamed.csv")
    assert workbook.kind == suffix
    sheet, hidden = workbook.sheets
    assert (sheet.name, sheet.visible, hidden.visible) == ("A", True, False)
    assert sheet.rows[0] == ["n", "t", "b", "err", "f", "ferr", "d"]
    assert sheet.rows[1][:2] == [1.5, "x"]
    assert sheet.rows[1][3:6] == ["#N/A", 3.0, "#DIV/0!"]
    assert isinstance(sheet.rows[1][3], CellError)
    assert isinstance(sheet.rows[1][5], CellError)
    assert sheet.rows[2] == [7.0]
    assert sheet.merged == [CellRange(5, 0, 6, 1)]
    assert sheet.hidden_rows == {3}
    assert sheet.hidden_columns == {1}
    assert sheet.next_column == 9


@pytest.mark.parametrize("suffix", ["xls", "ods"])
def test_second_opinion(suffix):
    other = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(data_of(suffix)))
    compared = 0
    for sheet in open_workbook(data_of(suffix), "a").sheets:
        for number, row in enumerate(other.get_sheet_by_name(sheet.name).to_python(skip_empty_area=False), 1):
            for column, theirs in enumerate(row):
                ours = sheet.value(number, column)
                if ours is None or isinstance(ours, CellError):
                    assert theirs == ""
                else:
                    assert ours == theirs
                compared += 1
    assert compared > 40


@pytest.mark.parametrize(("suffix", "reason"), [("xls", ".xls"), ("ods", ".ods")])
def test_cannot_be_annotated_in_place(suffix, reason):
    assert reason in can_annotate(data_of(suffix))


def test_ods_repeats_dates_texts_and_formulas():
    cells = (
        '<table:table-cell o:value-type="float" o:value="2" table:number-columns-repeated="2"/>'
        '<table:table-cell o:value-type="date" o:date-value="2026-03-01"/>'
        '<table:table-cell o:value-type="time" o:time-value="PT06H30M00S"/>'
        '<table:table-cell o:value-type="boolean" o:boolean-value="true"/>'
        '<table:table-cell o:value-type="string"><text:p>a<text:s text:c="2"/>b</text:p><text:p>c</text:p>'
        "<o:annotation><text:p>note</text:p></o:annotation></table:table-cell>"
        '<table:table-cell table:formula="of:=[.A1]*2"/>'
        '<table:table-cell table:formula="of:=[.A1]*2" o:value-type="percentage" o:value="0.5"/>'
        '<table:table-cell table:number-columns-repeated="16000"/>'
    )
    rows = f'<table:table-row table:number-rows-repeated="3">{cells}</table:table-row>'
    (sheet,) = open_workbook(ods_table(rows), "a.ods").sheets
    assert len(sheet.rows) == 3
    assert sheet.rows[2] == [
        2.0, 2.0, datetime.date(2026, 3, 1), datetime.time(6, 30), True, "a  b\nc", "=[.A1]*2", 0.5,
    ]  # fmt: skip
    assert isinstance(sheet.rows[0][6], Uncalculated)
    assert (1, 7) in sheet.formulas
    assert sheet.number_formats[1, 7] == "0.00%"


def test_ods_with_a_password_is_called_that():
    from parts import parts_of, zipped

    parts = parts_of(data_of("ods"))
    parts["META-INF/manifest.xml"] = b"<manifest:encryption-data/>"
    with pytest.raises(FileError, match="password-protected"):
        open_workbook(zipped(parts), "a.ods")


def test_xls_cut_off_is_refused():
    with pytest.raises(FileError, match="damaged"):
        open_workbook(data_of("xls")[:3000], "a.xls")


@pytest.mark.office
@pytest.mark.parametrize("suffix", ["xls", "ods"])
def test_the_same_values_from_every_format(suffix, tmp_path):
    if shutil.which("soffice") is None:
        pytest.skip("LibreOffice (soffice) is not installed")
    data = office_converted(rich_workbook(), tmp_path, suffix)
    ours = {sheet.name: sheet for sheet in open_workbook(rich_workbook(), "a").sheets}
    theirs = {sheet.name: sheet for sheet in open_workbook(data, "b").sheets}
    for row in range(4, 40):
        for column in range(7):
            one, two = ours["Curves"].value(row, column), theirs["Curves"].value(row, column)
            assert one == pytest.approx(two) if isinstance(one, float) else one == two
