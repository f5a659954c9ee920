"""Separated text: encodings, separators, and which cells become numbers."""

import csv
import io

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cant.errors import FileError
from cant.files.grid import CellError
from cant.files.open import open_workbook
from cant.files.text import csv_cell
from cant.reading.text import shown

ROWS = [["Curve", "Radius", "Cant"], ["C1", 400.0, 60.0], ["C2", 512.5, 45.0]]


def rows_of(data):
    return open_workbook(data, "list.csv").sheets[0].rows


@pytest.mark.parametrize("separator", [",", ";", "\t", "|"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "cp1252"])
def test_separators_and_encodings(separator, encoding):
    text = "\r\n".join(separator.join(map(str, row)) for row in ROWS)
    assert rows_of(text.encode(encoding)) == ROWS


def test_windows_code_page_is_told():
    workbook = open_workbook("Kurve;Überhöhung\nC1;60\n".encode("cp1252"), "list.csv")
    assert workbook.sheets[0].rows[0] == ["Kurve", "Überhöhung"]
    assert "Windows code page 1252" in workbook.notes[0]
    assert "semicolon" in workbook.notes[0]
    assert workbook.kind == "csv"


@pytest.mark.parametrize(
    ("cell", "expected"),
    [
        ("400", 400.0), ("-1.5", -1.5), ("0.25", 0.25), ("007", "007"), ("1e5", "1e5"), ("+5", "+5"),
        ("1 200", "1 200"), ("nan", "nan"), ("inf", "inf"), ("12+345", "12+345"), ("1_000", "1_000"),
        ("=1+1", "=1+1"), ("  ", None), ("1234567890123456", "1234567890123456"), ("٣", "٣"), (" 5", " 5"),
    ],
)  # fmt: skip
def test_which_cells_are_numbers(cell, expected):
    (_, row) = rows_of(f"a;b\nx;{cell}\n".encode())
    assert (row[1] if len(row) > 1 else None) == expected


def test_decimal_comma_leaves_points_to_the_reading_room():
    workbook = open_workbook(b"a;b;c\n1,5;1.250;300\n", "list.csv")
    assert workbook.sheets[0].rows[1] == ["1,5", "1.250", 300.0]
    assert "decimal comma" in workbook.notes[1]


def test_errors_are_errors():
    value = rows_of(b"a,b\n1,#DIV/0!\n")[1][1]
    assert isinstance(value, CellError)


def test_separator_is_chosen_by_even_rows_not_by_one_line():
    text = "Curve;Remark\nC1;bridge, steel, old\nC2;none, but see C1\nC3;a, b, c, d\n"
    assert rows_of(text.encode())[1] == ["C1", "bridge, steel, old"]


def test_title_lines_do_not_mislead():
    text = "Vale line, up track\n\nCurve;Radius;Cant\nC1;400;60\nC2;500;50\n"
    assert rows_of(text.encode())[3] == ["C1", 400.0, 60.0]


def test_declared_separator():
    assert rows_of(b"sep=;\na,b;c\n") == [["a,b", "c"]]


def test_quotes_and_line_breaks_in_cells():
    assert rows_of(b'a,b\n"x, ""y""\nz",1\n') == [["a", "b"], ['x, "y"\nz', 1.0]]


def test_one_column():
    assert rows_of(b"Radius\n400\n500\n") == [["Radius"], [400.0], [500.0]]


@settings(max_examples=60, deadline=None)
@given(
    st.lists(
        st.lists(
            st.text(st.characters(codec="utf-8", exclude_categories=["C", "Z"]), min_size=1, max_size=8),
            min_size=2,
            max_size=5,
        ),
        min_size=1,
        max_size=6,
    ),
    st.sampled_from([",", ";", "\t"]),
)
def test_texts_come_back(rows, separator):
    """Round trip through the standard library's writer, everything quoted; separator declared."""
    out = io.StringIO()
    out.write(f"sep={separator}\r\n")
    csv.writer(out, delimiter=separator, quoting=csv.QUOTE_ALL).writerows(rows)
    found = rows_of(out.getvalue().encode("utf-8-sig"))
    assert [[_text(value) for value in row] for row in found] == [
        [_text(value) for value in row] for row in rows
    ]


def _text(value):
    if isinstance(value, float):
        return value
    try:
        return float(value) if value.isascii() and "_" not in value and value.lower() == value else value
    except ValueError:
        return value


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("=1+1", "'=1+1"), ("+cmd", "'+cmd"), ("@SUM(A1)", "'@SUM(A1)"), ("\tx", "'\tx"), (" =1", "' =1"),
        ("-2", "-2"), ("+3.5", "+3.5"), ("-1,5", "-1,5"), ("-2+3", "'-2+3"), ("plain", "plain"), ("", ""),
    ],
)  # fmt: skip
def test_csv_cells_are_no_formulas(text, expected):
    assert csv_cell(text) == expected


def test_only_blanks_is_said_to_be_empty():
    with pytest.raises(FileError, match="empty"):
        open_workbook(b" \r\n\t\n", "a.csv")
    with pytest.raises(FileError, match="no values"):
        open_workbook(b";;;\n;;;\n", "a.csv")


def test_a_zero_at_the_end_of_a_number_is_not_lost():
    rows = open_workbook(b"Curve,Radius\n2.10,600\n2.1,700\n", "list.csv").sheets[0].rows
    assert rows[1] == [2.1, 600.0]
    assert [shown(row[0]) for row in rows[1:]] == ["2.10", "2.1"]
