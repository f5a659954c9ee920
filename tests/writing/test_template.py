"""The template: what it asks for is what the reader knows, and its example rows are ignored when left in."""

from __future__ import annotations

import io

import openpyxl
import pytest

from cant.errors import InputError
from cant.files.open import open_workbook
from cant.reading import read_workbook
from cant.reading.columns import columns_of
from cant.writing.template import heading, template_workbook


def filled(examples_left: bool) -> bytes:
    """Give a template with one curve, two classes and one limit filled in below the examples or over them."""
    book = openpyxl.load_workbook(io.BytesIO(template_workbook()))
    row = 3 if examples_left else 2
    values = {
        "Curves": {
            "Line": "A",
            "Track": "1",
            "Curve": "7",
            "Radius": 800,
            "Cant": 60,
            "Speed": 100,
            "Hand": "R",
        },
        "Traffic": {"Class": "Fast", "Category": "passenger", "Speed": 120},
        "Limits": {"Quantity": "cant", "Normal": 150, "Unit": "mm"},
    }
    for name, cells in values.items():
        sheet = book[name]
        at = {str(c.value).split(" (")[0]: c.column for c in sheet[1] if c.value}
        if not examples_left:
            sheet.delete_rows(2)
        for label, value in cells.items():
            sheet.cell(row=row, column=at[label], value=value)
    if not examples_left:
        book["Turnouts"].delete_rows(2)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


@pytest.mark.parametrize("examples_left", [True, False])
def test_a_filled_template_reads_as_filled(examples_left: bool) -> None:
    reading = read_workbook(open_workbook(filled(examples_left), "filled.xlsx"))
    assert [reading.curves.curve, reading.curves.radius_m.tolist()] == [["7"], [800.0]]
    assert reading.traffic is not None
    assert reading.traffic.class_names == ["Fast"]
    assert reading.limits is not None
    assert [row.quantity for row in reading.limits.rows] == ["cant"]
    assert not reading.rejected
    assert not reading.questions
    assert not reading.turnouts
    assert all(c.confidence == "certain" for c in reading.columns)


def test_an_empty_template_is_refused_as_empty() -> None:
    with pytest.raises(InputError, match="empty"):
        read_workbook(open_workbook(template_workbook(), "template.xlsx"))


def test_every_heading_is_canonical_and_explained() -> None:
    book = openpyxl.load_workbook(io.BytesIO(template_workbook()))
    for table in ("curves", "traffic", "limits", "turnouts"):
        sheet = book[table.capitalize()]
        infos = columns_of(table)
        assert [c.value for c in sheet[1]][: len(infos)] == [heading(info) for info in infos]
        assert all(cell.comment is not None for cell in sheet[1])


def test_drop_downs_offer_what_the_reader_takes() -> None:
    book = openpyxl.load_workbook(io.BytesIO(template_workbook()))
    rules = {
        str(r.sqref).split(":")[0]: str(r.formula1) for r in book["Curves"].data_validations.dataValidation
    }
    assert '"L,R"' in rules.values()
    assert any("bloss" in formula for formula in rules.values())
    limits = [str(r.formula1) for r in book["Limits"].data_validations.dataValidation]
    assert any("abrupt change of cant deficiency" in formula for formula in limits)
    assert all(len(formula) <= 257 for formula in (*limits, *rules.values())), (
        "a spreadsheet takes 255 characters"
    )
