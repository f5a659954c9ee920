"""The sheet "Limits used": the limits as used, one row a rule.

The value as stated stands beside the value in the unit of the sheets of calculation; those look up the
latter.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from cant.model.limits import TOLERANCE, LimitRow
from cant.units import UNITS
from cant.writing.book.ledger import FIXED, FORMULA, INPUT, BoolArray, Ledger, LedgerColumn, token
from cant.writing.book.limit_lookup import FIRST_ROW, LimitLookup, kind_of
from cant.writing.columns import Cell
from cant.writing.sheets import NewSheets


class LimitsSheet(LimitLookup):
    """The sheet itself: what each row states, what it comes to in the unit used, and where it holds."""

    def write(self, book: NewSheets) -> None:
        """Write the sheet."""
        sheet = book.table(self.name)
        sheet.paragraph(
            f"{self._title()} Of all rows that hold, the strictest governs; a blank condition holds always; "
            "'over' is exclusive, 'up to' inclusive. Change a stated value here and the sheets of "
            "calculation "
            "follow; a condition counts there where some row of the quantity states it.",
            12,
            150,
        )
        ledger = Ledger(sheet, FIRST_ROW, len(self._rows))
        for column in self._columns():
            ledger.add(column)
        ledger.write(keep=2)

    def _title(self) -> str:
        limits = self.limits
        words = [limits.title or limits.name, limits.edition, limits.document]
        if limits.edited:
            words.append("EDITED by the user")
        if not limits.verified:
            words.append("UNVERIFIED typical values, no railway's standard")
        return ". ".join(word.rstrip(".") for word in words if word) + "."

    def _columns(self) -> list[LedgerColumn]:
        rows, display = self._rows, self._inputs.display
        texts: list[tuple[str, str, list[Cell], float]] = [
            ("number", "Row", [float(i + 1) for i in self._at], 5),
            ("quantity", "Quantity", [row.quantity for row in rows], 30),
            ("category", "Category", [row.category for row in rows], 11),
            ("situation", "Situation", [row.situation for row in rows], 14),
        ]
        columns = [
            LedgerColumn(key, heading, "", "", values, "0" if key == "number" else None, FIXED, None, width)
            for key, heading, values, width in texts
        ]
        for key, heading, kind in (
            ("speed_over_kmh", "Speed over", "speed exact"),
            ("speed_up_to_kmh", "Speed up to", "speed exact"),
            ("radius_over_m", "Radius over", "radius"),
            ("radius_up_to_m", "Radius up to", "radius"),
        ):
            shown = display[kind]
            stated = [shown.value(getattr(row, key)) for row in rows]
            columns.append(
                LedgerColumn(key, heading, shown.unit, "as stated", stated, "General", INPUT, None, 8)
            )
        return [*columns, *self._stated(), *self._used(), *self._words(), *self._matrix_columns()]

    def _stated(self) -> list[LedgerColumn]:
        rows = self._rows
        normal: list[Cell] = ["none" if math.isinf(row.normal) else row.normal for row in rows]
        exceptional: list[Cell] = [
            "none" if row.exceptional is not None and math.isinf(row.exceptional) else row.exceptional
            for row in rows
        ]
        slope: list[Cell] = [row.per_metre_of_radius or None for row in rows]
        return [
            LedgerColumn("normal", "Normal", "as stated", "", normal, "General", INPUT, None, 9),
            LedgerColumn(
                "exceptional", "Exceptional", "blank: normal", "", exceptional, "General", INPUT, None, 10
            ),
            LedgerColumn("unit", "Unit", "", "as stated", [row.unit for row in rows], None, FIXED, None, 10),
            LedgerColumn("slope", "Per metre of radius", "", "as stated", slope, "General", INPUT, None, 9),
            LedgerColumn("kind", "Kind", "", "as stated", [row.kind for row in rows], None, FIXED, None, 8),
        ]

    def _used(self) -> list[LedgerColumn]:
        """Give the columns that the calculation looks up, in the units in which it is shown."""
        columns = []
        for key, exceptional in (("normal used", False), ("exceptional used", True)):
            values = [self._value(row, exceptional) for row in self._rows]
            texts = [self._value_text(row, exceptional) for row in self._rows]
            column = LedgerColumn(
                key,
                key.capitalize(),
                "in the unit used",
                "from the value as stated",
                values,
                "0.0##",
                FORMULA,
            )
            column.formulas = _by_row(texts)
            columns.append(column)
        slopes: list[Cell] = [self._slope(row) for row in self._rows]
        columns.append(
            LedgerColumn(
                "slope used", "Slope used", "per unit of radius", "", slopes, "0.0#####", FIXED, None, 9
            )
        )
        tolerances: list[Cell] = [self._tolerance(row) for row in self._rows]
        columns.append(
            LedgerColumn(
                "tolerance",
                "Tolerance",
                "in the unit used",
                "0.001 of the unit stated",
                tolerances,
                "General",
                FIXED,
                None,
                9,
            )
        )
        units: list[Cell] = [self._inputs.display[kind_of(row.quantity)].unit for row in self._rows]
        columns.append(LedgerColumn("unit used", "Unit used", "", "", units, None, FIXED, None, 9))
        return columns

    def _factor(self, row: LimitRow) -> float:
        """Give how many units shown one canonical unit is."""
        return self._inputs.display[kind_of(row.quantity)].factor

    def _value(self, row: LimitRow, exceptional: bool) -> Cell:
        stated = row.stated(exceptional)
        if math.isinf(stated):
            return "none"
        value = row.canonical(stated, self._inputs.settings.spacing_mm)
        if row.quantity == "cant" and row.kind == "ceiling":
            value -= self._inputs.settings.maintenance_allowance_mm or 0.0
        return "none" if math.isinf(value) else value * self._factor(row)

    def _value_text(self, row: LimitRow, exceptional: bool) -> str:
        if exceptional:
            own = self._converted(row, token("exceptional"))
            return f'IF({token("exceptional")}="",{token("normal used")},{own})'
        return self._converted(row, token("normal"))

    def _converted(self, row: LimitRow, cell: str) -> str:
        """Give the formula that turns a stated value into the one used."""
        factor = self._factor(row)
        if row.unit == "1 in n":
            text = f"1000/{cell}"
            factor_text = f"*{factor!r}" if factor != 1.0 else ""
        elif UNITS[row.unit].dimension == "acceleration" and row.quantity != "felt acceleration":
            text = f"{cell}*{self._inputs.cell('spacing')}/{self._inputs.cell('gravity')}"
            factor_text = _times(UNITS[row.unit].factor * factor)
        else:
            text = cell
            factor_text = _times(row.unit_size(self._inputs.settings.spacing_mm) * factor)
        allowance = ""
        if row.quantity == "cant" and row.kind == "ceiling":
            allowance = f"-{self._inputs.cell('allowance')}{_times(factor)}"
        return f'IF(ISNUMBER({cell}),{text}{factor_text}{allowance},"none")'

    def _slope(self, row: LimitRow) -> float:
        size = row.unit_size(self._inputs.settings.spacing_mm)
        if not row.per_metre_of_radius or math.isnan(size):
            return 0.0
        return row.per_metre_of_radius * size * self._factor(row) / self._inputs.display["radius"].factor

    def _tolerance(self, row: LimitRow) -> float:
        size = row.unit_size(self._inputs.settings.spacing_mm)
        return TOLERANCE * (1.0 if math.isnan(size) else size) * self._factor(row)

    def _words(self) -> list[LedgerColumn]:
        clauses: list[Cell] = [row.clause for row in self._rows]
        notes: list[Cell] = [row.note for row in self._rows]
        return [
            LedgerColumn("clause", "Clause", "", "as stated", clauses, None, FIXED, None, 24),
            LedgerColumn("note", "Note", "", "as stated", notes, None, FIXED, None, 44),
        ]

    def _matrix_columns(self) -> list[LedgerColumn]:
        """Give a column for each set of situation words: 1 in the rows that hold there."""
        columns = []
        for number, words in enumerate(self._situations or [frozenset({"plain"})], start=1):
            values: list[Cell] = [float(_holds(row, words)) for row in self._rows]
            columns.append(
                LedgerColumn(
                    f"situation {number}",
                    f"Holds in situation {number}",
                    "; ".join(sorted(words)),
                    "1 where the row holds there",
                    values,
                    "0",
                    FIXED,
                    None,
                    11,
                )
            )
        return columns


def _holds(row: LimitRow, words: frozenset[str]) -> bool:
    wanted = {word.strip().casefold() for word in row.situation.split(";") if word.strip()}
    return not wanted or bool(wanted & words)


def _times(factor: float) -> str:
    return "" if factor == 1.0 else f"*{factor!r}"


def _by_row(texts: Sequence[str]) -> list[tuple[str, BoolArray | None]]:
    """Give formulas that differ by row, each distinct text with the rows in which it stands."""
    return [(text, np.array([one == text for one in texts])) for text in dict.fromkeys(texts)]
