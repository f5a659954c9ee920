"""Bad input: one clear error each, naming file, sheet and cell; a bad row never stops the good ones."""

from __future__ import annotations

from collections.abc import Callable

import pytest
from canonical import Table, tables, xlsx

from cant.errors import CantError
from cant.service import make_plan, read_curves

Bend = Callable[[dict[str, Table]], None]


def put(sheet: str, row: int, column: int, value: object) -> Bend:
    """Give a change that puts a value into a cell: row from 1 as a spreadsheet shows it, column from 0."""

    def bend(sheets: dict[str, Table]) -> None:
        sheets[sheet][row - 1][column] = value

    return bend


def only_header(sheet: str) -> Bend:
    def bend(sheets: dict[str, Table]) -> None:
        del sheets[sheet][1:]

    return bend


def twice(sheet: str, name: str) -> Bend:
    def bend(sheets: dict[str, Table]) -> None:
        sheets[name] = [list(row) for row in sheets[sheet]]

    return bend


def without(sheet: str) -> Bend:
    def bend(sheets: dict[str, Table]) -> None:
        del sheets[sheet]

    return bend


def added(sheet: str, row: list[object]) -> Bend:
    def bend(sheets: dict[str, Table]) -> None:
        sheets[sheet].append(row)

    return bend


WHOLE_TABLE: list[tuple[str, Bend, tuple[str, ...]]] = [
    (
        "unknown quantity",
        put("Limits", 5, 0, "cant surplus"),
        ("Limits", "A5", "cant surplus", "cant excess"),
    ),
    ("unknown unit", put("Limits", 2, 3, "parsec"), ("Limits", "D2", "parsec", "mm")),
    ("unit of another kind", put("Limits", 2, 3, "km/h"), ("Limits", "D2", "km/h")),
    ("limit without a value", put("Limits", 2, 1, None), ("Limits", "B2")),
    ("limit that is no number", put("Limits", 2, 1, "much"), ("Limits", "B2", "much")),
    (
        "unknown class of a speed column",
        put("Curves", 1, 12, "Speed Trams (km/h)"),
        ("Curves", "M1", "Trams"),
    ),
    ("unknown setting", added("Settings", ["Colour", "red"]), ("Settings", "A4", "Colour", "Method")),
    ("unknown method", added("Settings", ["Method", "guess"]), ("Settings", "B4", "guess", "rms")),
    ("unknown tier", put("Settings", 3, 1, "superb"), ("Settings", "B3", "superb", "normal")),
    ("negative speed of a class", put("Traffic", 2, 2, -140), ("Traffic", "C2", "-140")),
    ("class without speed", put("Traffic", 2, 2, None), ("Traffic", "A2", "Fast", "Speed")),
    ("negative number of trains", put("Traffic", 2, 3, -1), ("Traffic", "D2", "-1")),
    ("class twice", put("Traffic", 3, 0, "Fast"), ("Traffic", "A3", "Fast")),
    ("roll coefficient missing", put("Traffic", 2, 5, None), ("Traffic", "Fast", "felt acceleration")),
    ("empty traffic", only_header("Traffic"), ("Traffic",)),
    ("empty limits", only_header("Limits"), ("Limits",)),
    ("empty curves", only_header("Curves"), ("Curves",)),
    ("a table twice", twice("Traffic", "Traffic (2)"), ("Traffic",)),
    ("no traffic", without("Traffic"), ("--traffic",)),
    ("no limits", without("Limits"), ("--limits", "typical")),
    ("no curves", without("Curves"), ("curve",)),
]


@pytest.mark.parametrize(("bend", "says"), [c[1:] for c in WHOLE_TABLE], ids=[c[0] for c in WHOLE_TABLE])
def test_a_table_that_cannot_be_used_is_one_clear_error(bend: Bend, says: tuple[str, ...]) -> None:
    sheets = tables()
    bend(sheets)
    with pytest.raises(CantError) as refused:
        make_plan(read_curves(xlsx(sheets), "line.xlsx"))
    text = str(refused.value)
    assert text.startswith("line.xlsx")
    assert "\n" not in text
    for word in says:
        assert word in text


ONE_ROW: list[tuple[str, Bend, int, str]] = [
    ("radius missing", put("Curves", 3, 5, None), 3, "Radius"),
    ("radius that is a word", put("Curves", 3, 5, "sharp"), 3, "Radius"),
    ("unknown situation", put("Curves", 3, 11, "castle"), 3, "Situation"),
    ("speed below 0", put("Curves", 3, 10, -5), 3, "Speed"),
    ("transition below 0", put("Curves", 3, 7, -5), 3, "Transition in"),
    ("cant of 400 mm", put("Curves", 3, 9, 400), 3, "Cant"),
    ("hand that is neither", put("Curves", 3, 6, "up"), 3, "Hand"),
    ("the same name twice", put("Curves", 3, 2, "1"), 3, "Curve"),
    ("an error value", put("Curves", 3, 5, "#DIV/0!"), 3, "Radius"),
]


@pytest.mark.parametrize(("bend", "row", "column"), [c[1:] for c in ONE_ROW], ids=[c[0] for c in ONE_ROW])
def test_a_row_that_cannot_be_assessed_is_named_and_the_rest_planned(
    bend: Bend, row: int, column: str
) -> None:
    sheets = tables()
    bend(sheets)
    document = make_plan(read_curves(xlsx(sheets), "line.xlsx")).document()
    rejected = [entry for entry in document["rejected"] if entry["row"] == row]
    assert rejected
    assert rejected[0]["sheet"] == "Curves"
    assert any(entry["column"].startswith(column) for entry in rejected)
    assert all(entry["problem"] for entry in rejected)
    planned = {entry["row"] for entry in document["curves"]}
    assert row not in planned
    assert {4, 5} <= planned
    assert all(entry["status"] != "not assessed" for entry in document["curves"] if entry["row"] == 5)


def test_a_gap_in_the_limits_is_named_and_the_curve_not_assessed() -> None:
    sheets = tables()
    head = sheets["Limits"][0]
    head += ["Speed up to (km/h)"]
    for row in sheets["Limits"][1:]:
        row.append(110 if row[0] == "rate of change of cant" else None)
    document = make_plan(read_curves(xlsx(sheets), "line.xlsx")).document()
    status = {entry["curve"]: entry["status"] for entry in document["curves"]}
    assert status["1"] != "not assessed"
    assert status["2"] == status["3"] == "not assessed"
    record = next(entry for entry in document["curves"] if entry["curve"] == "2")
    assert any("rate of change of cant" in finding["text"] for finding in record["findings"])
    assert record["recommended_cant_mm"] is None


def test_contradictory_chainages_leave_both_rows_not_assessed() -> None:
    sheets = tables()
    sheets["Curves"][3][3] = 2.35  # curve 3 starts before curve 2 ends
    document = make_plan(read_curves(xlsx(sheets), "line.xlsx")).document()
    status = {entry["curve"]: entry["status"] for entry in document["curves"]}
    assert status["2"] == status["3"] == "not assessed"
    assert status["1"] != "not assessed"
    assert status["4"] != "not assessed"
