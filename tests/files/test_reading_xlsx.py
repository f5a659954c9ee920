"""Reading xlsx: kinds of cells, formats, hidden and merged; values against independent readers."""

import datetime
import io
import math

import openpyxl
import pytest
import python_calamine
import xlsxwriter
from hostile import HEAD, MAIN, book
from hypothesis import given, settings
from hypothesis import strategies as st
from parts import simple_workbook
from rich import rich_workbook

from cant.files.grid import CellError, CellRange, Uncalculated
from cant.files.open import open_workbook

TEXT = st.text(st.characters(codec="utf-8", exclude_categories=["Cs"]), max_size=12)
VALUE = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(-(10**9), 10**9),
    st.floats(allow_nan=False, allow_infinity=False, width=32),
    TEXT,
    st.sampled_from(["=1+1", "_x0041_", "_x", "a&b<c>\"'", " leading", "ß𝔘", "]]>"]),
)


def read(data):
    return open_workbook(data, "book.xlsx").sheets[0]


@settings(max_examples=60, deadline=None)
@given(st.lists(st.lists(VALUE, max_size=6), max_size=8))
def test_values_come_back_as_written(rows):
    """Round trip through XlsxWriter, an independent writer."""
    out = io.BytesIO()
    with xlsxwriter.Workbook(out) as made:
        page = made.add_worksheet()
        for number, row in enumerate(rows):
            for column, value in enumerate(row):
                if isinstance(value, str):
                    page.write_string(number, column, value)
                elif value is not None:
                    page.write(number, column, value)
    sheet = read(out.getvalue())
    for number, row in enumerate(rows, start=1):
        for column, value in enumerate(row):
            _same(sheet.value(number, column), value)


@settings(max_examples=40, deadline=None)
@given(
    st.lists(
        st.lists(
            st.one_of(
                st.none(),
                st.integers(-99999, 99999),
                st.booleans(),
                st.sampled_from(["a", "b c", "ü"]),
            ),
            max_size=6,
        ),
        max_size=8,
    )
)
def test_values_against_openpyxl(rows):
    """Round trip through openpyxl, with its inline notation of the same cells."""
    made = openpyxl.Workbook(write_only=True)
    page = made.create_sheet()
    for row in rows:
        page.append(row)
    out = io.BytesIO()
    made.save(out)
    sheet = read(out.getvalue())
    for number, row in enumerate(rows, start=1):
        for column, value in enumerate(row):
            _same(sheet.value(number, column), value)


def _same(found, value):
    if isinstance(value, str):
        assert found == (value if value and not value.isspace() else None)
    elif isinstance(value, bool) or value is None:
        assert found is value
    else:
        assert type(found) is float
        assert math.isclose(found, value, rel_tol=1e-12, abs_tol=0)


def test_second_opinion_cell_by_cell():
    data = rich_workbook()
    other = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(data))
    compared = 0
    for sheet in open_workbook(data, "rich.xlsx").sheets:
        for number, row in enumerate(other.get_sheet_by_name(sheet.name).to_python(skip_empty_area=False), 1):
            for column, theirs in enumerate(row):
                ours = sheet.value(number, column)
                if isinstance(ours, CellError):
                    assert theirs == ""  # the other reader shows an error as a blank
                elif isinstance(theirs, str) and not theirs.strip():
                    assert ours is None
                else:
                    assert ours == theirs
                compared += 1
    assert compared > 300


def test_kinds_of_cells():
    cells = (
        '<c r="A1" t="e"><v>#DIV/0!</v></c><c r="B1"><f>1/0</f></c><c r="C1"><f>A1*2</f><v>4</v></c>'
        '<c r="D1" t="str"><f>""</f><v></v></c><c r="E1" t="b"><v>1</v></c>'
        '<c r="F1" t="d"><v>2026-03-01</v></c><c r="G1" t="d"><v>2026-03-01T10:30:00</v></c>'
        '<c r="H1" t="e"><f>NA()</f><v>#N/A</v></c><c r="I1"><f t="shared" si="0"/><v>7</v></c>'
        '<c r="J1" t="inlineStr"><is><r><t>a</t></r><rPh><t>no</t></rPh><r><t xml:space="preserve"> b'
        "</t></r></is></c>"
    )
    sheet = read(book(f'<row r="1">{cells}</row>'))
    (row,) = sheet.rows
    assert row == [
        "#DIV/0!", "=1/0", 4.0, None, True, datetime.date(2026, 3, 1),
        datetime.datetime(2026, 3, 1, 10, 30), "#N/A", 7.0, "a b",
    ]  # fmt: skip
    assert isinstance(row[0], CellError)
    assert isinstance(row[1], Uncalculated)
    assert isinstance(row[7], CellError)
    assert set(sheet.formulas) == {(1, 1), (1, 2), (1, 3), (1, 7), (1, 8)}


@pytest.mark.parametrize(
    ("code", "serial", "expected"),
    [
        ("yyyy-mm-dd", 45000, datetime.date(2023, 3, 15)),
        ("d.m.yy h:mm", 45000.5, datetime.datetime(2023, 3, 15, 12)),
        ("h:mm", 0.25, datetime.time(6)),
        ("[h]:mm", 1.25, 1.25),
        ("[$-407]d. mmmm yyyy", 61.0, datetime.date(1900, 3, 1)),
        ("dd/mm/yyyy;@", 1.0, datetime.date(1900, 1, 1)),
        ('0.0 "mm/d"', 12.5, 12.5),
        ("0+000", 12345.0, 12345.0),
        ("[Red]0.00", 3.0, 3.0),
        ("General", 45000.0, 45000.0),
        ("yyyy", -5.0, -5.0),
        ("yyyy", 1e9, 1e9),
    ],
)
def test_date_formats(code, serial, expected):
    out = io.BytesIO()
    with xlsxwriter.Workbook(out) as made:
        made.add_worksheet().write_number(0, 0, serial, made.add_format({"num_format": code}))
    sheet = read(out.getvalue())
    assert sheet.value(1, 0) == expected
    if code != "General":
        assert sheet.number_formats[1, 0] == code


def test_dates_counted_from_1904():
    out = io.BytesIO()
    with xlsxwriter.Workbook(out, {"date_1904": True}) as made:
        style = made.add_format({"num_format": "yyyy-mm-dd"})
        made.add_worksheet().write_datetime(0, 0, datetime.datetime(2026, 2, 3), style)
    assert read(out.getvalue()).value(1, 0) == datetime.date(2026, 2, 3)


def test_hidden_merged_and_formats():
    sheet = read(rich_workbook())
    assert sheet.merged == [CellRange(1, 0, 1, 6)]
    assert sheet.hidden_rows == {10}
    assert 11 in sheet.hidden_columns
    assert sheet.number_formats[4, 1] == "0.000"
    assert (4, 0) not in sheet.number_formats
    assert len(sheet.number_formats) == sum(1 for _ in sheet.number_formats)
    assert [one.visible for one in open_workbook(rich_workbook(), "a").sheets] == [True, True, True, False]


def test_texts_of_nothing_but_blanks_are_none():
    assert read(simple_workbook([["a", "  ", "\u00a0", "b"]])).rows == [["a", None, None, "b"]]


def test_shared_strings_with_a_prefix_and_runs():
    shared = (
        f'{HEAD}<x:sst xmlns:x="{MAIN}"><x:si><x:t>plain</x:t></x:si><x:si/><x:si><x:r><x:t>ri</x:t></x:r>'
        "<x:r><x:t>ch_x000D_</x:t></x:r></x:si></x:sst>"
    )
    cells = "".join(f'<c r="{name}1" t="s"><v>{n}</v></c>' for n, name in enumerate("ABC"))
    assert read(book(f'<row r="1">{cells}</row>', shared=shared)).rows == [["plain", None, "rich\r"]]


def test_width_of_ragged_rows():
    sheet = read(simple_workbook([["a"], ["b", 1, 2], []]))
    assert sheet.width == 3
    assert sheet.value(9, 9) is None
    assert sheet.next_column == 3
