"""The limits table: one row a rule of the railway's standard."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import PurePath
from typing import Any

from pydantic import ValidationError

from cant.errors import InputError
from cant.files.grid import Sheet
from cant.model.limits import QUANTITIES, LimitRow, LimitSet
from cant.reading.records import Cell, Record, RecordTable, known_headings, read_records
from cant.reading.situations import canonical_situation
from cant.reading.text import fold
from cant.reading.traffic import category_word
from cant.reading.words import meaning_of
from cant.units import UNITS, find_unit

_CONDITIONS = {
    "Speed over": ("speed_over_kmh", "km/h"),
    "Speed up to": ("speed_up_to_kmh", "km/h"),
    "Radius over": ("radius_over_m", "m"),
    "Radius up to": ("radius_up_to_m", "m"),
}


def read_limits(sheet: Sheet, file: str) -> tuple[LimitSet, RecordTable]:
    """Read the limits table of a sheet as a set of its own, named after the file.

    Raises
    ------
    InputError
        An unknown heading over numbers, an unknown quantity, unit or kind, a value that is no number, no row.
    """
    table = read_records(sheet, file, "limits")
    _refuse_unknown_conditions(sheet, table)
    rows = tuple(_row(record) for record in table.records)
    us = any(row.unit in {"in", "ft", "mph", "in/31 ft", "in/62 ft", "in/s"} for row in rows)
    name = PurePath(file).name or sheet.name or "Limits"
    return LimitSet(
        name=name, title=f"limits of the user ({name})", rows=rows, units="us" if us else "metric"
    ), table


def _refuse_unknown_conditions(sheet: Sheet, table: RecordTable) -> None:
    for heading, index in table.unknown.items():
        if any(
            isinstance(record[next(iter(record))].place.row, int)
            and isinstance(sheet.value(record[next(iter(record))].place.row or 0, index), float | int)
            for record in table.records
        ):
            place = table.records[0][next(iter(table.records[0]))].place.at(table.where.header_row, index)
            known = known_headings("limits")
            message = f"the heading '{heading}' over numbers is not known; the headings are {known}"
            raise InputError(message, place)


def _row(record: Record) -> LimitRow:
    quantity = _quantity(record["Quantity"])
    unit = _unit(record.get("Unit"), record["Normal"], quantity)
    fields: dict[str, Any] = {
        "quantity": quantity,
        "normal": _value(record["Normal"], unit, needed=True),
        "exceptional": _value(record.get("Exceptional"), unit, needed=False),
        "unit": unit,
        "kind": _kind(record.get("Kind")),
        "place": record["Quantity"].place,
    }
    for name, (attribute, target) in _CONDITIONS.items():
        if name in record:
            fields[attribute] = _not_negative(record[name], target)
    if (slope := record.get("Per metre of radius")) is not None:
        fields["per_metre_of_radius"] = slope.number() or 0.0
    for name, attribute in (("Clause", "clause"), ("Note", "note")):
        if name in record and not record[name].blank:
            fields[attribute] = record[name].text
    if "Category" in record and not record["Category"].blank:
        fields["category"] = category_word(record["Category"].text)
    if "Situation" in record and not record["Situation"].blank:
        fields["situation"] = canonical_situation(record["Situation"].text)
    try:
        row = LimitRow(**fields)
    except ValidationError as error:
        message = f"the limit is not usable: {error.errors()[0]['msg']}"
        raise InputError(message, record["Quantity"].place) from None
    _refuse_contradictions(row, record)
    return row


def _refuse_contradictions(row: LimitRow, record: Record) -> None:
    """Refuse a rule that can never hold, a step of nothing, an exceptional value stricter than the normal."""
    for over, up_to, low, high in (
        ("Speed over", "Speed up to", row.speed_over_kmh, row.speed_up_to_kmh),
        ("Radius over", "Radius up to", row.radius_over_m, row.radius_up_to_m),
    ):
        if low is not None and high is not None and low >= high:
            message = (
                f"no value is over {record[over].text} and up to {record[up_to].text}: the rule never holds; "
                f"{up_to} is the larger of the two"
            )
            raise InputError(message, record[up_to].place)
    if row.quantity in ("cant step", "speed step") and row.normal <= 0:
        message = f"'{record['Normal'].text}' is no {row.quantity}; a number above 0 belongs there"
        raise InputError(message, record["Normal"].place)
    if row.exceptional is not None and QUANTITIES[row.quantity].bounds:
        normal, exceptional = (row.canonical(value, 1.0) for value in (row.normal, row.exceptional))
        if exceptional < normal:
            message = (
                f"the exceptional value {record['Exceptional'].text} is stricter than the normal value "
                f"{record['Normal'].text}; it is the looser of the two, or blank"
            )
            raise InputError(message, record["Exceptional"].place)


def _quantity(cell: Cell) -> str:
    by_fold = {fold(name): name for name in QUANTITIES}
    if not cell.blank and (found := by_fold.get(fold(cell.text))) is not None:
        return found
    known = ", ".join(QUANTITIES)
    message = f"the quantity '{cell.text}' is not known; the quantities are {known}"
    raise InputError(message, cell.place)


def _unit(cell: Cell | None, normal: Cell, quantity: str) -> str:
    info = QUANTITIES[quantity]
    if cell is None or cell.blank:
        if "gradient" in info.dimensions and _one_in(normal) is not None:
            return "1 in n"
        if normal.unit and UNITS[normal.unit].dimension not in info.dimensions:
            message = f"the heading '{normal.heading}' names no unit of {quantity}; write it under Unit"
            raise InputError(message, normal.place)
        return normal.unit or info.canonical
    found = find_unit(cell.text)
    if found is None or found.dimension not in info.dimensions:
        fitting = ", ".join(u.symbol for u in UNITS.values() if u.dimension in info.dimensions)
        what = "is not known" if found is None else f"is no unit of {quantity}"
        message = f"the unit '{cell.text}' {what}; {quantity} is stated in {fitting}"
        raise InputError(message, cell.place)
    if normal.unit and normal.unit != found.symbol:
        message = (
            f"the heading '{normal.heading}' says {normal.unit}, this cell {found.symbol}; one unit a rule"
        )
        raise InputError(message, cell.place)
    return found.symbol


def _one_in(cell: Cell) -> str | None:
    """Give the n of ``1 in n`` or ``1:n`` as it is written, None where the cell is no such ratio."""
    head, _, tail = cell.text.casefold().replace("1 in", "1:", 1).partition(":")
    return tail.strip() or None if isinstance(cell.value, str) and head.strip() == "1" else None


def _value(cell: Cell | None, unit: str, needed: bool) -> float | None:
    if cell is None or cell.blank:
        if needed and cell is not None:
            message = "a rule has no Normal value; a number, or none where it is not limited"
            raise InputError(message, cell.place)
        return None
    if isinstance(cell.value, str) and meaning_of("nothing", cell.text) == "none":
        return math.inf
    if unit == "1 in n":
        count = _one_in(cell)
        return cell.number() if count is None else replace(cell, value=count).number()
    return cell.number(unit)


def _not_negative(cell: Cell, target: str) -> float | None:
    value = cell.number(target)
    if value is not None and value < 0:
        message = f"'{cell.text}' is negative; {cell.heading} is 0 or more"
        raise InputError(message, cell.place)
    return value


def _kind(cell: Cell | None) -> str:
    if cell is None or cell.blank or fold(cell.text) == "design":
        return "design"
    if fold(cell.text) == "ceiling":
        return "ceiling"
    message = f"the kind '{cell.text}' is not known; blank for a design limit, or ceiling"
    raise InputError(message, cell.place)
