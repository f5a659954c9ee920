"""What the gang and the planner of track work need: which rail is lifted by how much, and the ramps' values.

The shift of what stands beside and above the track is a formula over heights that are inputs.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from cant.quantities.catalogue import CATALOGUE
from cant.quantities.lifting import lateral_shift, rise_of_centre
from cant.writing.book.inputs import HEIGHTS, Inputs
from cant.writing.book.ledger import FIXED, FORMULA, INPUT, BoolArray, Ledger, LedgerColumn, Value, token
from cant.writing.columns import SAME_MM, Cell, Record, change_mm, lifted_rail
from cant.writing.sheets import TableSheet

FIRST_ROW = 5
MOST_ROWS = 10_000
"""Most curves of the lifting schedule."""


def is_changed(record: Record) -> bool:
    """Tell whether a curve's cant is known today and another one is proposed."""
    change = change_mm(record)
    return change is not None and abs(change) > SAME_MM


class LiftingSchedule:
    """One row a curve whose cant changes.

    Parameters
    ----------
    sheet : TableSheet
    inputs : Inputs
    """

    def __init__(self, sheet: TableSheet, inputs: Inputs) -> None:
        self._sheet = sheet
        self._inputs = inputs
        self._rows: list[tuple[list[Cell], list[float], str]] = []
        self._left_out = 0

    def add(self, record: Record) -> None:
        """Take a curve."""
        if not is_changed(record):
            return
        if len(self._rows) >= MOST_ROWS:
            self._left_out += 1
            return
        read = record["as_read"]
        words = [record["line"], record["track"], record["curve"], record["hand"], read["situation"]]
        old, new = record["existing_cant_mm"], record["recommended_cant_mm"]
        numbers = [_number(read["start_km"]), _number(read["end_km"]), old, new]
        self._rows.append((words, numbers, _order_of_work(record)))

    def write(self) -> None:
        """Write the sheet."""
        self._sheet.paragraph(
            "A tamper lifts and does not lower: more cant lifts the outer rail, less cant the inner one "
            "(general "
            "lift, ballast, clearance). Sides are seen in the direction of the list. Where cant comes "
            "down, speed "
            "before track; where it goes up, track before speed. The shift is towards the inside of the "
            "curve "
            f"where cant is added, at the heights on the sheet '{self._inputs.name}'; confirm clearances, "
            "platforms, overhead line and the stress-free temperature of the rail." + self._thinned(),
            14,
            150,
        )
        ledger = Ledger(self._sheet, FIRST_ROW, len(self._rows))
        for column in self._columns():
            ledger.add(column)
        ledger.write(keep=3)
        if not self._rows:
            self._sheet.line("No cant changes.")

    def _thinned(self) -> str:
        if not self._left_out:
            return ""
        return (
            f" The first {MOST_ROWS} curves that change, in the order of the list; {self._left_out} "
            "further ones "
            "have change and rail in the added columns of the curve list alone."
        )

    def _columns(self) -> list[LedgerColumn]:
        words = list(zip(*(row[0] for row in self._rows), strict=True)) or [()] * 5
        numbers = np.array([row[1] for row in self._rows], dtype=np.float64).reshape(-1, 4)
        heads = (
            ("line", "Line", 20.0),
            ("track", "Track", 7.0),
            ("curve", "Curve", 9.0),
            ("hand", "Hand", 6.0),
            ("place", "Situation", 12.0),
        )
        columns = [
            LedgerColumn(key, title, "", "", list(values), None, FIXED, None, width)
            for (key, title, width), values in zip(heads, words, strict=True)
        ]
        for i, (key, title, kind, cell) in enumerate(
            (
                ("from", "Arc from", "chainage", FIXED),
                ("to", "Arc to", "chainage", FIXED),
                ("today", "Cant today", "cant", INPUT),
                ("D", "Cant to set", "cant", INPUT),
            )
        ):
            columns.append(self._number(key, title, "", kind, numbers[:, i], cell))
        change = numbers[:, 3] - numbers[:, 2]
        columns += self._computed(change)
        rails: list[Value] = [
            lifted_rail(float(c), str(row[0][3] or "")) for c, row in zip(change, self._rows, strict=True)
        ]
        columns.append(LedgerColumn("rail", "Rail to lift", "", "", rails, None, FIXED, None, 13.0))
        orders: list[Value] = [row[2] for row in self._rows]
        columns.append(LedgerColumn("order", "Order of work", "", "", orders, None, FIXED, None, 70.0))
        return columns

    def _number(
        self,
        key: str,
        title: str,
        symbol: str,
        kind: str,
        values: Any,
        cell: str,
        text: str = "",
        source: str = "",
    ) -> LedgerColumn:
        shown = self._inputs.display[kind]
        unit = f"{symbol} ({shown.unit})" if symbol else shown.unit
        formulas: list[tuple[str, BoolArray | None]] | None = [(text, None)] if text else None
        return LedgerColumn(
            key, title, unit, source, values * shown.factor, shown.number_format, cell, formulas, 10.0
        )

    def _computed(self, change: Any) -> list[LedgerColumn]:
        inputs, spacing = self._inputs, self._inputs.settings.spacing_mm
        dD = inputs.canonical(token("dD"), "cant")  # the symbol of the trade
        columns = [
            self._number(
                "dD",
                "Change",
                "dD",
                "cant",
                change,
                FORMULA,
                f"{token('D')}-{token('today')}",
                "to set less today",
            ),
            self._number(
                "lift", "Lift", "", "cant", np.abs(change), FORMULA, f"ABS({token('dD')})", "of the rail"
            ),
            self._number(
                "rise",
                "Rise of the centre line",
                CATALOGUE["rise_of_centre"].symbol,
                "cant exact",
                rise_of_centre(change),
                FORMULA,
                inputs.shown(CATALOGUE["rise_of_centre"].text(dD=dD), "cant exact"),
                CATALOGUE["rise_of_centre"].source,
            ),
        ]
        for key, (title, height) in HEIGHTS.items():
            text = CATALOGUE["lateral_shift"].text(h=inputs.cell(key), dD=dD, e=inputs.cell("spacing"))
            columns.append(
                self._number(
                    key,
                    f"Shift at {title}",
                    CATALOGUE["lateral_shift"].symbol,
                    "cant exact",
                    lateral_shift(change, height, spacing),
                    FORMULA,
                    inputs.shown(text, "cant exact"),
                    CATALOGUE["lateral_shift"].source,
                )
            )
        return columns


def _order_of_work(record: Record) -> str:
    down = record["recommended_cant_mm"] < record["existing_cant_mm"]
    slow = [
        entry["class"]
        for entry in record["classes"]
        if entry["run_speed_kmh"] is not None and entry["run_speed_kmh"] < entry["speed_kmh"] - 1e-6
    ]
    first = (
        "Speed before track: prove or lower the speeds, then lift the inner rail."
        if down
        else ("Track before speed: lift the outer rail, then raise speeds.")
    )
    if slow and not down:
        first = "Lift the outer rail; no higher speed before."
    return first + (f" Lower {', '.join(slow)} first: see the speed changes." if slow else "")


def _number(value: float | None) -> float:
    return float("nan") if value is None else value
