"""The settings table: name and value, in the units that the values carry."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any

from cant.errors import InputError, Place
from cant.files.grid import Sheet, Value
from cant.model.reading import ColumnReading, SheetReading
from cant.model.settings import EXCEPTIONAL_TIER, LARGEST_TOLERANCE_MM, METHODS, NORMAL_TIER, Settings
from cant.reading.headings import split_unit
from cant.reading.numbers import parse_number, parse_quantity
from cant.reading.records import find_header_row, is_example
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.words import lexicon
from cant.units import INCH_MM, MILE_KM, ratio, unit

DEGREE_ARC_FT = 100 * 180 / 3.141592653589793
"""Radius of a curve of one degree by the arc of 100 ft [ft]: 5729.578."""

US_CONSTANT = INCH_MM / MILE_KM**2 * DEGREE_ARC_FT * 0.3048
"""Metric constant of 1 in/(mph^2 deg) [mm, km/h, m]."""

_US_UNIT = re.compile(
    r"in(ches)?\s*/?\s*\(?\s*(mph|mi/h)\s*(\^?2|²)\s*[*·.\s]?\s*(deg(ree)?s?|°)\s*\)?", re.IGNORECASE
)
_METRIC_UNIT = re.compile(r"mm\s*[·*\s]?\s*m\s*/?\s*\(?\s*(km/h|kmh)\s*\)?\s*(\^?2|²)|", re.IGNORECASE)


def read_settings(
    sheet: Sheet, file: str, methods: Sequence[str] = METHODS
) -> tuple[Settings, SheetReading, list[ColumnReading]]:
    """Read a settings table: two columns, name and value.

    Parameters
    ----------
    sheet : Sheet
    file : str
    methods : sequence of str
        Names that ``Method`` may have.

    Raises
    ------
    InputError
        An unknown or repeated setting, a value that does not fit, no row.
    """
    place = Place(file, sheet.name)
    header, column = _find_columns(sheet)
    given: dict[str, tuple[Value, Place]] = {}
    for row in range(header + 1, len(sheet.rows) + 1):
        name, value = sheet.value(row, column), sheet.value(row, column + 1)
        if is_blank(name) or is_example(sheet.rows[row - 1]):
            continue
        words, bracket = split_unit(squeeze(shown(name)))
        known = _setting(words, place.at(row, column))
        if bracket and isinstance(value, float):
            value = f"{shown(value)} {bracket}"
        if known in given:
            message = f"the setting '{known}' is there twice; each belongs there once"
            raise InputError(message, place.at(row, column))
        given[known] = (value, place.at(row, column + 1))
    if not given:
        message = f"the settings table is empty; settings are {_known_settings()}"
        raise InputError(message, place)
    where = SheetReading(sheet.name, "settings", header, header + 1, len(sheet.rows), sheet.width)
    heading = [squeeze(shown(sheet.value(header, column + i))) if header else "" for i in (0, 1)]
    columns = [
        ColumnReading(sheet.name, column, heading[0], "Setting"),
        ColumnReading(sheet.name, column + 1, heading[1], "Value"),
    ]
    return settings_of(given, methods), where, columns


def settings_of(given: Mapping[str, tuple[Value, Place]], methods: Sequence[str] = METHODS) -> Settings:
    """Make settings from canonical names with values and their places; a blank value is the usual one."""
    fields: dict[str, Any] = {}
    for name, (value, place) in given.items():
        if is_blank(value):
            continue
        attribute, read = _READERS[name]
        fields[attribute] = read(squeeze(shown(value)), name, place, methods)
    return Settings(**fields)


def settings_from_mapping(given: Mapping[str, Any], methods: Sequence[str] = METHODS) -> Settings:
    """Make settings from a mapping of names (canonical, or those of :class:`Settings`) to values."""
    attributes = {fold(attribute): name for name, (attribute, _) in _READERS.items()}
    cells: dict[str, tuple[Value, Place]] = {}
    for key, value in given.items():
        name = attributes.get(fold(key.replace("_", " "))) or _setting(key, Place())
        plain = ", ".join(value) if isinstance(value, list | tuple) else value
        cells[name] = (plain if plain is None or isinstance(plain, str) else float(plain), Place())
    return settings_of(cells, methods)


def is_settings_sheet(sheet: Sheet) -> bool:
    """Whether a sheet's content is a settings table: at least two known settings below one another."""
    header, column = _find_columns(sheet)
    known = lexicon("settings")
    names = [sheet.value(row, column) for row in range(header + 1, min(len(sheet.rows), 40) + 1)]
    return sum(isinstance(n, str) and len(fold(n)) > 2 and fold(n) in known for n in names) >= 2


def _find_columns(sheet: Sheet) -> tuple[int, int]:
    header = find_header_row(sheet, "settings")
    if header is not None:
        for index, value in enumerate(sheet.rows[header - 1]):
            if isinstance(value, str) and fold(value) not in ("value",):
                return header, index
    for row, cells in enumerate(sheet.rows[:40], start=1):
        for index, value in enumerate(cells):
            if isinstance(value, str) and fold(value) in lexicon("settings"):
                return row - 1, index
    return 0, 0


def _known_settings() -> str:
    return ", ".join(_READERS)


def _setting(text: str, place: Place) -> str:
    found = lexicon("settings").get(fold(text))
    if found is None:
        message = f"the setting '{text}' is not known; settings are {_known_settings()}"
        raise InputError(message, place)
    return found


def _length(text: str, name: str, place: Place, methods: Sequence[str]) -> float:
    value, symbol = _amount(text, name, place)
    if symbol and unit(symbol).dimension != "length":
        message = f"'{text}' is no length; {name} is given in mm"
        raise InputError(message, place)
    result = value * ratio(symbol, "mm") if symbol else value
    low, high = (300.0, 3000.0) if name == "Rail spacing" else (0.0, LARGEST_TOLERANCE_MM)
    if not low <= result <= high:
        right = f"between {low:g} and {high:g} mm"
        message = f"'{text}' is not possible; {name} is {right}"
        raise InputError(message, place)
    return result


def _amount(text: str, name: str, place: Place) -> tuple[float, str]:
    found = parse_quantity(text)
    if found is None or found[2]:
        message = f"'{text}' is no number; {name} is a number"
        raise InputError(message, place)
    return found[0], found[1].symbol if found[1] else ""


def _share(text: str, name: str, place: Place, methods: Sequence[str]) -> float:
    value = parse_number(text.removesuffix("%").strip())
    result = value / 100 if value is not None and text.endswith("%") else value
    if result is None or not 0 < result <= 1:
        message = f"'{text}' is not possible; {name} is above 0 and at most 1, or a percentage"
        raise InputError(message, place)
    return result


def _constant(text: str, name: str, place: Place, methods: Sequence[str]) -> float:
    head, _, tail = text.partition(" ")
    value = parse_number(head)
    us = bool(_US_UNIT.fullmatch(tail.strip())) if tail else False
    if value is None or value <= 0 or not (us or _METRIC_UNIT.fullmatch(tail.strip())):
        message = (
            f"'{text}' is no {name}; it is a number such as 11.8 (mm, km/h, m), or 0.0007 in/(mph^2 deg)"
        )
        raise InputError(message, place)
    constant = value * US_CONSTANT if us else value
    if not 1 <= constant <= 40:
        message = (
            f"'{text}' gives the constant {constant:.4g}; for rail gauges it lies near 8 to 14 (mm, km/h, m)"
        )
        raise InputError(message, place)
    return constant


def _method(text: str, name: str, place: Place, methods: Sequence[str]) -> str:
    for method in methods:
        if fold(method) == fold(text):
            return method
    message = f"the method '{text}' is not known; methods are {', '.join(methods)}"
    raise InputError(message, place)


def _tiers(text: str, name: str, place: Place, methods: Sequence[str]) -> tuple[str, ...]:
    words = [w for w in re.split(r"[,;/+\s]+", text.casefold()) if w and w != "and"]
    if words == [NORMAL_TIER]:
        return (NORMAL_TIER,)
    if sorted(words) == sorted([NORMAL_TIER, EXCEPTIONAL_TIER]):
        return (NORMAL_TIER, EXCEPTIONAL_TIER)
    message = f"'{text}' is no choice of tiers; normal, or normal, exceptional"
    raise InputError(message, place)


def _units(text: str, name: str, place: Place, methods: Sequence[str]) -> str:
    word = fold(text)
    if word in ("metric", "us"):
        return word
    message = f"'{text}' is not known; Units is metric or us"
    raise InputError(message, place)


_READERS: dict[str, tuple[str, Any]] = {
    "Rail spacing": ("rail_spacing_mm", _length),
    "Equilibrium constant": ("equilibrium_constant", _constant),
    "Method": ("method", _method),
    "Tiers": ("tiers", _tiers),
    "Keep within": ("keep_within_mm", _length),
    "Maintenance allowance": ("maintenance_allowance_mm", _length),
    "Fraction of fastest": ("fraction_of_fastest", _share),
    "Underbalance": ("underbalance_mm", _length),
    "Today within": ("today_within_mm", _length),
    "Units": ("units", _units),
}
