"""Words in cells and headings (words.toml): hands, situations, elements, trains, totals, in all languages."""

from __future__ import annotations

import tomllib
from functools import cache
from importlib.resources import files

from cant.reading.text import fold


@cache
def _data() -> dict[str, dict[str, list[str]]]:
    return tomllib.loads(files("cant.reading").joinpath("words.toml").read_text(encoding="utf-8"))


@cache
def lexicon(group: str) -> dict[str, str]:
    """Give folded word -> meaning for one group of words.toml; of two meanings the first listed counts.

    A symbol that folding would lose (the infinity sign) is kept as it is.
    """
    found: dict[str, str] = {}
    for meaning, words in _data()[group].items():
        for word in words:
            found.setdefault(fold(word) or word.strip(), meaning)
    return found


@cache
def every_word() -> frozenset[str]:
    """Give the single folded words of all groups."""
    return frozenset(word for group in _data() for phrase in lexicon(group) for word in phrase.split())


@cache
def words_of(group: str, meaning: str) -> tuple[str, ...]:
    """Give the folded words of one meaning of a group."""
    return tuple(dict.fromkeys(fold(word) or word.strip() for word in _data()[group][meaning]))


def meaning_of(group: str, text: str) -> str | None:
    """Give the meaning of a cell's words in a group, or None where they are not known there."""
    return lexicon(group).get(fold(text) or text.strip())
