"""The turnouts table: turnouts that lie in curves."""

from __future__ import annotations

import math
from typing import Literal

from cant.errors import InputError
from cant.files.grid import Sheet
from cant.model.turnouts import Turnout
from cant.reading.chainages import take_location
from cant.reading.records import Cell, Record, RecordTable, read_records
from cant.reading.takers import is_straight
from cant.reading.traffic import category_word
from cant.reading.words import meaning_of
from cant.units import ratio


def read_turnouts(sheet: Sheet, file: str) -> tuple[list[Turnout], RecordTable]:
    """Read the turnouts table of a sheet.

    Raises
    ------
    InputError
        A required heading or value missing, a hand or number that is none, neither curve nor chainage.
    """
    table = read_records(sheet, file, "turnouts", may_be_empty=True)
    return [_turnout(record) for record in table.records], table


def _turnout(record: Record) -> Turnout:
    curve, chainage = _text(record, "Curve"), _chainage(record.get("Chainage"))
    radius = record["Radius on the straight"]
    if not curve and chainage is None:
        message = "a turnout needs its curve or its chainage"
        raise InputError(message, radius.place)
    return Turnout(
        name=_text(record, "Turnout"),
        line=_text(record, "Line"),
        track=_text(record, "Track"),
        curve=curve,
        chainage_km=chainage,
        radius_m=_positive(radius, "m"),
        hand=_hand(record["Hand"]),
        branch_speed_kmh=_positive(record["Branch speed"], "km/h"),
        category=category_word(_text(record, "Category")) if _text(record, "Category") else "",
        place=radius.place,
    )


def _text(record: Record, name: str) -> str:
    cell = record.get(name)
    return "" if cell is None or cell.blank else cell.text


def _chainage(cell: Cell | None) -> float | None:
    if cell is None or cell.blank:
        return None
    if isinstance(cell.value, float | int):
        return float(cell.value) * ratio(cell.unit, "km")
    cell.refuse_errors()
    taken = take_location(cell.text)
    if taken.problem:
        raise InputError(taken.problem, cell.place)
    return taken.value if taken.unit == "km" else taken.value * ratio(cell.unit, "km")


def _positive(cell: Cell, unit: str) -> float:
    if isinstance(cell.value, str) and is_straight(cell.text):
        return math.inf
    value = cell.number(unit)
    if value is None or value <= 0:
        message = f"'{cell.text}' stands under '{cell.heading}'; a number above 0 belongs there"
        raise InputError(message, cell.place)
    return value


def _hand(cell: Cell) -> Literal["L", "R"]:
    found = None if cell.blank else meaning_of("hands", cell.text)
    if found is None:
        message = f"'{cell.text}' is no hand; L or R belongs there"
        raise InputError(message, cell.place)
    return "L" if found == "L" else "R"
