"""The units of a user's own sheet: its added columns speak as the columns beside them do.

A list may state cant in centimetres or inches while the plan is shown in millimetres; on that sheet the added
columns follow the list.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from cant.model.display import Display, Shown
from cant.model.reading import ColumnReading
from cant.units import UNITS, ratio

_MEANINGS: dict[str, tuple[str, ...]] = {
    "Cant": ("cant", "cant exact"),
    "Speed": ("speed", "speed exact"),
    "Transition in": ("length",),
}
"""Kinds of number that follow the unit of a column."""

_DECIMALS = {"mm": 0, "cm": 1, "m": 1, "in": 2, "ft": 0, "km/h": 0, "mph": 0}


@dataclass(frozen=True, slots=True)
class OwnUnits(Display):
    """A display in which some kinds of number follow a sheet.

    Attributes
    ----------
    own : tuple of (str, Shown)
        The kinds that differ from the plan's units.
    """

    own: tuple[tuple[str, Shown], ...] = ()

    def __getitem__(self, kind: str) -> Shown:
        """Give how a kind of number is shown on the sheet."""
        for name, shown in self.own:
            if name == kind:
                return shown
        return Display(self.units)[kind]


def units_of_sheet(display: Display, columns: Iterable[ColumnReading], sheet: str) -> OwnUnits:
    """Find the units in which a sheet speaks.

    Parameters
    ----------
    display : Display
        Units of the plan.
    columns : iterable of ColumnReading
        How the file was read.
    sheet : str
    """
    own: dict[str, Shown] = {}
    for column in columns:
        if column.sheet != sheet or column.unit not in _DECIMALS:
            continue
        for kind in _MEANINGS.get(column.meaning, ()):
            shown = display[kind]
            if column.unit == shown.unit or UNITS[column.unit].dimension != UNITS[shown.unit].dimension:
                continue
            canonical = Display()[kind].unit
            decimals = _DECIMALS[column.unit] + (kind.endswith("exact") and column.unit != "in")
            own.setdefault(kind, Shown(column.unit, ratio(canonical, column.unit), decimals))
    return OwnUnits(display.units, tuple(own.items()))
