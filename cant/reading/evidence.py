"""What a sheet as a whole says about its units: the system its headings and cells speak, and its language."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from cant.reading.headings import DEGREES_MINUTES, MILES_CHAINS, MILES_YARDS, matches
from cant.reading.sheet_column import Column
from cant.reading.text import fold

IMPERIAL = frozenset({"in", "ft", "yd", "ch", "mi", "mph", MILES_CHAINS, MILES_YARDS})
METRIC = frozenset({"mm", "cm", "m", "km", "km/h"})
_IMPERIAL_TEXT = re.compile(r"\b(mph|inch(?:es)?|feet|chains?|mile(?:s|age|posts?)?|yards?)\b", re.IGNORECASE)
_METRIC_TEXT = re.compile(r"(?<![\w/])(km/h|kmh|kmph|metres|meters|mm|metric)(?!\w)", re.IGNORECASE)


@dataclass(frozen=True)
class Evidence:
    """What speaks for which system of units.

    Attributes
    ----------
    imperial, metric : frozenset of str
        Units (and words of titles) of each system that the sheet names.
    language : str
        Language that most headings are in, ``en`` where it cannot be told.
    """

    imperial: frozenset[str]
    metric: frozenset[str]
    language: str

    def with_imperial(self, unit: str) -> Evidence:
        """Give the same evidence with one more imperial unit."""
        return replace(self, imperial=self.imperial | {unit})

    @property
    def only_imperial(self) -> bool:
        """Whether feet, inches or miles are named and nothing metric is."""
        return bool(self.imperial) and not self.metric

    @property
    def only_metric(self) -> bool:
        """Whether nothing but the metric system is named, or the language knows no other."""
        return not self.imperial and (bool(self.metric) or self.language != "en")

    @property
    def counts_miles(self) -> bool:
        """Whether places are told in miles, or radii in chains."""
        return bool(self.imperial & {"mi", "ch", "mph", MILES_CHAINS, MILES_YARDS})


def gather(columns: Sequence[Column], texts: Iterable[str]) -> Evidence:
    """Gather what headings, unit rows and titles say.

    Parameters
    ----------
    columns : sequence of Column
    texts : iterable of str
        Titles, notes and legends.
    """
    named: set[str] = set()
    for item in columns:
        if item.meaning and item.unit:
            named.add(item.unit)
        if item.meaning and item.notation in (MILES_CHAINS, MILES_YARDS):
            named.add(item.notation)
        if item.notation == DEGREES_MINUTES:
            named.add("deg")
    imperial, metric = named & IMPERIAL, named & METRIC
    for text in texts:
        imperial |= {m.casefold() for m in _IMPERIAL_TEXT.findall(text)}
        metric |= {m.casefold() for m in _METRIC_TEXT.findall(text)}
    return Evidence(frozenset(imperial), frozenset(metric), language_of(columns))


def language_of(columns: Sequence[Column]) -> str:
    """Give the language that most headings are in, ``en`` where it cannot be told."""
    votes: dict[str, float] = {}
    for item in columns:
        found = {m.language for m in matches(item.heading.words) if m.score == 1.0 and m.language}
        found |= {m.language for m in matches(fold(item.heading.text)) if m.score == 1.0 and m.language}
        if found and "en" not in found:
            for language in found:
                votes[language] = votes.get(language, 0.0) + 1 / len(found)
        elif found == {"en"}:
            votes["en"] = votes.get("en", 0.0) + 1
    return max(votes, key=lambda language: votes[language]) if votes else "en"
