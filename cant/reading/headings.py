"""What a heading says: its words, its unit, the notation of a chainage, the chord of a versine.

Knows headings alone; what the values look like is the business of :mod:`cant.reading.meanings`.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

from cant.reading.columns import strong_headings, weak_headings
from cant.reading.text import fold, squeeze
from cant.reading.words import words_of
from cant.units import find_unit

MILES_CHAINS, MILES_YARDS, DEGREES_MINUTES = "miles.chains", "miles.yards", "degrees-minutes"
"""Notations of numbers that a heading can name."""

_BRACKETS = re.compile(r"[(\[{]([^()\[\]{}]*)[)\]}]")
_NOTATIONS = (
    (re.compile(r"m(?:i|iles?)?[.,: &-]+(?:ch|chs|chains?|c)\.?", re.IGNORECASE), MILES_CHAINS),
    (re.compile(r"m(?:i|iles?)?[.,: &-]+(?:yds?|yards?|y)\.?", re.IGNORECASE), MILES_YARDS),
    (re.compile(r"d(?:eg)?[ .:-]+m(?:in)?(?:[ .:-]+s(?:ec)?)?", re.IGNORECASE), DEGREES_MINUTES),
)
_CHORD = re.compile(
    r"(?:(?:c|corda|chord|corde|cuerda|sehne|base)\s*[/=]?\s*)?"
    r"(?<![\w.,])(\d{1,3}(?:[.,]\d+)?)\s*[- ]?(m|ft|feet|'|′)(?!\w)"
    r"(?:\s*(?:chord|sehne|corde|cuerda|corda|c(?=\W|$)))?",
    re.IGNORECASE,
)
_CHORD_METRES = re.compile(r"^(?:v|g|f|c)\s?(5|6|10|20|30)$", re.IGNORECASE)
_BARE_UNIT = re.compile(
    r"(?<![\w/])(mm|cm|km/h|kmh|kmph|kph|km/hr|mph|ft|feet|inches|inch|ins|chains|chs|yards|yds|yd|metres|meters|‰)(?![\w/])\.?",
    re.IGNORECASE,
)
_LAST_UNIT = re.compile(r"(?<=[\w.] )(m|km|ch|ft)\.?$", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Heading:
    """A heading taken apart.

    Attributes
    ----------
    text : str
        As the user wrote it, rows of a stacked header joined by a blank.
    words : str
        Folded words without unit and notation.
    unit : str
        Symbol of the unit it names, "" where none.
    notation : str
        One of the notations above, "" where none.
    chord_m : float or None
        Chord that it names [m].
    brackets : tuple of str
        What else stands in brackets: ``A/B``, ``L/R``, ``applied``.
    unknown_unit : str
        What stands in the last brackets, where it is neither unit nor notation nor word of a heading.
    """

    text: str
    words: str
    unit: str = ""
    notation: str = ""
    chord_m: float | None = None
    brackets: tuple[str, ...] = ()
    unknown_unit: str = ""


@lru_cache(maxsize=4096)
def split_unit(heading: str) -> tuple[str, str]:
    """Split a heading into its words and what stands in brackets at its end, "" where nothing does.

    ``Radius (m)`` gives ``("Radius", "m")``.
    """
    text = squeeze(heading)
    match = re.search(r"^(.*?)\s*[(\[{]([^()\[\]{}]*)[)\]}]$", text)
    if match is None or not match[1]:
        return text, ""
    return match[1], match[2].strip()


@lru_cache(maxsize=4096)
def analyse(text: str) -> Heading:
    """Take a heading apart."""
    whole = squeeze(text)
    unit = notation = ""
    chord: float | None = None
    others: list[str] = []
    for content in (squeeze(c) for c in _BRACKETS.findall(whole)):
        found = find_unit(content)
        mark = _notation(content)
        length = _chord(content) if found is None and not mark else None
        if found is not None:
            unit = unit or found.symbol
        elif mark:
            notation = mark
        elif length is not None:
            chord = length
            inner = _BARE_UNIT.search(_CHORD.sub(" ", content))
            unit = unit or (_symbol(inner[1]) if inner else "")
        elif content:
            others.append(content)
            inner = _BARE_UNIT.search(content)
            unit = unit or (_symbol(inner[1]) if inner else "")
    rest = squeeze(_BRACKETS.sub(" ", whole)).strip("=: ")
    rest, outer_unit, notation, chord = _outside(rest, notation, chord)
    return Heading(whole, fold(rest), unit or outer_unit, notation, chord, tuple(others))


def _symbol(text: str) -> str:
    found = find_unit(text)
    return found.symbol if found else ""


def _notation(text: str) -> str:
    for pattern, name in _NOTATIONS:
        if pattern.fullmatch(text):
            return name
    return ""


def _chord(text: str) -> float | None:
    match = _CHORD.search(text)
    if match is None:
        short = _CHORD_METRES.match(text.strip())
        return float(short[1]) if short else None
    value = float(match[1].replace(",", "."))
    return value if match[2].casefold() == "m" else value * 0.3048


def _outside(rest: str, notation: str, chord: float | None) -> tuple[str, str, str, float | None]:
    unit = ""
    for pattern, name in _NOTATIONS:
        if match := re.search(rf"(?<!\w){pattern.pattern}(?!\w)", rest, re.IGNORECASE):
            if (
                name == DEGREES_MINUTES
                and "deg" not in match.group().casefold()
                and rest[:1].casefold() != "d"
            ):
                continue
            notation = notation or name
            if name != DEGREES_MINUTES:
                rest = rest[: match.start()] + " " + rest[match.end() :]
            break
    if chord is None:
        chord = _chord(rest)
        rest = _CHORD.sub(" ", rest)
    if match := _BARE_UNIT.search(rest):
        unit = _symbol(match[1])
        rest = rest[: match.start()] + " " + rest[match.end() :]
    elif (match := _LAST_UNIT.search(rest)) and not _ends_known(rest):
        unit = _symbol(match[1])
        rest = rest[: match.start()]
    if find_unit("mph") and re.search(r"(?<!\w)(MP|mileage|milepost)(?!\w)", rest, re.IGNORECASE):
        unit = unit or "mi"
    elif re.search(r"(?<!\w)(km|Km|KM|PK|Kp|TP km)(?!\w)", rest) and not unit:
        unit = "km"
    return squeeze(rest), unit, notation, chord


def _ends_known(rest: str) -> bool:
    return fold(rest) in strong_headings("curves") or fold(rest) in weak_headings("curves")


@dataclass(frozen=True, slots=True)
class Match:
    """A meaning that a heading may have, with how much of the heading speaks for it (0 to 1)."""

    meaning: str
    score: float
    language: str = ""


@lru_cache(maxsize=4096)
def matches(words: str, table: str = "curves") -> tuple[Match, ...]:
    """Give the meanings that folded words may have, the best first; none where they are not known."""
    if not words:
        return ()
    strong = strong_headings(table)
    if words in strong:
        return tuple(Match(meaning, 1.0, language) for meaning, language in strong[words])
    found: dict[str, Match] = {}
    for name in weak_headings(table).get(words, ()):
        found[name] = Match(name, 0.5)
    without_place = " ".join(token for token in words.split() if token not in _PLACE)
    if without_place != words:
        for name in weak_headings(table).get(without_place, ()):
            if name in ("Start", "End"):
                found.setdefault(name, Match(name, 0.5))
    tokens = [token for token in words.split() if token not in _STOP]
    weight = max(1, sum(token not in _GENERIC for token in tokens))
    for phrase, size in _phrases(tokens):
        for meaning, language in strong.get(phrase, ()):
            own = sum(token not in _GENERIC for token in phrase.split())
            score = min(0.9, 0.9 * size / weight) if own else 0.9 * size / (len(tokens) + 1)
            if meaning not in found or score > found[meaning].score:
                found[meaning] = Match(meaning, score, language)
    if not found:
        found = _inside(words, strong) or _shortened(words, table) or _in_compound(tokens, strong)
    if "Length" in found and any(name.startswith(("Transition", "Cant ramp")) for name in found):
        del found["Length"]
    if len(found) > 1:
        found.pop("Curve", None)
    return tuple(sorted(found.values(), key=lambda m: -m.score))


_PLACE, _STOP, _GENERIC = (frozenset(words_of("little_words", kind)) for kind in ("place", "stop", "generic"))


def _phrases(tokens: list[str]) -> list[tuple[str, int]]:
    count = len(tokens)
    return [
        (" ".join(tokens[i : i + size]), size)
        for size in range(count, 0, -1)
        for i in range(count - size + 1)
        if size > 1 or len(tokens[i]) > 2
    ]


def _in_compound(tokens: list[str], strong: dict[str, tuple[tuple[str, str], ...]]) -> dict[str, Match]:
    """Find a heading inside a long compound: ``streckengeschwindigkeit``, ``overgangskurvelaengde``."""
    hits = [
        key for t in tokens if len(t) >= 9 for key in strong if len(key) >= 6 and " " not in key and key in t
    ]
    best = max(hits, key=len, default="")
    return {m: Match(m, 0.6, lang) for m, lang in strong[best]} if best else {}


def _shortened(words: str, table: str) -> dict[str, Match]:
    """Understand a shortened heading where every known heading of one word that starts so agrees."""
    if " " in words or len(words) < 4:
        return {}
    longer = {key: [m for m, _ in found] for key, found in strong_headings(table).items()}
    longer |= {key: [*longer.get(key, ()), *names] for key, names in weak_headings(table).items()}
    hits = {m for key, names in longer.items() if key.startswith(words) and " " not in key for m in names}
    return {m: Match(m, 0.6) for m in hits} if len(hits) == 1 else {}


def _inside(words: str, strong: dict[str, tuple[tuple[str, str], ...]]) -> dict[str, Match]:
    if words.isascii():
        return {}
    compact = words.replace(" ", "")
    hits = [key for key in strong if not key.isascii() and len(key) > 1 and key in compact]
    best = max(hits, key=len, default="")
    return {m: Match(m, 0.6, lang) for m, lang in strong[best]} if best else {}
