"""Our own sheets say what the records say, in the units in which the plan is shown."""

from __future__ import annotations

import io
from datetime import date
from pathlib import Path
from typing import Any
from zipfile import ZipFile

import pytest
from book_tools import put_together
from openpyxl import load_workbook
from openpyxl.workbook import Workbook

from cant.model.limits import QUANTITIES
from cant.service import PlannedLine, make_plan, read_curves
from cant.version import __version__
from cant.writing.cautions import CAUTIONS
from cant.writing.plan_sheets import PlanSheets, footer_of
from cant.writing.sheets import NewSheets

SAMPLES = Path(__file__).resolve().parents[2] / "sample_data"
DAY = date(2031, 5, 4)
Rows = list[dict[str, Any]]


def sheets_of(planned: PlannedLine) -> Workbook:
    with NewSheets(footer_of(planned)) as book:
        sheets = PlanSheets(
            book, planned, lambda wanted: f"{wanted} (2)" if wanted == "Plan" else wanted, DAY
        )
        for record in planned.records():
            sheets.add(record)
        sheets.finish()
        data = put_together(book)
    return load_workbook(io.BytesIO(data), data_only=True)


def rows_of(book: Workbook, name: str, head: int = 1, first: int | None = None) -> Rows:
    rows = list(book[name].iter_rows(values_only=True))
    return [dict(zip(rows[head - 1], row, strict=True)) for row in rows[(first or head + 1) - 1 :]]


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
    refused = [row.problem for row in planned.reading.rejected]
    assert [row["Problem"] for row in rejected][: len(refused)] == refused
    gaps = [record["reason"] for record in records if record["status"] == "not assessed"]
    assert [row["Problem"] for row in rejected][len(refused) :] == (gaps if refused or gaps else [None])


def test_what_was_used_is_on_sheets_of_its_own(planned: PlannedLine, book: Workbook) -> None:
    limits = rows_of(book, "Limits used", 2, 5)
    assert sorted(row["Row"] for row in limits) == list(range(1, len(planned.plan.limits.rows) + 1))
    for row in limits:
        stated = planned.plan.limits.rows[int(row["Row"]) - 1]
        assert (row["Quantity"], row["Normal"], row["Exceptional"], row["Unit"]) == (
            stated.quantity,
            stated.normal,
            stated.exceptional,
            stated.unit,
        )
        assert (row["Clause"] or "") == stated.clause
    assert {row["Quantity"] for row in limits} <= set(QUANTITIES)
    assert len(rows_of(book, "Traffic used", 2, 5)) == len(planned.plan.traffic.rows)
    inputs = {row["Input"]: row["Value"] for row in rows_of(book, "Inputs", 2)}
    assert inputs["Tiers of limits allowed"] == "normal, exceptional"
    assert inputs["Equilibrium constant"] == pytest.approx(planned.plan.settings.constant)
    assert inputs["Rail spacing"] == pytest.approx(planned.plan.settings.spacing_mm)
    assert len(rows_of(book, "How it was read", 2)) >= len(planned.reading.columns)


def test_the_summary_counts_warns_and_is_signed(planned: PlannedLine, book: Workbook) -> None:
    rows = list(book["Plan summary"].iter_rows(values_only=True))
    cells = [cell for row in rows for cell in row if cell]
    assert planned.reading.sha256 in cells
    for caution in CAUTIONS:
        assert caution in cells
    table = {row[0]: row[1] for row in rows if row[0]}
    for status, number in planned.plan.counts().items():
        assert table[status] == number
    assert {"Prepared", "Checked", "Approved"} <= set(table)
    assert DAY.isoformat() in table["Issue and date"]
    assert __version__ in table["Program"]
    assert book["Plan summary"].sheet_properties.pageSetUpPr.fitToPage
    page = book["Plan summary"].page_setup
    assert {page.fitToWidth, page.fitToHeight} <= {None, 1}


def test_each_exception_has_a_row_to_sign(planned: PlannedLine, book: Workbook) -> None:
    rows = rows_of(book, "Exceptions", 2)
    passed = [(record, limit) for record in planned.records() for limit in record["limits_passed"]]
    assert len(passed) > 0
    assert len(rows) == len(passed)
    for row, (record, limit) in zip(rows, passed, strict=True):
        assert (row["Curve"], row["Limit passed"], row["Clause"]) == (
            record["curve"],
            limit["quantity"],
            limit["clause"],
        )
        assert row["Value"] > row["Normal limit"]
        assert row["Reason"] == record["reason"]
        assert row["Decided by (name)"] is None
        assert row["Date"] is None


def test_each_speed_that_gives_way_has_a_row(planned: PlannedLine, book: Workbook) -> None:
    speed = planned.display["speed"]
    slower = [
        (record["curve"], entry["class"], entry["run_speed_kmh"])
        for record in planned.records()
        for entry in record["classes"]
        if entry["run_speed_kmh"] < entry["speed_kmh"] - 1e-6
    ]
    rows = rows_of(book, "Speed changes", 2)
    found = [
        (row["Curve"], row["Class"], row[f"Speed to set ({speed.unit})"]) for row in rows if row["Class"]
    ]
    assert [one[:2] for one in found] == [one[:2] for one in slower]
    assert [one[2] for one in found] == pytest.approx([speed.value(one[2]) for one in slower])


def test_the_lifting_schedule_lifts_and_never_lowers(planned: PlannedLine, book: Workbook) -> None:
    rows = rows_of(book, "Lifting schedule", 2, 5)
    changed = [
        record
        for record in planned.records()
        if record["existing_cant_mm"] not in (None, record["recommended_cant_mm"])
        and record["recommended_cant_mm"] is not None
    ]
    assert [row["Curve"] for row in rows] == [record["curve"] for record in changed]
    cant, spacing = planned.display["cant"], planned.plan.settings.spacing_mm
    for row, record in zip(rows, changed, strict=True):
        change = record["recommended_cant_mm"] - record["existing_cant_mm"]
        assert row["Lift"] == pytest.approx(cant.value(abs(change)))
        outer = "right" if record["hand"] == "L" else "left"
        inner = "left" if record["hand"] == "L" else "right"
        assert row["Rail to lift"] == (f"outer ({outer})" if change > 0 else f"inner ({inner})")
        assert row["Order of work"].startswith("Speed before track") == (change < 0)
        assert row["Shift at the contact wire"] == pytest.approx(cant.value(5000.0 * change / spacing))


def test_ramp_values_run_from_nothing_to_the_cant(planned: PlannedLine, book: Workbook) -> None:
    """The ends of each ramp hold the cants of the plan; the steps between are those of the shape."""
    cant = planned.display["cant exact"]
    rows = rows_of(book, "Ramp values", 2)
    assert len(rows) > 20
    records = {(record["track"], record["curve"]): record for record in planned.records()}
    groups: dict[tuple[Any, ...], Rows] = {}
    for row in rows:
        groups.setdefault((row["Track"], row["Curve"], row["End"]), []).append(row)
    for (track, curve, _), steps in groups.items():
        record = records[str(track), str(curve)]
        set_to = [step[f"Cant to set ({cant.unit})"] for step in steps]
        assert (
            cant.value(record["recommended_cant_mm"])
            == pytest.approx(max(set_to) if record["recommended_cant_mm"] >= 0 else min(set_to))
            or record["shares_transition_with_next"]
        )
        for step in steps:
            old, new = step[f"Cant today ({cant.unit})"], step[f"Cant to set ({cant.unit})"]
            if old is not None:
                assert step[f"Lift ({cant.unit})"] == pytest.approx(abs(new - old))


def test_charts_hold_their_data(planned: PlannedLine) -> None:
    with NewSheets() as made:
        sheets = PlanSheets(made, planned, lambda wanted: wanted, DAY)
        for record in planned.records():
            sheets.add(record)
        sheets.finish()
        data = put_together(made)
    with ZipFile(io.BytesIO(data)) as package:
        charts = [package.read(name).decode() for name in package.namelist() if "charts/chart" in name]
    assert len(charts) % 3 == 0
    assert len(charts) > 0
    record = next(r for r in planned.records() if r["recommended_cant_mm"] is not None)
    assert any(f"<c:v>{record['curve']}</c:v>" in chart for chart in charts)
    assert all("<c:numCache>" in chart for chart in charts)


def test_sheets_print_on_pages_with_their_header(planned: PlannedLine, book: Workbook) -> None:
    for name in ("Plan (2)", "Figures", "Transitions", "Findings"):
        sheet = book[name]
        assert sheet.print_title_rows == "$1:$1"
        assert sheet.page_setup.orientation == "landscape"
        assert sheet.freeze_panes in ("A2", "F2", "D2")
    for name, titles in (("Calculation", "$2:$4"), ("Exceptions", "$2:$2"), ("Limits used", "$2:$4")):
        assert book[name].print_title_rows == titles
    for page in book.worksheets:
        footer = page.oddFooter
        assert footer is not None
        assert planned.reading.sha256[:16] in str(footer.left.text)
        assert "Page" in str(footer.right.text)


def test_of_a_long_list_the_figures_show_what_needs_a_decision(
    planned: PlannedLine, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("cant.writing.plan_sheets.FULL_FIGURES", 3)
    book = sheets_of(planned)
    status = {record["curve"]: record["status"] for record in planned.records()}
    shown = {row["Curve"] for row in rows_of(book, "Figures", 2)}
    assert shown == {name for name, word in status.items() if word not in ("kept", "change", "not assessed")}
    assert len(rows_of(book, "Plan (2)")) == len(status)
    assert "more than 3 curves" not in str(book["Plan (2)"]["A1"].value)
    assert "more than 5000" not in str(book["Figures"]["A1"].value)
    assert "more than 3 curves" in str(book["Figures"]["A1"].value)


def test_of_a_very_long_list_the_plan_shows_what_needs_a_decision(
    planned: PlannedLine, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("cant.writing.plan_sheets.FULL_PLAN", 3)
    book = sheets_of(planned)
    grave = [record["curve"] for record in planned.records() if record["status"] not in ("kept", "change")]
    assert [row["Curve"] for row in rows_of(book, "Plan (2)", 2)] == grave[:3]
    assert "more than 3 curves" in str(book["Plan (2)"]["A1"].value)
