"""What a column means because of its neighbours or values, where its own heading says too little."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

from cant.files.grid import Value
from cant.reading.numbers import parse_number
from cant.reading.sheet_column import Column
from cant.reading.text import fold, is_blank
from cant.reading.trains import known_train
from cant.reading.words import lexicon
from cant.units import unit


def hand_by_values(columns: list[Column]) -> None:
    """Take a column of nothing but hands for the hand, where no heading names one."""
    if any(c.meaning == "Hand" for c in columns):
        return
    known = lexicon("hands")
    for item in columns:
        texts = [fold(c) for c in item.cells[:2000] if isinstance(c, str) and not is_blank(c)]
        hits = [known[t] for t in texts if t in known]
        if not item.meaning and len(set(hits)) == 2 and len(hits) >= 0.8 * len(texts) - 1:
            item.meaning, item.confidence, item.note = "Hand", "likely", "by its values"
            return


def continue_speeds(columns: list[Column]) -> None:
    """Let short unknown headings right of a speed column go on with its row: ``V rango A | B | C``."""
    for left, item in pairwise(columns):
        words = item.heading.words
        unsure = not item.meaning or item.confidence == "likely"
        if left.meaning != "Speed" or not left.train or not words or not unsure or len(words) > 8:
            continue
        if item.unit and unit(item.unit).dimension != "speed":
            continue
        if _like_speeds(item.cells):
            item.meaning, item.train, item.train_name = "Speed", words, item.heading.text
            item.confidence, item.note = "likely", "goes on with the speeds left of it"
            if not item.unit:
                item.unit, item.unit_from = left.unit, left.unit_from and "other columns"


def _like_speeds(cells: Sequence[Value]) -> bool:
    values = [
        c for c in cells[:500] if isinstance(c, float) or (isinstance(c, str) and parse_number(c) is not None)
    ]
    numbers = [v if isinstance(v, float) else parse_number(v) or 0.0 for v in values]
    return (
        bool(numbers)
        and all(10 <= v <= 350 for v in numbers)
        and sum(v % 5 == 0 for v in numbers) >= 0.8 * len(numbers)
    )


def bracketed_trains(columns: list[Column]) -> None:
    """Take the train from brackets: ``V (AUT)``, ``V (MERC)``."""
    lines = [c for c in columns if c.meaning == "Speed" and not c.train and c.heading.brackets]
    for item in lines:
        content = item.heading.brackets[-1]
        words = fold(content)
        if "/" not in content and words and (known_train(words) or len(lines) > 1):
            item.train, item.train_name = words, content
