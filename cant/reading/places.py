"""Names of lines and tracks where they stand in titles, sheet names and rows between the curves."""

from __future__ import annotations

import re
from collections.abc import Iterable

from cant.reading.text import squeeze

_TRACK = re.compile(
    r"(?:^|[\s,;:(|/–-])(?P<name>(?:track|tracks|gleis|richtungsgleis|voie|v[ií]a|binario|tor|kolej|spor|spår|linha|via)"
    r"\s+(?:nr\.?|no\.?|n[.º°o]+|č\.?|#)?\s*(?:[0-9]{1,3}[a-z]?|[IVX]{1,4}|N|U|[A-Z]|pari|dispari|par|impar|ímpar|"
    r"ascendente|descendente|paire|impaire)(?![\w-]))",
    re.IGNORECASE,
)
_ENGLISH_TRACK = re.compile(
    r"(?:^|[\s,;:(|/–-])(?P<name>(?:up|down|dn|northbound|southbound|eastbound|westbound|main)"
    r"(?:\s+(?:main|slow|fast|relief|goods|loop|line|track|branch|through|[0-9]))?)(?=$|[\s,;:)|/–-])",
    re.IGNORECASE,
)
_LINE = re.compile(
    r"(?:^|[\s,;:(])(?P<name>(?:strecke|linia|linea|línea|l\.|linha|ligne|trecho|ramal|bane|bana|trať|branch|route|section|"
    r"tronçon|tramo|tratta|line|delstrekning|bandel|線名)\s*:?\s+[^,;|]{1,60}?)\s*(?=$|[,;|]|\s+(?:gleis|voie|tor|binario|vía)\b)",
    re.IGNORECASE,
)
_ENGLISH_LINE = re.compile(
    r"^\s*(?P<name>[A-Z][^,;|:]{1,50}?\s(?:line|branch|sub\.?|subdivision|railway))\b", re.IGNORECASE
)


def track_named(texts: Iterable[str]) -> str:
    """Give the track that a title names (``Gleis 1``, ``DOWN MAIN``), "" where none does."""
    for text in reversed(list(texts)):
        for pattern in (_TRACK, _ENGLISH_TRACK):
            if match := pattern.search(text):
                return squeeze(match["name"])
    return ""


def line_named(texts: Iterable[str]) -> str:
    """Give the line that a title names (``Strecke 9977 A - B``), "" where none does."""
    for text in texts:
        if len(text) > 90:
            continue
        if match := _LINE.search(text):
            return squeeze(match["name"])
        if match := _ENGLISH_LINE.match(text):
            return squeeze(match["name"])
    return ""


def is_track(text: str) -> bool:
    """Whether a short text is the name of a track and little else."""
    name = track_named([text])
    return bool(name) and len(squeeze(text)) <= len(name) + 12
