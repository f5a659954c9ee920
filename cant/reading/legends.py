"""Units that a title or a legend names: "radii in metres, cant in mm", "Speeds in mph, chainages in km"."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

from cant.reading.columns import column, strong_headings, weak_headings
from cant.reading.headings import MILES_CHAINS, MILES_YARDS, analyse
from cant.reading.sheet_column import Column
from cant.reading.text import fold
from cant.reading.words import lexicon
from cant.units import find_unit, unit

_UNIT_WORD = (
    r"mm|cm|m|km|metres?|meters?|millimetres?|millimeters?|kilometres?|kilometers?|feet|ft|inches|inch|chains?|miles"
    r"|yards?|km/h|kmh|kmph|mph|metern?|millimetern?|zoll|mètres?|millimètres?|metros?|milímetros?|metri|millimetri"
    r"|metrach|milimetrach|metrech"
)
_SAID = re.compile(
    rf"(?P<what>[^\W\d_][^\W\d_.]*(?:\s+[^\W\d_.]+){{0,2}})\s*(?:\(|:|=|\b(?:is|are|all|sind|sont|sono|são|son)?\s*"
    rf"(?:in|en|em|w|v|i)\b)\s*(?P<unit>{_UNIT_WORD})(?![\w/])",
    re.IGNORECASE,
)
_FAMILIES: tuple[tuple[str, ...], ...] = (
    ("Start", "End", "Transition start", "Transition end"),
    ("Radius", "Radius at start", "Radius at end"),
    ("Cant", "Design cant", "Proposed cant", "Cant at most", "Cant at least", "Cant at start", "Cant at end"),
    ("Transition", "Transition in", "Transition out", "Cant ramp in", "Cant ramp out", "Length"),
    ("Speed",),
    ("Versine",),
    ("Chord",),
)


def units_said(texts: Iterable[str]) -> dict[str, str]:
    """Give the unit of each meaning that titles and legends name.

    Parameters
    ----------
    texts : iterable of str

    Returns
    -------
    dict of str to str
        Canonical heading to the symbol of a unit; whole families (both transitions, all speeds) together.
    """
    found: dict[str, str] = {}
    for text in texts:
        for match in _SAID.finditer(text):
            symbol = _symbol(match["unit"])
            for meaning in _meanings(match["what"]):
                if symbol and unit(symbol).dimension == unit(column("curves", meaning).unit).dimension:
                    family = next((f for f in _FAMILIES if meaning in f), (meaning,))
                    found.update(dict.fromkeys(family, symbol))
    return found


def _symbol(word: str) -> str:
    known = find_unit(lexicon("unit_words").get(fold(word), word))
    return known.symbol if known else ""


def _meanings(what: str) -> list[str]:
    tokens = fold(what).split()
    for size in range(min(3, len(tokens)), 0, -1):
        phrase = " ".join(tokens[-size:])
        for word in (phrase, phrase.removesuffix("s"), phrase.removesuffix("es"), phrase.removesuffix("en")):
            strong = [m for m, _ in strong_headings("curves").get(word, ())]
            weak = [m for m in weak_headings("curves").get(word, ()) if len(word) > 3]
            known = [m for m in (*strong, *weak) if column("curves", m).unit]
            if known:
                return known[:1]
    return []


def apply_legends(columns: Sequence[Column], texts: Iterable[str]) -> None:
    """Give columns without a unit the one that a title or legend names for them."""
    said = units_said(texts)
    for item in columns:
        if item.meaning in said and not item.unit and item.notation not in (MILES_CHAINS, MILES_YARDS):
            item.unit, item.unit_from = said[item.meaning], "legend"


def notation_said(texts: Iterable[str]) -> str:
    """Give the notation of chainages that a title names (``in miles.chains``), "" where none does."""
    for text in texts:
        for match in re.finditer(r"\bm(?:iles)?[.,/ &]+(?:chains|ch|yards|yds)\b", text, re.IGNORECASE):
            taken = analyse(f"x ({match.group()})")
            if taken.notation in (MILES_CHAINS, MILES_YARDS):
                return taken.notation
    return ""
