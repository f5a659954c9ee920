"""Answers and corrections of a person (``--reading FILE``): what the file itself does not settle.

The format, as JSON or TOML::

    {
      "answers": {"SHEET": {"HEADING": "CHOICE"}},
      "columns": {"SHEET": {"HEADING OR LETTER": {"meaning": "Radius", "unit": "ch"}}}
    }

``answers`` takes the text of a choice exactly as the question gives it, or a list of them where a column has
several questions. ``columns`` corrects a column: ``meaning`` is a canonical heading, ``Speed NAME``, or
``""`` (the bare text ``"ignore"`` as well) for a column that is not to be used; ``unit`` is a unit's symbol;
either may be left out. ``"*"`` as sheet stands for every sheet.
"""

from __future__ import annotations

import json
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from cant.errors import FileError, InputError, Place, column_letter
from cant.reading.columns import columns_of
from cant.reading.text import fold, squeeze
from cant.units import find_unit

ANY_SHEET = "*"
IGNORE = "ignore"


@dataclass(frozen=True)
class Correction:
    """What a person says about a column: None where nothing is said."""

    meaning: str | None = None
    unit: str | None = None


@dataclass(frozen=True)
class Answers:
    """Answers and corrections, by sheet and heading (folded: case and blanks do not matter).

    They remember what was asked for, so that an answer which fits nothing in the file can be told.
    """

    choices: dict[tuple[str, str], tuple[str, ...]] = field(default_factory=dict)
    corrections: dict[tuple[str, str], Correction] = field(default_factory=dict)
    _taken: set[tuple[str, str, str]] = field(default_factory=set, repr=False, compare=False)

    def choice(self, sheet: str, heading: str, choices: tuple[str, ...]) -> str | None:
        """Give the choice that was made among some, None where none was."""
        for key in _keys(sheet, heading):
            for given in self.choices.get(key, ()):
                for choice in choices:
                    if squeeze(choice).casefold() == squeeze(given).casefold():
                        self._taken.add((*key, given))
                        return choice
        return None

    def correction(self, sheet: str, heading: str, index: int) -> Correction | None:
        """Give the correction of a column, by heading or by letter."""
        for name in (heading, column_letter(index)):
            for key in _keys(sheet, name):
                if key in self.corrections:
                    self._taken.add((*key, ""))
                    return self.corrections[key]
        return None

    def not_used(self) -> list[str]:
        """Say which answers and corrections fitted no column and no question so far."""
        answers = [(*key, given) for key, texts in self.choices.items() for given in texts]
        corrections = [(*key, "") for key in self.corrections]
        return [
            (f"the answer '{given}'" if given else "the correction")
            + f" for the column '{heading}'"
            + ("" if sheet == ANY_SHEET else f" of sheet '{sheet}'")
            + " was not used: nothing in this file asks for it"
            for sheet, heading, given in answers + corrections
            if (sheet, heading, given) not in self._taken
        ]


def _keys(sheet: str, heading: str) -> tuple[tuple[str, str], ...]:
    name = squeeze(heading).casefold()
    return (sheet.casefold(), name), (ANY_SHEET, name)


def read_answers(data: bytes, file: str) -> Mapping[str, Any]:
    """Read a file of answers, JSON or TOML by content.

    Raises
    ------
    FileError
        Neither of the two.
    InputError
        An unknown key, meaning or unit, or a value of the wrong kind.
    """
    try:
        text = data.decode("utf-8-sig")
        found: Any = json.loads(text) if text.lstrip().startswith("{") else tomllib.loads(text)
    except (UnicodeDecodeError, ValueError) as error:
        message = f"answers are JSON or TOML in UTF-8, and this is neither ({error})"
        raise FileError(message, Place(file)) from None
    if not isinstance(found, dict):
        message = "answers are an object with 'answers' and 'columns'"
        raise FileError(message, Place(file))
    answers_from(found, file)
    return found


def answers_from(given: Mapping[str, Any] | None, file: str = "") -> Answers:
    """Check answers and corrections and make them ready for use.

    Raises
    ------
    InputError
        An unknown key, meaning or unit, or a value of the wrong kind.
    """
    if not given:
        return Answers()
    place = Place(file)
    if unknown := set(given) - {"answers", "columns"}:
        message = f"'{sorted(unknown)[0]}' is no part of a reading file; it has 'answers' and 'columns'"
        raise InputError(message, place)
    choices: dict[tuple[str, str], tuple[str, ...]] = {}
    for sheet, heading, value in _entries(given.get("answers", {}), "answers", place):
        texts = [value] if isinstance(value, str) else value
        if not isinstance(texts, list | tuple) or not all(isinstance(t, str) for t in texts):
            message = f"the answer for '{heading}' is the text of a choice, or a list of them"
            raise InputError(message, place)
        choices[(sheet.casefold(), squeeze(heading).casefold())] = tuple(texts)
    corrections = {
        (sheet.casefold(), squeeze(heading).casefold()): _correction(heading, value, place)
        for sheet, heading, value in _entries(given.get("columns", {}), "columns", place)
    }
    return Answers(choices, corrections)


def _entries(given: Any, part: str, place: Place) -> list[tuple[str, str, Any]]:
    if not isinstance(given, Mapping) or not all(isinstance(v, Mapping) for v in given.values()):
        message = f"'{part}' holds sheets, and each sheet its headings"
        raise InputError(message, place)
    return [(str(sheet), str(heading), value) for sheet, by in given.items() for heading, value in by.items()]


def _correction(heading: str, value: Any, place: Place) -> Correction:
    if value == IGNORE:
        return Correction(meaning="")
    if (
        not isinstance(value, Mapping)
        or set(value) - {"meaning", "unit"}
        or not all(isinstance(v, str) for v in value.values())
    ):
        message = f"the correction of '{heading}' is 'ignore', or has 'meaning' and 'unit', both texts"
        raise InputError(message, place)
    return Correction(
        _meaning(heading, value.get("meaning"), place), _unit(heading, value.get("unit"), place)
    )


def _meaning(heading: str, given: str | None, place: Place) -> str | None:
    if given is None or given == "":
        return given
    if given.casefold().startswith("speed "):
        return "Speed " + squeeze(given)[6:]
    for info in columns_of("curves", helpers=True):
        if fold(info.name) == fold(given):
            return info.name
    known = ", ".join(c.name for c in columns_of("curves", helpers=True))
    message = f"the meaning '{given}' of '{heading}' is not known; meanings are {known}, Speed NAME"
    raise InputError(message, place)


def _unit(heading: str, given: str | None, place: Place) -> str | None:
    if given is None:
        return None
    found = find_unit(given)
    if found is None:
        message = (
            f"the unit '{given}' of '{heading}' is not known; units are such as mm, in, m, ch, ft, km/h, mph"
        )
        raise InputError(message, place)
    return found.symbol
