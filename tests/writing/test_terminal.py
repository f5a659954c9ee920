"""What the command prints about a plan."""

from __future__ import annotations

from pathlib import Path

import pytest

from cant.limit_sets import load, names
from cant.service import PlannedLine, make_plan, read_curves
from cant.writing.cautions import CAUTIONS, UNVERIFIED
from cant.writing.terminal import (
    WIDTH,
    limit_set_text,
    limit_sets_text,
    not_assessed_line,
    rejected_line,
    summary,
    text_table,
)

SAMPLE = Path(__file__).resolve().parents[2] / "sample_data" / "dunmarrow_keldrith.xlsx"


@pytest.fixture(scope="module")
def line() -> PlannedLine:
    return make_plan(read_curves(SAMPLE.read_bytes(), "line.xlsx"))


def test_summary_counts_names_warns_and_says_what_was_written(line: PlannedLine) -> None:
    text = summary(line, ["out.xlsx"], ["something to know"])
    counts = line.plan.counts()
    for status, number in counts.items():
        assert any(row.split()[:1] == [str(number)] and status in row for row in text.splitlines()) == bool(
            number
        )
    assert "Dunmarrow-Keldrith 1 112: restrict." in text
    assert "row 14: rejected." in text
    flat = " ".join(text.split())
    for caution in CAUTIONS:
        assert caution in flat
    assert UNVERIFIED not in flat
    assert "something to know" in text
    assert text.endswith("out.xlsx")
    assert all(len(row) <= WIDTH for row in text.splitlines())


def test_rows_not_assessed_are_counted_once_each(line: PlannedLine) -> None:
    assert not_assessed_line(line) == "cant: 4 rows were not assessed; the outputs name each with its reason"
    assert rejected_line(line.reading) == "cant: 2 rows cannot be assessed as they stand"


def test_unverified_limits_are_called_so(line: PlannedLine) -> None:
    planned = make_plan(line.reading, limits=load("typical"))
    text = " ".join(summary(planned, []).split())
    assert UNVERIFIED in text
    assert "(UNVERIFIED)" in text


@pytest.mark.parametrize("name", names())
def test_a_limit_set_is_printed_whole(name: str) -> None:
    limits = load(name)
    text = limit_set_text(limits)
    assert limits.title in " ".join(text.split())
    assert (UNVERIFIED in text) != limits.verified
    for row in limits.rows:
        assert row.quantity in text
        assert row.clause in text


def test_the_list_names_each_set() -> None:
    text = limit_sets_text()
    for name in names():
        assert name in text.splitlines() or f"{name}  UNVERIFIED" in text.splitlines()


def test_a_table_keeps_its_columns() -> None:
    assert text_table(["A", "Long"], [["1", "x"], ["222", ""]]) == "A    Long\n---  ----\n1    x\n222"
    assert text_table(["A"], []) == "A\n-"
