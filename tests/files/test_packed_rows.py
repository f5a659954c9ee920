"""Cells of added columns held packed: they come out as they went in, in any order."""

from __future__ import annotations

import random

import pytest
from parts import one_column, parts_of, simple_workbook

from cant.files.additions import AddedColumn, OutCell, OutValue, SheetAddition
from cant.files.annotate import annotate
from cant.files.packed_rows import PackedRows

SLY: list[OutValue] = [
    1.5,
    -0.1,
    1e300,
    12345678901234567.0,
    True,
    False,
    None,
    "",
    "=1+1",
    "a & <b>",
    "  blanks  ",
    "two\nlines",
    "_x0041_",
    "\x1f\x1e\x07 apart",
    "дёрн 曲線",
]


def test_every_kind_of_value_comes_back_in_any_order() -> None:
    rows = PackedRows(len(SLY))
    chance = random.Random(3)
    numbers = chance.sample(range(1, 5000), 700)
    turned = {row: SLY[row % len(SLY) :] + SLY[: row % len(SLY)] for row in numbers}
    for row in numbers:
        rows.put(row, turned[row])
    for place in range(len(SLY)):
        column = rows.column(place)
        expected = {row: values[place] for row, values in turned.items() if values[place] is not None}
        assert sorted(column) == sorted(expected)
        assert len(column) == len(expected)
        for row in chance.sample(sorted(expected), 60):
            found = column[row].value
            assert found == expected[row]
            assert type(found) is type(expected[row])


def test_a_row_has_its_cells_once() -> None:
    rows = PackedRows(1)
    rows.put(7, [1.0])
    assert 7 in rows
    assert 8 not in rows
    assert rows.column(0).get(8) is None
    with pytest.raises(ValueError, match="row 7"):
        rows.put(7, [2.0])


def test_packed_columns_are_written_as_plain_ones_are() -> None:
    data = simple_workbook([["Curve", "Radius"], *[[f"C{i}", 400 + i] for i in range(600)]])
    packed = PackedRows(2)
    plain: list[dict[int, OutCell]] = [{}, {}]
    fills = {"change": "FFEE99"}
    for row in range(601, 1, -1):
        values: list[OutValue] = [row / 3 if row % 5 else None, ("change", "kept", "a  b")[row % 3]]
        packed.put(row, values)
        for cells, value in zip(plain, values, strict=True):
            if value is not None:
                cells[row] = OutCell(value, fill=fills.get(str(value)))
    heads = [("New cant", "0.0", {}), ("Status", None, fills)]
    results = []
    for cells_of in ([packed.column(i, heads[i][2]) for i in range(2)], plain):
        columns = [
            AddedColumn(heading, cells, number_format=code, heading_note="what it is")
            for (heading, code, _), cells in zip(heads, cells_of, strict=True)
        ]
        results.append(parts_of(annotate(data, [SheetAddition("Curves", 1, columns)]).data))
    assert results[0] == results[1]
    assert parts_of(annotate(data, [one_column("Curves", 1)]).data) != results[0]
