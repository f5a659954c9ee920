"""Annotating a workbook that has much in it: nothing is lost, and what is added arrives."""

import datetime
import io
import shutil
import warnings

import openpyxl
import pytest
import python_calamine
import xlsxwriter
from lxml import etree
from parts import (
    changed_parts,
    check_package,
    lost_elements,
    office_converted,
    office_pdf,
    one_column,
    parts_of,
)
from rich import ROWS, rich_workbook, with_macros

from cant.files.additions import AddedColumn, CellMark, ConditionalFill, OutCell, SheetAddition
from cant.files.annotate import annotate
from cant.files.open import open_workbook

MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
FIRST, LAST = 4, ROWS + 3
EXPECTED_CHANGES = {
    "[Content_Types].xml",
    "xl/_rels/workbook.xml.rels",
    "xl/calcChain.xml",
    "xl/comments1.xml",
    "xl/drawings/vmlDrawing1.vml",
    "xl/styles.xml",
    "xl/workbook.xml",
    "xl/worksheets/sheet1.xml",
}


@pytest.fixture(scope="module")
def original():
    return rich_workbook()


@pytest.fixture(scope="module")
def new_sheets():
    out = io.BytesIO()
    book = xlsxwriter.Workbook(out)
    page = book.add_worksheet("Cant plan")
    bold = book.add_format({"bold": True, "bg_color": "#FFCC00", "num_format": '0.0 "mm"'})
    page.write_string("A1", "=not a formula", bold)
    page.write_number("B1", 60, bold)
    page.write_formula("C1", "=B1*2", None, 120)
    page.write_formula("D1", "=Curves!D4", None, 15)
    page.write_comment("A1", "Made by calculation")
    page.conditional_format("B1:B9", {"type": "cell", "criteria": ">", "value": 50, "format": bold})
    page.add_table("F1:G3", {"name": "Reasons"})
    chart = book.add_chart({"type": "line"})
    chart.add_series({"values": "='Cant plan'!$B$1:$B$3"})
    page.insert_chart("A9", chart)
    page.print_area("A1:D9")
    book.add_worksheet("Limits").write("A1", "cant")
    book.close()
    return out.getvalue()


@pytest.fixture(scope="module")
def additions():
    rows = range(FIRST, LAST + 1)
    proposed = {row: OutCell(5.0 * (row % 30), number_format="0", fill="FFEE99") for row in rows}
    proposed[FIRST] = OutCell(60.0, number_format="0", note="Bound by cant excess")
    columns = [
        AddedColumn("Proposed cant (mm)", proposed, width=14, heading_note="On the grid of 5 mm"),
        AddedColumn(
            "Change",
            {
                row: OutCell(proposed[row].value - 5 * ((row - 1) % 30), formula=f"K{row}-D{row}")
                for row in rows
            },
            number_format="0.0",
        ),
        AddedColumn("Reason", {row: OutCell("=cant & <excess>_x0041_\x07") for row in rows}, width=30),
        AddedColumn(
            "Approved",
            {FIRST: OutCell(True), FIRST + 1: OutCell(None, fill="FFCCCC"), FIRST + 2: OutCell(float("nan"))},
        ),
    ]
    columns[0] = AddedColumn(
        columns[0].heading,
        proposed,
        14,
        None,
        "On the grid of 5 mm",
        None,
        [ConditionalFill(f"K{FIRST}>100", "FF0000", "FFFFFF")],
    )
    marks = [
        CellMark(7, 2, fill="FFFF00", note="Radius doubtful"),
        CellMark(8, 2, fill="FFFF00"),
        CellMark(5, 0, note="has a note of the surveyor's"),
        CellMark(6, 1, note="has a thread"),
    ]
    return [SheetAddition("curves", 3, columns, marks)]


@pytest.fixture(scope="module")
def annotated(original, additions, new_sheets):
    return annotate(original, additions, new_sheets, "line.xlsx")


def test_package_holds_together(original, annotated, additions, new_sheets):
    check_package(annotated.data)
    check_package(annotate(annotated.data, additions, new_sheets).data)
    check_package(annotate(annotated.data, []).data)
    check_package(annotate(with_macros(original), additions, new_sheets).data)


def test_all_other_parts_are_byte_identical(original, annotated):
    assert changed_parts(original, annotated.data) == EXPECTED_CHANGES


def test_nothing_in_the_edited_parts_is_lost(original, annotated):
    before, after = parts_of(original), parts_of(annotated.data)
    for name in EXPECTED_CHANGES - {"xl/calcChain.xml", "xl/drawings/vmlDrawing1.vml"}:
        lost = lost_elements(before[name], after[name])
        if name == "xl/worksheets/sheet1.xml":
            lost = [one for one in lost if "|col|" not in one]  # hidden columns make room
        if name.endswith((".rels", "Types].xml")):
            lost = [one for one in lost if "calcChain" not in one]
        if name == "xl/workbook.xml":
            lost = [one for one in lost if "|calcPr|" not in one]
        assert lost == []
    shapes = before["xl/drawings/vmlDrawing1.vml"].partition(b"<v:shapetype")[2].partition(b"</xml>")[0]
    assert shapes in after["xl/drawings/vmlDrawing1.vml"]


def test_users_cells_keep_their_bytes(original, annotated):
    before = parts_of(original)["xl/worksheets/sheet1.xml"]
    after = parts_of(annotated.data)["xl/worksheets/sheet1.xml"]
    start = before.index(b"<sheetData>")
    for row in before[start : before.index(b"</sheetData>")].split(b"<row ")[1:]:
        cells = row[row.index(b">") + 1 :].removesuffix(b"</row>")
        assert cells in after


def test_stored_values_of_the_users_formulas_stay(original, annotated):
    before = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(original))
    after = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(annotated.data))
    for name in ("Curves", "Branch", "It's done", "Lists"):
        old = before.get_sheet_by_name(name).to_python(skip_empty_area=False)
        new = after.get_sheet_by_name(name).to_python(skip_empty_area=False)
        assert [row[: len(old[0])] for row in new[: len(old)]] == old


def test_added_cells_arrive(annotated):
    page = _openpyxl(annotated.data)["Curves"]
    assert [page.cell(3, column).value for column in range(11, 15)] == [
        "Proposed cant (mm)", "Change", "Reason", "Approved",
    ]  # fmt: skip
    assert page["K4"].value == 60
    assert page["L5"].value == "=K5-D5"
    assert page["M5"].data_type == "s"
    assert page["N4"].value is True
    assert page["N5"].value is None
    assert page["N6"].value == "#N/A"
    values = _openpyxl(annotated.data, data_only=True)["Curves"]
    assert values["L5"].value == 5.0


def test_added_text_stays_text(annotated):
    after = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(annotated.data))
    row = after.get_sheet_by_name("Curves").to_python(skip_empty_area=False)[4]
    assert row[12] == "=cant & <excess>_x0041_\x07"


def test_added_cells_look_like_their_neighbours(annotated):
    page = _openpyxl(annotated.data)["Curves"]
    assert page["K3"].font.bold
    assert page["K3"].fill.fgColor.rgb == page["G3"].fill.fgColor.rgb
    assert page["L8"].border.left.style == page["G8"].border.left.style == "thin"
    assert page["L5"].number_format == "0.0"
    assert page["K5"].fill.fgColor.rgb == "FFFFEE99"
    assert page["G5"].fill.fill_type is None


def test_notes_and_marks(annotated):
    page = _openpyxl(annotated.data)["Curves"]
    assert page["K4"].comment.text == "Bound by cant excess"
    assert page["K3"].comment.text == "On the grid of 5 mm"
    assert page["C7"].comment.text == "Radius doubtful"
    assert page["A5"].comment.text.endswith("Rail worn")
    assert page["B6"].comment is None
    fills = {str(one.sqref): rules for one, rules in page.conditional_formatting._cf_rules.items()}
    assert "C7:C8" in fills
    assert "K4:K43" in fills


def test_hidden_columns_make_room_and_the_rest_stays_hidden(annotated):
    columns = etree.fromstring(parts_of(annotated.data)["xl/worksheets/sheet1.xml"]).find(f"{MAIN}cols")
    shown = [(one.get("min"), one.get("max"), one.get("hidden"), one.get("width")) for one in columns][-5:]
    assert [one[:3] for one in shown] == [
        ("11", "11", None), ("12", "12", None), ("13", "13", None), ("14", "14", None), ("15", "16384", "1"),
    ]  # fmt: skip
    assert [one[3] for one in shown[:3]] == ["14", "11", "30"]


def test_new_sheets_arrive_with_what_is_on_them(annotated):
    book = _openpyxl(annotated.data)
    assert book.sheetnames[-2:] == ["Cant plan", "Limits"]
    page = book["Cant plan"]
    assert page["A1"].value == "=not a formula"
    assert page["A1"].data_type == "s"
    assert page["A1"].font.bold
    assert page["A1"].fill.fgColor.rgb == "FFFFCC00"
    assert page["B1"].number_format == '0.0 "mm"'
    assert page["D1"].value == "=Curves!D4"
    assert page["A1"].comment.text.endswith("Made by calculation")
    assert len(page._charts) == 1
    assert len(page.tables) == 1
    assert page.print_area == "'Cant plan'!$A$1:$D$9"
    assert len(page.conditional_formatting) == 1


def test_order_to_recalculate(annotated):
    parts = parts_of(annotated.data)
    assert "xl/calcChain.xml" not in parts
    assert b"calcChain" not in parts["[Content_Types].xml"] + parts["xl/_rels/workbook.xml.rels"]
    assert b'fullCalcOnLoad="1"' in parts["xl/workbook.xml"]


def test_calculation_chain_stays_where_no_formula_comes_or_goes(original):
    result = annotate(original, [one_column("Curves", 3)])
    assert "xl/calcChain.xml" not in changed_parts(original, result.data)


def test_person_is_told(annotated):
    told = "\n".join(annotated.notes)
    assert "2 cell(s) have a note already" in told
    assert "filter does not reach" in told
    assert "print area" in told
    assert "hidden" in told


def test_protected_sheet_and_table_are_told(original):
    result = annotate(original, [one_column("It's done", 1), one_column("Branch", 1)])
    told = "\n".join(result.notes)
    assert "'It's done' is protected" in told
    assert "a table ends left" in told
    page = _openpyxl(result.data)["Branch"]
    assert page["D1"].value is None
    assert page["E1"].value == "New cant"
    assert page.tables["BranchCurves"].ref == "A1:C4"


def test_second_run_replaces_the_first(original, annotated, additions, new_sheets):
    again = annotate(annotated.data, additions, new_sheets)
    first, second = parts_of(annotated.data), parts_of(again.data)
    first.pop("[Content_Types].xml")
    second.pop("[Content_Types].xml")
    assert first == second


def test_second_run_with_less_takes_the_rest_away(original, annotated):
    again = annotate(annotated.data, [])
    before, after = open_workbook(original, "a"), open_workbook(again.data, "a")
    assert [sheet.rows for sheet in before.sheets] == [sheet.rows for sheet in after.sheets]
    page = _openpyxl(again.data)["Curves"]
    assert page["C7"].comment is None
    assert page["A5"].comment is not None
    assert not [one for one in page.conditional_formatting if str(one.sqref) == "C7:C8"]
    assert b"_cant_" not in parts_of(again.data)["xl/workbook.xml"]
    assert not [name for name in parts_of(again.data) if name not in parts_of(original)]


def test_reading_leaves_the_annotation_out(original, annotated):
    before, after = open_workbook(original, "a.xlsx"), open_workbook(annotated.data, "a.xlsx")
    assert [sheet.rows for sheet in after.sheets] == [sheet.rows for sheet in before.sheets]
    assert after.sheets[0].earlier_columns == (10, 11, 12, 13)
    assert after.sheets[0].added_columns(5) == [10, 11, 12, 13, 14]
    assert any("earlier annotation" in note for note in after.notes)


def test_macros_stay_byte_identical(original, additions, new_sheets):
    data = with_macros(original)
    result = annotate(data, additions, new_sheets)
    assert open_workbook(data, "a").kind == open_workbook(result.data, "a").kind == "xlsm"
    assert changed_parts(data, result.data) == EXPECTED_CHANGES


def test_dates_are_read_as_dates(original):
    assert open_workbook(original, "a").sheets[0].value(4, 4) == datetime.date(2023, 3, 18)


@pytest.mark.office
def test_libreoffice_opens_the_result(annotated, tmp_path):
    if shutil.which("soffice") is None:
        pytest.skip("LibreOffice (soffice) is not installed")
    assert office_pdf(annotated.data, tmp_path).startswith(b"%PDF")


def _openpyxl(data, **options):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # it warns of what it would lose
        return openpyxl.load_workbook(io.BytesIO(data), **options)


@pytest.mark.office
def test_marks_survive_another_program_that_saves_the_file(annotated, additions, new_sheets, tmp_path):
    """LibreOffice writes the whole file anew; the annotation is still found and replaced, not doubled."""
    if shutil.which("soffice") is None:
        pytest.skip("LibreOffice (soffice) is not installed")
    saved = office_converted(annotated.data, tmp_path, "xlsx")
    workbook = open_workbook(saved, "a.xlsx")
    assert workbook.sheets[0].earlier_columns == (10, 11, 12, 13)
    assert not {"Cant plan", "Limits"} & {sheet.name for sheet in workbook.sheets}
    again = annotate(saved, additions, new_sheets)
    book = _openpyxl(again.data)
    assert [name for name in book.sheetnames if name.startswith("Cant plan")] == ["Cant plan"]
    page = book["Curves"]
    assert page["K5"].value == 25
    assert [page.cell(3, column).value for column in (11, 14, 15)] == ["Proposed cant (mm)", "Approved", None]
    assert page["C7"].comment.text == "Radius doubtful"
    assert len([one for one in page.conditional_formatting if str(one.sqref) == "C7:C8"]) == 1
    values = _openpyxl(saved, data_only=True)["Curves"]
    assert values["L5"].value == values["K5"].value - values["D5"].value
