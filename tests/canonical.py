"""A small canonical workbook for tests, easily bent: tables as rows of cells, and the bytes of an xlsx."""

from __future__ import annotations

import io
from collections.abc import Mapping, Sequence
from typing import TypeAlias

from openpyxl import Workbook

Cell: TypeAlias = str | float | int | None
Table: TypeAlias = list[list[Cell]]

CURVES: Table = [
    [
        *("Line", "Track", "Curve", "Start (km)", "End (km)", "Radius (m)", "Hand", "Transition in (m)"),
        *("Transition out (m)", "Cant (mm)", "Speed (km/h)", "Situation", "Speed Goods (km/h)"),
    ],
    ["A", "1", "1", 1.0, 1.3, 800, "L", 80, 80, 70, 100, None, None],
    ["A", "1", "2", 2.0, 2.4, 1200, "R", 90, 90, 60, 120, "platform", 60],
    ["A", "1", "3", 2.49, 2.8, 1000, "L", 90, 90, 60, 120, None, None],
    ["A", "1", "4", 5.0, 5.4, 2000, "L", 80, 80, 40, 120, None, "none"],
]
TRAFFIC: Table = [
    ["Class", "Category", "Speed (km/h)", "Trains per day", "Mass (t)", "Roll coefficient"],
    ["Fast", "passenger", 140, 30, 300, 0.25],
    ["Goods", "freight", 80, 20, 1800, 0.2],
]
LIMITS: Table = [
    ["Quantity", "Normal", "Exceptional", "Unit", "Category", "Situation", "Clause"],
    ["cant", 150, 160, "mm", None, None, "1"],
    ["cant", 100, None, "mm", None, "platform", "2"],
    ["cant deficiency", 130, 150, "mm", None, None, "3"],
    ["cant excess", 90, 110, "mm", None, None, "4"],
    ["cant gradient", 2, 2.5, "mm/m", None, None, "5"],
    ["rate of change of cant", 50, 60, "mm/s", None, None, "6"],
    ["rate of change of cant deficiency", 50, 75, "mm/s", None, None, "7"],
    ["felt acceleration", 1.2, 1.3, "m/s2", "passenger", None, "8"],
]
SETTINGS: Table = [["Name", "Value"], ["Rail spacing", 1500], ["Tiers", "normal, exceptional"]]


def tables() -> dict[str, Table]:
    """Give fresh copies of the four tables by sheet name."""
    all_ = {"Curves": CURVES, "Traffic": TRAFFIC, "Limits": LIMITS, "Settings": SETTINGS}
    return {name: [list(row) for row in table] for name, table in all_.items()}


def xlsx(sheets: Mapping[str, Sequence[Sequence[Cell]]]) -> bytes:
    """Give the bytes of a workbook with these sheets."""
    book = Workbook()
    book.remove(book.worksheets[0])
    for name, rows in sheets.items():
        sheet = book.create_sheet(name)
        for row in rows:
            sheet.append(list(row))
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def csv(rows: Sequence[Sequence[Cell]]) -> bytes:
    """Give the bytes of a csv file."""
    lines = [",".join("" if cell is None else f'"{cell}"' for cell in row) for row in rows]
    return ("\n".join(lines) + "\n").encode()
