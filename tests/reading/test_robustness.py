"""What no list may do: crash the reader, or let one bad cell change what is read in other rows."""

from __future__ import annotations

import random
from datetime import date, datetime, time
from typing import Any

import messy
import messy_far
import messy_hard
import messy_more
import messy_odd
import messy_wide
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from messy import Messy

from cant.errors import CantError
from cant.files.grid import CellError, Sheet, Uncalculated, Value, Workbook
from cant.model.reading import Reading
from cant.reading import read_workbook, reading_document, reading_table

LISTS = [
    *messy.LAYOUTS,
    *messy_more.LAYOUTS,
    *messy_hard.LAYOUTS,
    *messy_wide.LAYOUTS,
    *messy_far.LAYOUTS,
    *messy_odd.LAYOUTS,
]

ODD: list[Value] = [
    None,
    True,
    -1.0,
    0.0,
    1e300,
    float("1e-300"),
    CellError("#N/A"),
    Uncalculated("=A1"),
    date(2026, 5, 12),
    datetime(2026, 1, 2, 3, 4),
    time(1, 2),
    "∞",
    "-",
    "none",
    "12/34",
    "100/80/60",
    "R=",
    "½",
    "1.2.3",
    "£$%",
    "x" * 500,
    "Total",
    "2°15'",
    "12+345",
    "/",
    "'",
    "º",
    "(",
    "\u202e",
    "nan",
    "inf",
    "1e999",
    "٣",
    "²",
]

HEADINGS = [
    "Curve",
    "Radius",
    "R",
    "D",
    "Start",
    "km von",
    "MP",
    "Cant",
    "E",
    "Hand",
    "Speed",
    "V Gz",
    "Type",
]
HEADINGS += [
    "Transition",
    "ÜB",
    "Versine",
    "Chord",
    "Degree",
    "R1",
    "R2",
    "Length",
    "Track",
    "Line",
    "(mm)",
    "",
]

cells = st.one_of(st.sampled_from(ODD), st.floats(-1e4, 1e4), st.text(max_size=8), st.sampled_from(HEADINGS))


def read_or_refuse(workbook: Workbook, answers: dict[str, Any] | None = None) -> Reading | None:
    """Read a workbook; None where it is refused, in one line."""
    try:
        return read_workbook(workbook, answers=answers)
    except CantError as error:
        message = str(error)
    assert "\n" not in message
    return None


@settings(max_examples=150, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(st.lists(cells, max_size=8), max_size=8), st.lists(st.sampled_from(HEADINGS), max_size=8))
def test_any_grid_is_read_or_refused_in_one_line(rows: list[list[Value]], header: list[str]) -> None:
    grid = [[v if v != "" else None for v in row] for row in [list(header), *rows]]
    reading = read_or_refuse(Workbook("any.xlsx", "xlsx", [Sheet("Any", grid)]))
    if reading is None:
        return
    reading_document(reading)
    reading_table(reading)
    assert len(reading.curves) == len(reading.curves.rejected)


@pytest.mark.parametrize("case", LISTS, ids=lambda case: case.name)
def test_odd_cells_never_crash_the_reader(case: Messy) -> None:
    chance = random.Random(case.name)
    source = case.sheets[0]
    for _ in range(12):
        rows = [list(row) for row in source.rows]
        for _ in range(3):
            row = chance.randrange(len(rows))
            if rows[row]:
                rows[row][chance.randrange(len(rows[row]))] = chance.choice(ODD)
        bent = Sheet(source.name, rows, source.merged, source.hidden_rows)
        reading = read_or_refuse(Workbook("bent.xlsx", "xlsx", [bent, *case.sheets[1:]]), case.answers)
        if reading is not None:
            reading_document(reading)


@pytest.mark.parametrize("name", ["german", "stacked", "polish", "metres", "india-full", "decimal-miles"])
def test_a_bad_cell_changes_nothing_in_other_rows(name: str) -> None:
    case = next(c for c in LISTS if c.name == name)
    whole = case.read().curves
    source = case.sheets[0]
    first = int(whole.row[0])
    for column in range(len(source.rows[first - 1])):
        rows = [list(row) for row in source.rows]
        rows[first - 1][column] = "out of order"
        bent = Sheet(source.name, rows, source.merged)
        curves = read_workbook(Workbook("bent.xlsx", "xlsx", [bent, *case.sheets[1:]])).curves
        for index in range(1, len(whole)):
            at = int(np.flatnonzero(curves.row == whole.row[index])[0])
            assert curves.as_read(at) == whole.as_read(index), (column, index)


@pytest.mark.parametrize(
    "name",
    ["gb-chains", "german", "french", "polish", "czech", "brazil", "metres", "india-full", "portuguese-old"],
)
def test_the_order_of_columns_does_not_matter(name: str) -> None:
    case = next(c for c in LISTS if c.name == name)
    whole = case.read().curves
    source = case.sheets[0]
    header = int(case.read().sheets[0].header_row)
    width = len(source.rows[header - 1])
    order = list(range(width))
    for seed in range(4):
        random.Random(seed).shuffle(order)
        rows: list[list[Value]] = []
        for number, row in enumerate(source.rows, start=1):
            padded = [*row, *[None] * (width - len(row))]
            rows.append([padded[i] for i in order] if number >= header else list(row))
        sheets = [Sheet(source.name, rows), *case.sheets[1:]]
        shuffled = read_workbook(Workbook("x.xlsx", "xlsx", sheets)).curves
        keys = {k for row in case.expected.values() for k in row} & set(whole.as_read(0))
        for index in range(len(whole)):
            at = int(np.flatnonzero(shuffled.row == whole.row[index])[0])
            for key in keys:
                assert shuffled.as_read(at)[key] == whole.as_read(index)[key], (seed, key)
