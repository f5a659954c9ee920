"""Workbooks that are unusual in one respect, each annotated, or refused with the reason."""

import io
import re
import warnings
import zipfile

import openpyxl
import pytest
from hostile import GOOD_ROWS, HEAD, MAIN, OFFICE, book, book_parts, sheet
from parts import changed_parts, check_package, one_column, parts_of, simple_workbook, zipped

from cant.errors import FileError
from cant.files.additions import AddedColumn, CellMark, OutCell, SheetAddition
from cant.files.annotate import Annotation, annotate, can_annotate
from cant.files.open import open_workbook
from cant.files.style_edit import EMPTY_STYLES

SHEET = "xl/worksheets/sheet1.xml"
TWO_STYLES = EMPTY_STYLES.decode().replace(
    '<cellXfs count="1">',
    '<cellXfs count="2"><xf numFmtId="2" fontId="0" fillId="0" borderId="0" xfId="0"/>',
)
TABLE = [["Curve", "Radius"], ["C1", 400], ["C2", 500]]


def sheet_of(data):
    return parts_of(data)[SHEET].decode()


def values(data, name="Curves"):
    check_package(data)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        page = openpyxl.load_workbook(io.BytesIO(data))[name]
    return [list(row) for row in page.iter_rows(values_only=True)]


def with_sheet(xml):
    return zipped({name: _bytes(content) for name, content in book_parts({"Curves": xml}).items()})


def _bytes(content):
    return content.encode() if isinstance(content, str) else content


def test_row_missing_from_the_sheet_is_put_in_order():
    data = book('<row r="1"><c r="A1"><v>1</v></c></row><row r="5"><c r="A5"><v>5</v></c></row>')
    cells = {row: OutCell(float(row)) for row in (2, 3, 5, 9)}
    result = annotate(data, [SheetAddition("Curves", 1, [AddedColumn("N", cells)])])
    assert re.findall(r'<row r="(\d+)"', sheet_of(result.data)) == ["1", "2", "3", "5", "9"]
    assert values(result.data)[2] == [None, 3]
    assert values(result.data)[8] == [None, 9]


def test_empty_sheet_gains_rows():
    data = with_sheet(f'{HEAD}<worksheet xmlns="{MAIN}"><sheetData/></worksheet>')
    assert values(annotate(data, [one_column("Curves", 1)]).data) == [["New cant"], [60]]


def test_empty_row_tag_is_opened():
    data = book(
        '<row r="1" ht="30" customHeight="1"/>'
        + GOOD_ROWS.replace('<row r="1">', '<row r="3">').partition("</row>")[0].replace('1"', '3"')
        + "</row>"
    )
    result = annotate(data, [one_column("Curves", 1)])
    assert '<row r="1" ht="30" customHeight="1"><c r="C1"' in sheet_of(result.data)


def test_spans_and_extent_grow():
    data = book(
        GOOD_ROWS.replace('<row r="1">', '<row r="1" spans="1:2">'), before='<dimension ref="A1:B2"/>'
    )
    text = sheet_of(annotate(data, [one_column("Curves", 1)]).data)
    assert 'spans="1:3"' in text
    assert '<dimension ref="A1:C2"/>' in text


def test_prefixed_elements():
    inner = GOOD_ROWS.replace("<", "<x:").replace("<x:/", "</x:")
    data = with_sheet(f'{HEAD}<x:worksheet xmlns:x="{MAIN}"><x:sheetData>{inner}</x:sheetData></x:worksheet>')
    assert open_workbook(data, "a").sheets[0].rows == [["Curve", "Radius"], ["C1", 400.0]]
    result = annotate(
        data,
        [
            SheetAddition(
                "Curves",
                1,
                [AddedColumn("N", {2: OutCell(1.0, "B2*2", fill="FF0000")}, 9)],
                [CellMark(2, 0, "FFFF00", "why")],
            )
        ],
    )
    assert values(result.data) == [["Curve", "Radius", "N"], ["C1", 400, "=B2*2"]]
    assert "<x:c r=" in sheet_of(result.data)
    assert "<c r=" not in sheet_of(result.data)


@pytest.mark.parametrize("encoding", ["utf-16", "utf-16-le", "iso-8859-1"])
def test_parts_in_another_encoding(encoding):
    declared = "utf-16" if encoding.startswith("utf-16") else encoding
    text = sheet(GOOD_ROWS.replace("C1<", "Zürich<")).replace("UTF-8", declared)
    raw = text.encode(encoding)
    data = with_sheet(b"\xff\xfe" + raw if encoding == "utf-16-le" else raw)
    assert open_workbook(data, "a").sheets[0].rows[1] == ["Zürich", 400.0]
    assert values(annotate(data, [one_column("Curves", 1)]).data)[1] == ["Zürich", 400, 60]


def test_comments_cdata_and_single_quotes_in_the_xml():
    rows = (
        "<!-- <row r='9'/> --><row r='1' ><c r='A1' t='inlineStr'><is><t><![CDATA[a<b]]></t></is></c></row >"
    )
    data = book(rows)
    assert open_workbook(data, "a").sheets[0].rows == [["a<b"]]
    assert values(annotate(data, [one_column("Curves", 1)]).data) == [["a<b", "New cant"], [None, 60]]


def test_cells_and_rows_without_references():
    data = book("<row><c><v>1</v></c><c><v>2</v></c></row><row><c/><c><v>4</v></c></row>")
    assert open_workbook(data, "a").sheets[0].rows == [[1.0, 2.0], [None, 4.0]]
    assert values(annotate(data, [one_column("Curves", 1)]).data) == [[1, 2, "New cant"], [None, 4, 60]]


def test_formatted_blank_cells_to_the_right_keep_their_place():
    data = book('<row r="1"><c r="A1"><v>1</v></c><c r="D1" s="0"/><c r="E1" s="1"/></row>')
    result = annotate(data, [one_column("Curves", 1)])
    assert 's="1"/><c r="F1"' in sheet_of(result.data)


def test_row_formatted_to_the_end_does_not_push_columns_away():
    far = "".join(f'<c r="{letters}2" s="1"/>' for letters in ("C", "D", "ZZ"))
    data = book(GOOD_ROWS.replace("</v></c></row>", "</v></c>" + far + "</row>"), styles=TWO_STYLES)
    text = sheet_of(annotate(data, [one_column("Curves", 1)]).data)
    assert '<c r="C2" s="1"><v>60</v></c><c r="D2" s="1"/><c r="ZZ2" s="1"/>' in text


def test_existing_notes_and_a_table_are_kept_apart():
    first = annotate(simple_workbook(TABLE), [SheetAddition("Curves", 1, [], [CellMark(2, 0, None, "ours")])])
    parts = parts_of(first.data)
    parts["xl/comments1.xml"] = parts["xl/comments1.xml"].replace(b"cant annotation", b"Surveyor")
    again = annotate(
        zipped(parts),
        [SheetAddition("Curves", 1, [], [CellMark(2, 0, None, "new"), CellMark(3, 0, None, "b")])],
    )
    page = openpyxl.load_workbook(io.BytesIO(again.data))["Curves"]
    assert page["A2"].comment.text == "ours"
    assert page["A3"].comment.text == "b"
    assert "1 cell(s) have a note already" in again.notes[0]


def test_two_thousand_notes_have_shapes_of_their_own():
    rows = [["Curve"]] + [[f"C{n}"] for n in range(2000)]
    marks = [CellMark(row, 0, None, f"note {row}") for row in range(2, 2002)]
    result = annotate(simple_workbook(rows), [SheetAddition("Curves", 1, [], marks)])
    shapes = re.findall(rb'id="_x0000_s(\d+)"', parts_of(result.data)["xl/drawings/vmlDrawing1.vml"])
    assert len(set(shapes)) == 2000
    assert b'data="1,2"' in parts_of(result.data)["xl/drawings/vmlDrawing1.vml"]


def test_users_columns_put_in_later_survive_the_second_run():
    """A column is inserted amid the added ones as a spreadsheet program would: cells and names move along."""
    columns = [
        AddedColumn(name, {2: OutCell(float(n)), 3: OutCell(float(n))}) for n, name in enumerate("PQR")
    ]
    parts = parts_of(annotate(simple_workbook(TABLE), [SheetAddition("Curves", 1, columns)]).data)
    text, names = parts[SHEET].decode(), parts["xl/workbook.xml"].decode()
    for row in (1, 2, 3):
        text = text.replace(f'r="E{row}"', f'r="F{row}"').replace(f'r="D{row}"', f'r="E{row}"')
        own = f'<c r="D{row}" t="inlineStr"><is><t>mine {row}</t></is></c>'
        text = text.replace(f'<c r="E{row}"', own + f'<c r="E{row}"', 1)
    names = names.replace("$E$1:$E$3", "$F$1:$F$3").replace("$D$1:$D$3", "$E$1:$E$3")
    parts[SHEET], parts["xl/workbook.xml"] = text.encode(), names.encode()
    moved = zipped(parts)
    assert values(moved)[1] == ["C1", 400, 0, "mine 2", 1, 2]
    columns = [AddedColumn(name, {2: OutCell(7.0), 3: OutCell(8.0)}) for name in "STUV"]
    result = annotate(moved, [SheetAddition("Curves", 1, columns)])
    assert values(result.data) == [
        ["Curve", "Radius", "S", "mine 1", "T", "U", "V"],
        ["C1", 400, 7, "mine 2", 7, 7, 7],
        ["C2", 500, 8, "mine 3", 8, 8, 8],
    ]
    assert open_workbook(moved, "a").sheets[0].rows[1] == ["C1", 400.0, None, "mine 2"]


def test_column_deleted_by_the_user_is_made_anew():
    parts = parts_of(annotate(simple_workbook(TABLE), [one_column("Curves", 1)]).data)
    parts["xl/workbook.xml"] = parts["xl/workbook.xml"].replace(b"'Curves'!$C$1:$C$2", b"'Curves'!#REF!")
    parts[SHEET] = re.sub(rb'<c r="C\d".*?</c>', b"", parts[SHEET])
    assert values(annotate(zipped(parts), [one_column("Curves", 1)]).data)[1] == ["C1", 400, 60]


def test_sheet_renamed_by_the_user_is_found_by_its_mark():
    parts = parts_of(annotate(simple_workbook(TABLE), [one_column("Curves", 1)]).data)
    parts["xl/workbook.xml"] = parts["xl/workbook.xml"].replace(b"Curves", b"North")
    result = annotate(zipped(parts), [one_column("north", 1, 70.0)])
    assert values(result.data, "North")[1] == ["C1", 400, 70]


def test_new_sheet_with_a_name_that_is_taken():
    new = simple_workbook([["=Reasons"]], "CURVES")
    parts = parts_of(new)
    parts[SHEET] = parts[SHEET].replace(
        b"</sheetData>", b'<row r="2"><c r="A2"><f>CURVES!A1&amp;"CURVES!"</f><v>0</v></c></row></sheetData>'
    )
    cells = {2: OutCell("x", "CURVES!A1")}
    result = annotate(
        simple_workbook(TABLE), [SheetAddition("Curves", 1, [AddedColumn("N", cells)])], zipped(parts)
    )
    assert openpyxl.load_workbook(io.BytesIO(result.data)).sheetnames == ["Curves", "CURVES (2)"]
    assert values(result.data, "CURVES (2)")[1] == ["='CURVES (2)'!A1&\"CURVES!\""]
    assert values(result.data)[1][2] == "='CURVES (2)'!A1"
    assert "called 'CURVES (2)'" in result.notes[0]
    assert Annotation(simple_workbook(TABLE)).free_name("curves") == "curves (2)"


def test_local_names_follow_when_an_earlier_sheet_goes():
    new = simple_workbook([["x"]], "Plan")
    parts = parts_of(annotate(simple_workbook(TABLE), [one_column("Curves", 1)], new).data)
    text = parts["xl/workbook.xml"].decode()
    sheets = re.findall(r"<sheet [^>]*/>", text)
    assert len(sheets) == 2
    text = text.replace(
        sheets[0] + sheets[1], sheets[1] + sheets[0]
    )  # the user drags the new sheet to the front
    text = text.replace(
        "<definedNames>",
        '<definedNames><definedName name="_xlnm.Print_Area" localSheetId="1">Curves!$A$1</definedName>',
    )
    parts["xl/workbook.xml"] = text.encode()
    result = annotate(zipped(parts), [one_column("Curves", 1)], new)
    page = openpyxl.load_workbook(io.BytesIO(result.data))
    assert page.sheetnames == ["Curves", "Plan"]
    assert page["Curves"].print_area == "'Curves'!$A$1"


def test_book_without_styles_gets_some():
    data = book(GOOD_ROWS)
    result = annotate(
        data, [SheetAddition("Curves", 1, [AddedColumn("N", {2: OutCell(1.0, fill="FF0000")})])]
    )
    page = openpyxl.load_workbook(io.BytesIO(result.data))["Curves"]
    assert page["C2"].fill.fgColor.rgb == "FFFF0000"


def test_date_beside_does_not_make_numbers_dates():
    styles = TWO_STYLES.replace('numFmtId="2"', 'numFmtId="14" applyNumberFormat="1"')
    data = book(GOOD_ROWS.replace('r="B2"', 'r="B2" s="0"'), styles=styles)
    page = openpyxl.load_workbook(io.BytesIO(annotate(data, [one_column("Curves", 1)]).data))["Curves"]
    assert page["C2"].value == 60
    assert page["C2"].number_format == "General"


@pytest.mark.parametrize(
    ("name", "reason"),
    [
        ("_xmlsignatures/origin.sigs", "digital signature"),
        ("xl/revisions/revisionHeaders.xml", "shared workbook"),
    ],
)
def test_signed_and_shared_workbooks_are_not_edited(name, reason):
    data = zipped(parts_of(simple_workbook(TABLE)) | {name: b"<x/>"})
    assert reason in can_annotate(data)
    with pytest.raises(FileError, match=reason):
        annotate(data, [one_column("Curves", 1)])


def test_strict_workbook_is_read_and_not_edited():
    strict = {
        MAIN: "http://purl.oclc.org/ooxml/spreadsheetml/main",
        OFFICE: "http://purl.oclc.org/ooxml/officeDocument/relationships",
    }
    parts = {}
    for name, content in book_parts({"Curves": sheet(GOOD_ROWS)}).items():
        for old, new in strict.items():
            content = content.replace(old, new)
        parts[name] = content.encode()
    data = zipped(parts)
    assert open_workbook(data, "a").sheets[0].rows[1] == ["C1", 400.0]
    assert "strict" in can_annotate(data)


@pytest.mark.parametrize(("data", "reason"), [(b"a;b\n1;2\n", "values only")])
def test_other_kinds_are_not_edited(data, reason):
    assert reason in can_annotate(data)
    with pytest.raises(FileError, match=reason):
        annotate(data, [])


def test_plain_workbook_can_be_annotated():
    assert can_annotate(simple_workbook(TABLE)) is None


def test_unknown_sheet_is_refused_with_the_names_there_are():
    with pytest.raises(FileError, match="no sheet 'Other' to annotate; it has Curves"):
        annotate(simple_workbook(TABLE), [one_column("Other", 1)])


def test_no_room_is_refused():
    data = book('<row r="1"><c r="XFD1"><v>1</v></c></row>')
    with pytest.raises(FileError, match="no room"):
        annotate(data, [one_column("Curves", 1)])


def test_nothing_to_add_changes_nothing():
    data = simple_workbook(TABLE)
    assert changed_parts(data, annotate(data, []).data) == set()


def test_absolute_and_odd_relationship_targets():
    parts = book_parts({"Curves": sheet(GOOD_ROWS)})
    name = "xl/_rels/workbook.xml.rels"
    parts[name] = str(parts[name]).replace('Target="worksheets', 'Target="/XL/worksheets')
    data = zipped({key: _bytes(content) for key, content in parts.items()})
    assert '<c r="C2"><v>60</v></c>' in sheet_of(annotate(data, [one_column("Curves", 1)]).data)


def test_rows_out_of_order_are_not_edited():
    data = book('<row r="2"><c r="A2"><v>2</v></c></row><row r="1"><c r="A1"><v>1</v></c></row>')
    assert open_workbook(data, "a").sheets[0].rows == [[1.0], [2.0]]
    with pytest.raises(FileError, match="not in order"):
        annotate(data, [one_column("Curves", 1)])


@pytest.mark.parametrize("way", ["sizes behind the content", "64-bit sizes", "stored"])
def test_other_ways_to_write_the_archive(way):
    """Streaming writers put sizes behind the content, some state 64-bit sizes, some do not compress."""

    class Unseekable(io.BytesIO):
        def seekable(self):
            return False

        def seek(self, *_):
            raise io.UnsupportedOperation

    out = Unseekable() if way.startswith("sizes") else io.BytesIO()
    method = zipfile.ZIP_STORED if way == "stored" else zipfile.ZIP_DEFLATED
    with zipfile.ZipFile(out, "w", method) as archive:
        for name, content in parts_of(simple_workbook(TABLE)).items():
            with archive.open(name, "w", force_zip64=way.startswith("64")) as member:
                member.write(content)
    data = out.getvalue()
    assert open_workbook(data, "a").sheets[0].rows[1] == ["C1", 400.0]
    result = annotate(data, [one_column("Curves", 1)])
    assert values(result.data)[1] == ["C1", 400, 60]
    assert "xl/theme/theme1.xml" not in changed_parts(data, result.data)
