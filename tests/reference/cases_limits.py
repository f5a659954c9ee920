"""Invented limit sets for the cases: few grid steps, every kind of row, tight enough that things give way."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple, Protocol, TypeVar

from cant.model.limits import LimitRow

T = TypeVar("T")
MILE = 1.609344


class Draw(Protocol):
    """A source of chance."""

    def integer(self, low: int, high: int) -> int:
        """Give a whole number, both ends included."""

    def choice(self, options: Sequence[T]) -> T:
        """Give one of some things."""

    def chance(self, percent: int) -> bool:
        """Give True that often."""


class DrawnLimits(NamedTuple):
    """Rows, and what the curves should know of them.

    ``levels`` is the number of cants on the grid, ``speed_unit`` km/h or mph in km/h, ``speed_multiple`` the
    step of speeds in that unit.
    """

    rows: tuple[LimitRow, ...]
    step_mm: float
    levels: int
    speed_unit: float
    speed_multiple: int


class _Maker:
    """Makes rows in one system of units."""

    def __init__(self, draw: Draw) -> None:
        self.draw = draw
        self.us = draw.chance(15)
        self.mph = MILE if self.us else 1.0
        self.count = 0

    def row(self, quantity: str, mm: float, **given: Any) -> LimitRow:
        """Make a row of a value in mm, mm/m, mm/s, km/h or m/s2, with an exceptional value or without."""
        unit, value = self._stated(quantity, mm)
        self.count += 1
        exceptional = None
        if quantity not in ("minimum cant", "cant step", "speed step") and self.draw.chance(65):
            more = self.draw.choice((1.1, 1.25, 1.4))
            exceptional = round(value / more if unit == "1 in n" else value * more, 3)
        given = {"normal": value, "exceptional": exceptional, "unit": unit, **given}
        return LimitRow(quantity=quantity, clause=f"{self.count}", **given)

    def _stated(self, quantity: str, mm: float) -> tuple[str, float]:
        if quantity in ("felt acceleration",):
            return "m/s2", mm
        if quantity == "speed step":
            return ("mph", mm / MILE) if self.us else ("km/h", mm)
        if quantity == "cant gradient":
            if self.us:
                return "in/31 ft", round(mm * 31 * 0.3048 / 25.4, 2)
            return ("1 in n", round(1000 / mm)) if self.draw.chance(40) else ("mm/m", mm)
        if quantity.startswith("rate"):
            return ("in/s", round(mm / 25.4, 2)) if self.us else ("mm/s", mm)
        if self.us:
            return "in", round(mm / 25.4 * 4) / 4
        if quantity in ("cant deficiency", "cant excess") and self.draw.chance(15):
            return "m/s2", round(mm * 9.81 / 1500, 3)
        return "mm", mm


def draw_limits(draw: Draw) -> DrawnLimits:
    """Invent a limit set."""
    make = _Maker(draw)
    step = draw.choice((12.7, 25.4)) if make.us else draw.choice((20.0, 10.0, 15.0, 30.0, 25.0, 5.0))
    top = draw.choice((100, 80, 120, 150, 60))
    rows: list[LimitRow] = []
    if step != 5.0:
        rows.append(make.row("cant step", step, normal=step / 25.4 if make.us else step))
    if draw.chance(25):
        rows.append(make.row("minimum cant", step * draw.choice((1, 2))))
    multiple = 5
    if make.us or draw.chance(35):
        multiple = draw.choice((5, 10, 20))
        rows.append(make.row("speed step", multiple * make.mph, normal=float(multiple)))
    rows += _cant(make, top)
    rows += _deficiency(make)
    rows += _excess(make)
    rows += _transitions(make)
    if draw.chance(35):
        rows.append(make.row("felt acceleration", draw.choice((0.65, 0.85, 1.0, 1.2))))
    if draw.chance(4):
        rows = [_with_gap(make, row) if row.quantity == draw.choice(_GAPS) else row for row in rows]
    limited = any(row.quantity == "cant" for row in rows)
    levels = int((top * 1.4 if limited else 300) / step) + 1
    return DrawnLimits(tuple(rows), step, levels, make.mph, multiple)


_GAPS = (
    "cant deficiency",
    "rate of change of cant",
    "abrupt change of cant deficiency",
    "cant excess",
    "cant gradient",
    "rate of change of cant deficiency",
)


def _with_gap(make: _Maker, row: LimitRow) -> LimitRow:
    draw = make.draw
    if draw.chance(50):
        return row.model_copy(update={"speed_up_to_kmh": draw.choice((120, 90)) * 1.0})
    return row.model_copy(update={"radius_over_m": draw.choice((300.0, 500.0))})


def _cant(make: _Maker, top: int) -> list[LimitRow]:
    draw = make.draw
    if draw.chance(4):
        return []
    rows = [make.row("cant", top)]
    if draw.chance(20):
        rows = [make.row("cant", top + 10, kind="ceiling"), make.row("cant", top)]
    if draw.chance(20):
        rows.append(make.row("cant", top / 2, situation="platform"))
    if draw.chance(12):
        slope = {"normal": -33.3333, "exceptional": None, "unit": "mm", "per_metre_of_radius": 2 / 3}
        rows.append(make.row("cant", 0, radius_up_to_m=305.0, **slope))
        rows.append(make.row("cant", top, radius_over_m=305.0))
    if draw.chance(10):
        rows.append(make.row("cant", top * 0.8, category="freight"))
        rows.append(make.row("cant", top, category="passenger"))
    if draw.chance(8):
        rows.append(make.row("cant", top * 0.6, speed_up_to_kmh=60 * make.mph))
        rows.append(make.row("cant", top, speed_over_kmh=60 * make.mph))
    return rows


def _deficiency(make: _Maker) -> list[LimitRow]:
    draw, quantity = make.draw, "cant deficiency"
    kind = draw.choice(("one", "one", "category", "category", "speed", "radius", "absent"))
    value = draw.choice((100, 75, 130, 60))
    rows = []
    if kind == "one":
        rows = [make.row(quantity, value)]
    elif kind == "category":
        rows = [make.row(quantity, value, category="passenger"), make.row(quantity, 60, category="freight")]
    elif kind == "speed":
        edge = draw.choice((80, 60, 100)) * make.mph
        low, high = draw.choice(((value, value - 20), (value - 20, value)))
        rows = [make.row(quantity, low, speed_up_to_kmh=edge), make.row(quantity, high, speed_over_kmh=edge)]
    elif kind == "radius":
        rows = [
            make.row(quantity, value - 15, radius_up_to_m=400.0),
            make.row(quantity, value, radius_over_m=400.0),
        ]
    if draw.chance(15):
        rows.append(make.row(quantity, 55, situation="turnout"))
    if draw.chance(6) and rows:
        rows.append(make.row(quantity, value, category="freight", normal=float("inf"), exceptional=None))
    return rows


def _excess(make: _Maker) -> list[LimitRow]:
    draw, quantity = make.draw, "cant excess"
    kind = draw.choice(("one", "one", "category", "radius", "speed", "none", "absent"))
    value = draw.choice((70, 50, 90, 110))
    if kind == "one":
        return [make.row(quantity, value)]
    if kind == "category":
        return [
            make.row(quantity, value, category="freight"),
            make.row(quantity, value + 20, category="passenger"),
        ]
    if kind == "radius":
        return [
            make.row(quantity, value, radius_up_to_m=600.0),
            make.row(quantity, value + 20, radius_over_m=600.0),
        ]
    if kind == "speed":
        edge = 50 * make.mph
        return [
            make.row(quantity, value, speed_up_to_kmh=edge),
            make.row(quantity, value - 20, speed_over_kmh=edge),
        ]
    if kind == "none":
        return [make.row(quantity, value, normal=float("inf"), exceptional=None)]
    return []


def _transitions(make: _Maker) -> list[LimitRow]:
    draw, rows = make.draw, []
    if draw.chance(60):
        rows.append(make.row("cant gradient", draw.choice((2.0, 1.25, 2.5, 4.0))))
    if draw.chance(60):
        rows.append(make.row("rate of change of cant", draw.choice((50, 35, 28, 70))))
        if draw.chance(15):
            rows.append(make.row("rate of change of cant", 40, category="freight"))
            rows.append(make.row("rate of change of cant", 55, category="passenger"))
    if draw.chance(60):
        quantity = "rate of change of cant deficiency"
        if draw.chance(25):
            edge = 100 * make.mph
            rows.append(make.row(quantity, 55, speed_up_to_kmh=edge))
            rows.append(make.row(quantity, 45, speed_over_kmh=edge))
        else:
            rows.append(make.row(quantity, draw.choice((55, 40, 80))))
    if draw.chance(50):
        rows.append(make.row("abrupt change of cant deficiency", draw.choice((110, 80, 150, 50))))
    return rows
