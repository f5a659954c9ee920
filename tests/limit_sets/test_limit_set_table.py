"""A limit set as the canonical table: headers of the contract, values as stated, conditions in its units."""

from __future__ import annotations

import math

import pytest

from cant import limit_sets
from cant.limit_sets import as_table, headers
from cant.model.limits import LimitRow, LimitSet

HEADERS = [
    "Quantity",
    "Normal",
    "Exceptional",
    "Unit",
    "Category",
    "Situation",
    "Speed over",
    "Speed up to",
    "Radius over",
    "Radius up to",
    "Per metre of radius",
    "Kind",
    "Clause",
    "Note",
]


@pytest.mark.parametrize("name", limit_sets.names())
def test_headers_are_the_canonical_ones(name: str) -> None:
    limit_set = limit_sets.load(name)
    table = as_table(limit_set)
    assert len(table) == len(limit_set.rows)
    assert all(list(row) == headers(limit_set) for row in table)
    assert [header.split(" (")[0] for header in headers(limit_set)] == HEADERS


def test_metric_headers_carry_no_unit() -> None:
    assert headers(limit_sets.load("typical")) == HEADERS


def test_us_conditions_come_back_as_printed() -> None:
    table = as_table(limit_sets.load("us-49-cfr-213"))
    bands = [
        (row["Speed over (mph)"], row["Speed up to (mph)"])
        for row in table
        if row["Quantity"] == "cant gradient" and row["Category"] == "freight"
    ]
    assert bands == [(None, 10.0), (10.0, 25.0), (25.0, 40.0), (40.0, 60.0), (60.0, 80.0)]


def test_values_stay_as_stated() -> None:
    table = as_table(limit_sets.load("de-ebo"))
    gradient = next(row for row in table if row["Quantity"] == "cant gradient")
    assert (gradient["Normal"], gradient["Exceptional"], gradient["Unit"]) == (400.0, None, "1 in n")
    assert gradient["Category"] is None
    assert gradient["Per metre of radius"] is None


def test_not_limited_is_a_word() -> None:
    row = LimitRow(
        quantity="cant excess", normal=math.inf, exceptional=math.inf, unit="mm", radius_over_m=500
    )
    (cells,) = as_table(LimitSet(name="mine", rows=(row,)))
    assert (cells["Normal"], cells["Exceptional"]) == ("none", "none")
    assert cells["Radius over"] == 500.0
