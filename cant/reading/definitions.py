"""Symbols that a legend explains: ``V1 = passenger trains, h = cant in mm, lp: transition length``."""

from __future__ import annotations

import re
from collections.abc import Iterable

from cant.reading.text import fold, squeeze
from cant.units import find_unit

_DEFINED = re.compile(
    r"(?:^|[,;.(]\s*)(?P<symbol>[^\W\d_]{1,4}\d?)\s*(?:=|:)\s*(?P<words>[^\W\d_][^,;=()]{2,60})"
)
_IN_UNIT = re.compile(r"\s+(?:in|en|em|w|v|i)\s+(?P<unit>[^\s]+)\.?$", re.IGNORECASE)


def definitions(texts: Iterable[str]) -> dict[str, str]:
    """Give what titles and legends say of short symbols: folded symbol to words, a unit in brackets."""
    found: dict[str, str] = {}
    for text in texts:
        if len(text) > 400 or ("=" not in text and ":" not in text):
            continue
        for match in _DEFINED.finditer(text):
            words = squeeze(match["words"]).rstrip(".")
            unit = _IN_UNIT.search(words)
            if unit is not None and find_unit(unit["unit"]) is not None:
                words = f"{words[: unit.start()]} ({unit['unit']})"
            found.setdefault(fold(match["symbol"]), words)
    return found
