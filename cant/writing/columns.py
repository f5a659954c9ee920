"""Which columns the plan adds to a curve sheet and which it shows on its own sheets: as data.

A column is a heading, the kind of number it holds, and where in a curve's record the value lies. The added
columns of the user's sheet, the plan sheet and the sheet of figures are all made from these lists; a new
column is one entry here.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from operator import methodcaller
from typing import Any, TypeAlias

from cant.model.display import Display
from cant.quantities.geometry import degree_from_radius

Cell: TypeAlias = float | str | None
Record: TypeAlias = dict[str, Any]

SAME_MM = 1e-6
"""Cants that differ by no more than this are the same."""


@dataclass(frozen=True, slots=True)
class Column:
    """One column made from records.

    Attributes
    ----------
    heading : str
        Without its unit.
    kind : str
        Kind of number (:class:`cant.model.display.Display`), "" for text.
    get : callable
        Takes a record and gives the canonical value, a text, or None.
    width : float
        In characters.
    help : str
        What the column holds, in one sentence.
    """

    heading: str
    kind: str
    get: Callable[[Record], Any]
    width: float = 10.0
    help: str = ""

    def title(self, display: Display) -> str:
        """Give the heading with the unit in which the column is shown."""
        unit = display[self.kind].unit if self.kind else ""
        return f"{self.heading} ({unit})" if unit else self.heading

    def number_format(self, display: Display) -> str | None:
        """Give the number format of the column, None for text."""
        return display[self.kind].number_format if self.kind else None


def row_maker(columns: Iterable[Column], display: Display) -> Callable[[Record], list[Cell]]:
    """Give a function that makes the cells of a row, all columns', from a record."""
    ways = [(column.get, display[column.kind].value if column.kind else None) for column in columns]

    def row(record: Record) -> list[Cell]:
        cells: list[Cell] = []
        for get, shown in ways:
            value = get(record)
            if shown is None:
                cells.append(None if value in (None, "") else str(value))
            else:
                cells.append(None if value is None else shown(float(value)))
        return cells

    return row


def path(*keys: str) -> Callable[[Record], Any]:
    """Give a getter that walks down a record by keys, None where one is missing."""
    if len(keys) == 1:
        return methodcaller("get", keys[0])

    def get(record: Record) -> Any:
        value: Any = record
        for key in keys:
            if value is None:
                return None
            value = value.get(key)
        return value

    return get


def governing(key: str) -> Callable[[Record], str | None]:
    """Give a getter of what governs a bound, in words: quantity, class, clause."""

    def get(record: Record) -> str | None:
        return governing_text(record.get(key))

    return get


def governing_text(by: dict[str, Any] | None) -> str | None:
    """Write what governs a bound or speed: ``cant excess, Freight (clause)``."""
    if not by:
        return None
    words = str(by["quantity"])
    if by.get("class"):
        words += f", {by['class']}"
    return f"{words} ({by['clause']})" if by.get("clause") else words


def change_mm(record: Record) -> float | None:
    """Give the change of cant from today's [mm], None where one of the two is not known."""
    new, old = record["recommended_cant_mm"], record["existing_cant_mm"]
    return None if new is None or old is None else new - old


def held_text(record: Record) -> str | None:
    """Say that the cant is held by hand, and why; None where the plan chose it."""
    held = record["cant_held"]
    if not held:
        return None
    return f"held by hand: {held['because']}" if held["because"] else "held by hand"


def rail_to_lift(record: Record) -> str | None:
    """Say which rail is lifted and on which side it lies; None where nothing changes."""
    change = change_mm(record)
    if change is None or abs(change) <= SAME_MM:
        return None
    return lifted_rail(change, record["hand"])


def lifted_rail(change: float, hand: str | None) -> str:
    """Say which rail is lifted: the outer one for more cant, the inner one for less."""
    outer = change > 0
    side = {"L": ("right", "left"), "R": ("left", "right")}.get(hand or "")
    words = "outer" if outer else "inner"
    return f"{words} ({side[0 if outer else 1]})" if side else words


def longest_needed(side: str) -> Callable[[Record], float | None]:
    """Give a getter of the length that one end needs, of ramp and transition the longer."""

    def get(record: Record) -> float | None:
        end = record["transitions"].get(side)
        if not end:
            return None
        lengths = [end[key] for key in ("ramp_needed_m", "transition_needed_m") if end[key] is not None]
        return max(lengths, default=None)

    return get


def findings_text(record: Record) -> str | None:
    """Give the sentences of a curve's findings, one a line."""
    return "\n".join(finding["text"] for finding in record["findings"]) or None


def options_text(record: Record) -> str | None:
    """Give what would help where nothing fits, one option a line."""
    return "\n".join(str(option["text"]) for option in record["options"]) or None


def of_class(name: str, key: str) -> Callable[[Record], Any]:
    """Give a getter of one figure of one class at the proposed cant; None where it does not run."""

    def get(record: Record) -> Any:
        for entry in record["classes"]:
            if entry["class"] == name:
                return entry[key]
        return None

    return get


PLACE: tuple[Column, ...] = (
    Column("Sheet", "", path("sheet"), 12, "Sheet of the curve list."),
    Column("Row", "count", path("row"), 6, "Row of the curve list."),
    Column("Line", "", path("line"), 20, "Line, as in the curve list."),
    Column("Track", "", path("track"), 8, "Track, as in the curve list."),
    Column("Curve", "", path("curve"), 10, "Name of the curve, as in the curve list."),
)

DECISION: tuple[Column, ...] = (
    Column("Proposed cant", "cant", path("recommended_cant_mm"), 10, "Cant to set."),
    Column(
        "Cant held",
        "",
        held_text,
        24,
        "Held by hand, by a decision of the engineer, and his reason; else blank.",
    ),
    Column("Change of cant", "cant", change_mm, 10, "Proposed cant less today's."),
    Column(
        "Rail to lift", "", rail_to_lift, 13, "A tamper lifts: the outer rail for more cant, else the inner."
    ),
    Column("Status", "", path("status"), 14, "What the proposal needs: see the sheet 'Terms and formulas'."),
    Column("Lower bound", "cant exact", path("lower_mm"), 10, "Lower bound of the curve's own cant."),
    Column("Lower bound set by", "", governing("lower_by"), 28, "Limit that makes the lower bound."),
    Column("Upper bound", "cant exact", path("upper_mm"), 10, "Upper bound of the curve's own cant."),
    Column("Upper bound set by", "", governing("upper_by"), 28, "Limit that makes the upper bound."),
    Column("Cant of today", "", path("today", "status"), 22, "Whether today's cant keeps the limits."),
)

NEEDED: tuple[Column, ...] = tuple(
    Column(
        f"Length needed, {side}",
        "length",
        longest_needed(side),
        10,
        f"Length that cant ramp and transition {side} need at planned speeds and normal limits.",
    )
    for side in ("in", "out")
)

WORDS: tuple[Column, ...] = (
    Column("Reason", "", path("reason"), 90, "Why this cant, in one sentence."),
    Column(
        "What would help", "", options_text, 60, "Options where nothing fits, the smallest departure first."
    ),
    Column("Findings", "", findings_text, 60, "What else an engineer should notice."),
)

GEOMETRY: tuple[Column, ...] = (
    Column("Radius", "radius", path("radius_m"), 9, "Radius as read."),
    Column("Hand", "", path("hand"), 6, "L or R, seen in the direction of the list."),
    Column("Cant today", "cant", path("existing_cant_mm"), 9, "Cant as it is today."),
    Column("Target cant", "cant exact", path("target_cant_mm"), 9, "Cant that the method aims at."),
    Column("rms speed", "speed exact", path("rms_speed_kmh"), 9, "Tonnage-weighted root-mean-square speed."),
    Column(
        "Equilibrium speed",
        "speed exact",
        path("equilibrium_speed_kmh"),
        11,
        "Speed without deficiency or excess.",
    ),
    Column("Tier", "", path("tier"), 11, "Normal, or exceptional where a normal limit is passed."),
)


def _degree(record: Record) -> float | None:
    """Give the degree of curve over a chord of 100 ft [deg]."""
    radius = record["radius_m"]
    if not radius:
        return None
    degree = float(degree_from_radius(radius, "100 ft chord"))
    return degree if math.isfinite(degree) else None


_DEGREE = Column("Degree of curve", "number", _degree, 9, "Over a chord of 100 ft, in degrees.")


def geometry_columns(display: Display) -> list[Column]:
    """Give the columns of a curve's geometry; in US units its degree too."""
    if display.units != "us":
        return list(GEOMETRY)
    return [GEOMETRY[0], _DEGREE, *GEOMETRY[1:]]


def class_columns(names: Iterable[str]) -> list[Column]:
    """Give the columns that each class of train adds to the curve sheet.

    Parameters
    ----------
    names : iterable of str
        Classes of the traffic table.
    """
    columns: list[Column] = []
    for name in names:
        columns += [
            Column(f"{name}: deficiency", "cant exact", of_class(name, "deficiency_mm"), 11),
            Column(f"{name}: excess", "cant exact", of_class(name, "excess_mm"), 11),
            Column(f"{name}: felt acceleration", "acceleration", of_class(name, "felt_acceleration_ms2"), 12),
            Column(f"{name}: permissible speed", "speed", of_class(name, "permissible_speed_kmh"), 12),
        ]
    return columns
