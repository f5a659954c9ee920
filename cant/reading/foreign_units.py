"""Units that people write over a column and the program does not reckon in.

A value in one of them would be read as if it were in metres, millimetres or km/h: cant in per mille of the
rail spacing, a speed in knots, a radius in rods. Such a heading is refused by name; everything else in
brackets is a remark.
"""

from __future__ import annotations

from collections.abc import Sequence

from cant.errors import InputError, Place
from cant.reading.columns import column
from cant.reading.sheet_column import Column
from cant.reading.text import fold
from cant.reading.words import every_word, meaning_of

_OF_THE_PLAN = ("Radius", "Cant", "Cant at most", "Cant at least", "Speed", "Length", "Start", "End")
_OF_ENDS = ("Transition", "Transition in", "Transition out", "Cant ramp", "Cant ramp in", "Cant ramp out")


def refuse_foreign_units(columns: Sequence[Column], place: Place) -> None:
    """Refuse a column whose heading names a unit that is not reckoned in, unless a person has told another.

    In a table whose headings are all canonical any word in brackets is a unit, unless it is a known remark.

    Parameters
    ----------
    columns : sequence of Column
        Decided and corrected.
    place : Place
        The last header row of the sheet.

    Raises
    ------
    InputError
        Naming the heading's cell, and a unit that would be right.
    """
    canonical = all(item.is_canonical for item in columns if item.meaning)
    for item in columns:
        if item.meaning not in _OF_THE_PLAN + _OF_ENDS or item.unit or item.notation:
            continue
        if named := _foreign_unit(item) or (canonical and _no_remark(item)):
            usual = column("curves", item.meaning).unit
            message = (
                f"the unit '{named}' of '{item.heading.text}' is not known here; one like {usual} belongs "
                "there, with the values in it, or tell the unit in a reading file"
            )
            raise InputError(message, place.at(place.row, item.index))


def _no_remark(item: Column) -> str:
    """Give what stands in brackets where a canonical heading has its unit, "" where it is a known word."""
    for bracket in item.heading.brackets:
        words = fold(bracket).split()
        if len(words) == 1 and words[0].isalpha() and words[0] not in every_word():
            return bracket
    return ""


def _foreign_unit(item: Column) -> str:
    """Give the unit that a heading without a usable one names, "" where it names none."""
    for bracket in item.heading.brackets:
        if meaning_of("foreign_units", bracket) is not None:
            return bracket
    # A known unit of another kind: the degree of a cant; beside a radius it is the degree of curve.
    return item.heading.unit if item.meaning in ("Cant", "Cant at most", "Cant at least") else ""
