"""Our own sheets say what the records say, in the units in which the plan is shown."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

import pytest
from openpyxl import load_workbook
from openpyxl.workbook import Workbook

from cant.model.limits import QUANTITIES
from cant.service import PlannedLine, make_plan, read_curves
from cant.writing.cautions import CAUTIONS
from cant.writing.plan_sheets import PlanSheets
from cant.writing.sheets import NewSheets

SAMPLES = Path(__file__).resolve().parents[2] / "sample_data"
Rows = list[dict[str, Any]]


def sheets_of(planned: PlannedLine) -> Workbook:
    with NewSheets() as book:
        sheets = PlanSheets(book, planned, lambda wanted: f"{wanted} (2)" if wanted == "Plan" else wanted)
        for record in planned.records():
            sheets.add(record)
        sheets.finish()
    return load_workbook(io.BytesIO(book.data))


def rows_of(book: Workbook, name: str) -> Rows:
    rows = list(book[name].iter_rows(values_only=True))
    return [dict(zip(rows[0], row, strict=True)) for row in rows[1:]]


@pytest.fixture(scope="module", params=["dunmarrow_keldrith.xlsx", "tarrow_us_units.xlsx"])
def planned(request: pytest.FixtureRequest) -> PlannedLine:
    path = SAMPLES / request.param
    return make_plan(read_curves(path.read_bytes(), path.name))


@pytest.fixture(scope="module")
def book(planned: PlannedLine) -> Workbook:
    return sheets_of(planned)


def test_the_plan_sheet_has_a_row_a_curve(planned: PlannedLine, book: Workbook) -> None:
    cant, speed = planned.display["cant"], planned.display["speed"]
    rows = rows_of(book, "Plan (2)")
    records = list(planned.records())
    assert len(rows) == len(records)
    for row, record in zip(rows, records, strict=True):
        assert row["Curve"] == record["curve"]
        assert row["Status"] == record["status"]
        assert row["Reason"] == record["reason"]
        assert row[f"Proposed cant ({cant.unit})"] == pytest.approx(cant.value(record["recommended_cant_mm"]))
        for entry in record["classes"]:
            heading = f"{entry['class']}: permissible speed ({speed.unit})"
            assert row[heading] == pytest.approx(speed.value(entry["permissible_speed_kmh"]))


def test_the_figures_sheet_has_a_row_a_class_today_and_proposed(planned: PlannedLine, book: Workbook) -> None:
    rows = rows_of(book, "Figures")
    rate = planned.display["rate"]
    expected = [
        (record, which, entry)
        for record in planned.records()
        for which, entries in (("proposed", record["classes"]), ("today", record["today"]["classes"]))
        for entry in entries
    ]
    assert len(rows) == len(expected)
    for row, (record, which, entry) in zip(rows, expected, strict=True):
        assert (row["Curve"], row["Cant"], row["Class"]) == (record["curve"], which, entry["class"])
        assert row["Felt acceleration (m/s2)"] == pytest.approx(entry["felt_acceleration_ms2"])
        if which == "proposed":
            end = next(e for e in record["transitions"]["in"]["classes"] if e["class"] == entry["class"])
            found = row[f"Rate of change of cant, in ({rate.unit})"]
            assert found == pytest.approx(rate.value(end["rate_of_change_of_cant_mm_per_s"]))


def test_ends_findings_and_rejected_rows(planned: PlannedLine, book: Workbook) -> None:
    records = list(planned.records())
    assert len(rows_of(book, "Transitions")) == sum(len(record["transitions"]) for record in records)
    findings = sum(len(record["findings"]) for record in records) + len(planned.explanation.plan_findings)
    assert len(rows_of(book, "Findings")) == findings
    rejected = rows_of(book, "Not assessed")
    assert [row["Problem"] for row in rejected] == [row.problem for row in planned.reading.rejected]


def test_what_was_used_is_on_sheets_of_its_own(planned: PlannedLine, book: Workbook) -> None:
    limits = rows_of(book, "Limits used")
    assert len(limits) == len(planned.plan.limits.rows)
    assert {row["Quantity"] for row in limits} <= set(QUANTITIES)
    assert len(rows_of(book, "Traffic used")) == len(planned.plan.traffic.rows)
    settings = {row["Setting"]: row["Value"] for row in rows_of(book, "Settings used")}
    assert settings["tiers"] == "normal, exceptional"
    assert len(rows_of(book, "How it was read")) >= len(planned.reading.columns)


def test_the_summary_counts_and_warns(planned: PlannedLine, book: Workbook) -> None:
    cells = [cell for row in book["Plan summary"].iter_rows(values_only=True) for cell in row if cell]
    assert planned.reading.sha256 in cells
    for caution in CAUTIONS:
        assert caution in cells
    table = {row[0]: row[1] for row in book["Plan summary"].iter_rows(values_only=True) if row[0]}
    for status, number in planned.plan.counts().items():
        assert table[status] == number
    assert "Approved by / date" in table


def test_sheets_print_on_pages_with_their_header(book: Workbook) -> None:
    for name in ("Plan (2)", "Figures", "Transitions", "Findings"):
        sheet = book[name]
        assert sheet.print_title_rows == "$1:$1"
        assert sheet.page_setup.orientation == "landscape"
        assert sheet.freeze_panes in ("A2", "F2")


def test_of_a_long_list_the_figures_show_what_needs_a_decision(
    planned: PlannedLine, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("cant.writing.plan_sheets.FULL_FIGURES", 3)
    book = sheets_of(planned)
    status = {record["curve"]: record["status"] for record in planned.records()}
    shown = {row["Curve"] for row in rows_of(book, "Figures")}
    assert shown == {name for name, word in status.items() if word not in ("kept", "change", "not assessed")}
    assert len(rows_of(book, "Plan (2)")) == len(status)
    cells = [str(row[0]) for row in book["Plan summary"].iter_rows(values_only=True)]
    assert any("more than 3 curves" in cell for cell in cells)
