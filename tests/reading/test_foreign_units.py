"""Units over a column that the program does not reckon in: refused by name, never read as the usual one."""

from __future__ import annotations

from typing import Any

import pytest
from messy import traffic_of

from cant.errors import InputError
from cant.files.grid import Sheet, Value, Workbook
from cant.model.reading import Reading
from cant.reading import read_workbook

HEADER: dict[str, str] = {
    "Curve": "Curve",
    "Chainage": "Chainage (km)",
    "Radius": "Radius (m)",
    "Cant": "Cant (mm)",
    "Speed": "Speed (km/h)",
}


def read(heading: str, value: float, answers: dict[str, Any] | None = None) -> Reading:
    header: list[Value] = [heading if heading.startswith(name) else text for name, text in HEADER.items()]
    usual: list[Value] = ["1", 1.0, 800, 80, 80]
    row = [value if h == heading else v for h, v in zip(header, usual, strict=True)]
    return read_workbook(Workbook("list.xlsx", "xlsx", [Sheet("Curves", [header, row])]), answers=answers)


@pytest.mark.parametrize(
    ("heading", "value", "cell"),
    [
        ("Radius (rods)", 160, "C1"),
        ("Radius [hm]", 8, "C1"),
        ("Cant (\u2030)", 50, "D1"),
        ("Cant (%)", 5, "D1"),
        ("Cant (\u00b0)", 3, "D1"),
        ("Cant (mrad)", 50, "D1"),
        ("Cant (1/8 in)", 28, "D1"),
        ("Speed (kn)", 45, "E1"),
        ("Speed (m/min)", 1300, "E1"),
    ],
)
def test_a_foreign_unit_is_refused_at_its_heading(heading: str, value: float, cell: str) -> None:
    with pytest.raises(InputError, match=r"^list.xlsx, sheet 'Curves', cell .*is not known here") as error:
        read(heading, value)
    assert f"cell {cell}:" in str(error.value)


@pytest.mark.parametrize("heading", ["Cant (existing)", "Speed (max)", "Radius (centre line)", "Cant"])
def test_a_remark_in_brackets_is_no_unit(heading: str) -> None:
    reading = read(heading, 80.0)
    assert not reading.rejected
    assert reading.curves.as_read(0)["radius_m"] in (80.0, 800.0)


def test_a_person_can_tell_the_unit() -> None:
    reading = read("Cant (\u2030)", 80, {"columns": {"Curves": {"D": {"unit": "mm"}}}})
    assert reading.curves.cant_mm[0] == 80


def test_in_a_canonical_table_a_word_in_brackets_is_a_unit() -> None:
    header: list[Value] = ["Curve", "Radius (cubits)", "Cant (approx.)", "Speed (max)"]
    with pytest.raises(InputError, match=r"cell B1: the unit 'cubits'"):
        read_workbook(Workbook("list.xlsx", "xlsx", [Sheet("Curves", [header, ["1", 800, 80, 80]])]))


def test_a_letter_beside_mph_is_a_class_of_train_and_no_cant() -> None:
    header: list[Value] = ["Curve", "PC Sta", "PT Sta", "Degree (chord)", "Superelev. in", "MPH P", "MPH F"]
    row: list[Value] = ["1", "1234+56", "1245+06", "2-30", "3 1/2", 60, 40]
    traffic = traffic_of(("Fast", "passenger", 120.0), ("Goods", "freight", 60.0))
    reading = read_workbook(Workbook("list.xlsx", "xlsx", [Sheet("Curves", [header, row]), traffic]))
    assert not reading.rejected
    assert reading.curves.cant_mm[0] == pytest.approx(88.9)
    assert reading.curves.class_speeds["Fast"][0] == pytest.approx(60 * 1.609344)
    assert reading.curves.class_speeds["Goods"][0] == pytest.approx(40 * 1.609344)
