"""The user's workbook with the plan in it: his cells stay, a second run equals the first."""

from __future__ import annotations

import io
from typing import Any

import pytest
from canonical import csv, tables, xlsx
from openpyxl import Workbook, load_workbook

from cant.service import AnnotatedFile, PlannedLine, annotated_workbook, limits_named, make_plan, read_curves
from cant.writing.book.status import FILLS


def annotated(data: bytes, file: str = "line.xlsx") -> tuple[PlannedLine, AnnotatedFile]:
    planned = make_plan(read_curves(data, file))
    return planned, annotated_workbook(planned, data, file)


def cells(data: bytes, sheet: str) -> list[tuple[Any, ...]]:
    return list(load_workbook(io.BytesIO(data))[sheet].iter_rows(values_only=True))


def test_every_cell_of_the_user_stays() -> None:
    data = xlsx(tables())
    _, result = annotated(data)
    for name, rows in tables().items():
        width = len(rows[0])
        found = [tuple(row[:width]) for row in cells(result.data, name)]
        assert found == [tuple(row) for row in rows]
    assert (result.notes, result.suffix) == ([], ".xlsx")


def test_a_second_run_replaces_the_first() -> None:
    data = xlsx(tables())
    planned, first = annotated(data)
    again, second = annotated(first.data)
    assert (
        load_workbook(io.BytesIO(second.data)).sheetnames == load_workbook(io.BytesIO(first.data)).sheetnames
    )
    assert cells(second.data, "Curves") == cells(first.data, "Curves")
    assert [r["recommended_cant_mm"] for r in again.records()] == [
        r["recommended_cant_mm"] for r in planned.records()
    ]


def test_a_sheet_of_the_users_that_bears_our_name_stays() -> None:
    sheets = tables()
    sheets["Plan"] = [["my own plan"]]
    _, result = annotated(xlsx(sheets))
    names = load_workbook(io.BytesIO(result.data)).sheetnames
    assert len(names) == len(set(names))
    assert cells(result.data, "Plan") == [("my own plan",)]
    assert any(name.startswith("Plan") and name not in ("Plan", "Plan summary") for name in names)


def test_status_and_refused_values_are_marked() -> None:
    sheets = tables()
    sheets["Curves"][2][5] = "sharp"
    _, result = annotated(xlsx(sheets))
    sheet = load_workbook(io.BytesIO(result.data))["Curves"]
    head = [cell.value for cell in sheet[1]]
    status, reason = sheet.cell(3, head.index("Status") + 1), sheet.cell(3, head.index("Reason") + 1)
    assert status.value == "not assessed"
    assert str(status.fill.fgColor.rgb).endswith(FILLS["not assessed"])
    assert "sharp" in str(reason.value)
    comment = sheet.cell(3, 6).comment
    assert comment is not None
    assert "sharp" in comment.text
    assert sheet.cell(3, 6).value == "sharp"


def test_text_of_the_user_never_becomes_a_formula() -> None:
    sheets = tables()
    data = xlsx(sheets)
    book = load_workbook(io.BytesIO(data))
    for row, text in ((2, "=1+1"), (3, "+A1"), (4, "@x"), (5, "-1 b")):
        cell = book["Curves"].cell(row, 3)
        cell.value = text
        cell.data_type = "s"
    stream = io.BytesIO()
    book.save(stream)
    planned, result = annotated(stream.getvalue())
    assert [record["curve"] for record in planned.records()] == ["=1+1", "+A1", "@x", "-1 b"]
    written = load_workbook(io.BytesIO(result.data))
    for name in ("Curves", "Plan", "Figures"):
        for cells_ in written[name].iter_rows():
            assert all(cell.data_type != "f" for cell in cells_)


def test_csv_gets_a_new_workbook_and_is_told_so() -> None:
    sheets = tables()
    data = csv(sheets["Curves"])
    reading = read_curves(
        data, "line.csv", traffic=(csv(sheets["Traffic"]), "t.csv"), limits=limits_named("typical")
    )
    planned = make_plan(reading)
    result = annotated_workbook(planned, data, "line.csv")
    assert any("new workbook" in note for note in result.notes)
    book: Workbook = load_workbook(io.BytesIO(result.data))
    rows = list(book.worksheets[0].iter_rows(values_only=True))
    assert rows[0][:13] == tuple(sheets["Curves"][0])
    at = rows[0].index("Proposed cant (mm)")
    expected = [record["recommended_cant_mm"] for record in planned.records()]
    assert [row[at] for row in rows[1:]] == pytest.approx(expected)


def test_curve_sheets_of_two_tracks_each_get_their_columns() -> None:
    sheets = tables()
    head, *rows = sheets.pop("Curves")
    both = {"Up": [head, *rows[:2]], "Down": [head, *rows[2:]], **sheets}
    planned, result = annotated(xlsx(both))
    for name in ("Up", "Down"):
        found = cells(result.data, name)
        at = found[0].index("Proposed cant (mm)")
        own = [r["recommended_cant_mm"] for r in planned.records() if r["sheet"] == name]
        assert [row[at] for row in found[1:]] == own


def test_added_columns_speak_in_the_units_of_the_sheet() -> None:
    """A list in centimetres gets its cants in centimetres, whatever the plan's own sheets show."""
    sheets = tables()
    at = next(i for i, head in enumerate(sheets["Curves"][0]) if str(head).startswith("Cant"))
    sheets["Curves"][0][at] = "Cant (cm)"
    for row in sheets["Curves"][1:]:
        row[at] = None if row[at] in (None, "") else row[at] / 10
    planned, result = annotated(xlsx(sheets))
    found = cells(result.data, "Curves")
    column = found[0].index("Proposed cant (cm)")
    expected = [record["recommended_cant_mm"] / 10 for record in planned.records()]
    assert [row[column] for row in found[1:]] == pytest.approx(expected)
    assert "Proposed cant (mm)" in cells(result.data, "Plan")[0]


def test_an_edited_cant_outside_its_bounds_shows() -> None:
    data = xlsx(tables())
    _, result = annotated(data)
    sheet = load_workbook(io.BytesIO(result.data))["Curves"]
    head = [cell.value for cell in sheet[1]]
    letters = {name: sheet.cell(1, i + 1).column_letter for i, name in enumerate(head)}
    cant, low, high = (letters[f"{name} (mm)"] for name in ("Proposed cant", "Lower bound", "Upper bound"))
    rules = [
        str(rule.formula[0])
        for area in sheet.conditional_formatting
        for rule in area.rules
        if area.cells.ranges and str(next(iter(area.cells.ranges))).startswith(cant)
    ]
    assert any(f"${cant}2<${low}2" in rule and f"${cant}2>${high}2" in rule for rule in rules)


def test_a_list_without_any_usable_row_still_gets_its_workbook() -> None:
    sheets = tables()
    at = next(i for i, head in enumerate(sheets["Curves"][0]) if str(head).startswith("Radius"))
    for row in sheets["Curves"][1:]:
        row[at] = "sharp"
    planned, result = annotated(xlsx(sheets))
    assert list(planned.plan.outcome.planned) == [False] * (len(sheets["Curves"]) - 1)
    book = load_workbook(io.BytesIO(result.data))
    assert book["Calculation"].max_row == 4
    assert book["Not assessed"].max_row > len(sheets["Curves"]) - 1
