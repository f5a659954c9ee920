"""Which traffic classes a speed column speaks of: by name, by category, or by the usual abbreviation."""

from __future__ import annotations

import re
from collections.abc import Callable
from functools import lru_cache

from cant.model.traffic import Traffic
from cant.reading.text import fold
from cant.reading.words import lexicon

_SPEED_WORDS = frozenset(lexicon("speed_words"))
_FILLERS = frozenset(lexicon("speed_fillers"))
_V_LETTER = re.compile(r"v[a-z]")
_GLUED = re.compile(r"^(?:vmax|v)([^\W\d_]{1,8})$")


@lru_cache(maxsize=2048)
def train_words(words: str) -> str:
    """Give what folded heading words say beyond "speed": ``vmax pas`` gives ``pas``, ``vgz`` gives ``gz``."""
    rest = [token for token in words.split() if token not in _SPEED_WORDS and token not in _FILLERS]
    if len(rest) == 1 and (glued := _GLUED.match(rest[0])) and known_train(glued[1]):
        return glued[1]
    joined = " ".join(rest)
    if not joined.isascii():
        for mark in ("vmax", "v", "速度", "最高", "允许"):
            joined = joined.removesuffix(mark).removeprefix(mark) or joined
    return joined.strip()


def says_speed(words: str) -> bool:
    """Whether folded heading words say "speed" in so many words."""
    if not words.isascii() and (words.endswith(("v", "vmax")) or "速度" in words):
        return True
    if len(words) > 2 and all(_V_LETTER.fullmatch(token) for token in words.split()):
        return True
    return any(token in _SPEED_WORDS for token in words.split()) or bool(
        words.startswith("v") and train_words(words) != words
    )


@lru_cache(maxsize=2048)
def known_train(words: str) -> str:
    """Give the category or kind of train that folded words name, "" where they name none."""
    for group in ("categories", "train_words"):
        if (found := lexicon(group).get(words)) is not None:
            return found
    tokens = words.split()
    for token in tokens:
        if len(token) > 1 and (found := lexicon("categories").get(token)) is not None:
            return found
    for token in tokens:
        if len(token) > 1 and (found := lexicon("train_words").get(token)) is not None:
            return found
    return ""


def names_only_trains(words: str) -> bool:
    """Whether words name a kind of train and nothing else: ``booked goods``, not ``goods tonnage``."""
    known = {*lexicon("categories"), *lexicon("train_words"), *_SPEED_WORDS, *_FILLERS}
    return bool(known_train(words)) and all(token in known for token in words.split())


def classes_meant(words: str, traffic: Traffic) -> list[str]:
    """Give the classes that folded words mean, see :func:`ranked_classes`."""
    return ranked_classes(words, traffic)[1]


def ranked_classes(words: str, traffic: Traffic) -> tuple[int, list[str]]:
    """Give the classes that folded words mean, the surest kind of agreement alone; none where none agree.

    Parameters
    ----------
    words : str
        From :func:`train_words`.
    traffic : Traffic

    Returns
    -------
    tuple of int, list of str
        How sure the agreement is, 0 for the class's own name, and the classes.
    """
    if not words:
        return 99, []
    categories = {row.name: row.category for row in traffic.rows}
    category, kind, meant = (
        lexicon("categories").get(words),
        lexicon("train_words").get(words),
        known_train(words),
    )
    steps: tuple[Callable[[str], bool], ...] = (
        lambda name: fold(name) == words,
        lambda name: _abbreviates(words, fold(name)),
        lambda name: fold(categories[name]) == words,
        lambda name: kind is not None and kind in _kinds(name),
        lambda name: (
            category is not None and category in (categories[name], lexicon("categories").get(fold(name)))
        ),
        lambda name: meant != "" and meant in {categories[name], *_kinds(name)},
    )
    for rank, agrees in enumerate(steps):
        if found := [name for name in traffic.class_names if agrees(name)]:
            return rank, found
    return 99, []


@lru_cache(maxsize=2048)
def _kinds(name: str) -> frozenset[str]:
    words = fold(name)
    kinds = lexicon("train_words")
    return frozenset(kinds[t] for t in (words, *words.split()) if len(t) > 1 and t in kinds)


def _abbreviates(short: str, name: str) -> bool:
    """Whether a word shortens a name: its beginning, its initials, or its consonants in order."""
    if len(short) < 2 or not short.isascii():
        return False
    if name.startswith(short) or short == "".join(token[0] for token in name.split()):
        return True
    return (
        len(name.split()) == 1
        and len(short) >= 3
        and short[0] == name[0]
        and short == _skeleton(name)[: len(short)]
    )


def _skeleton(name: str) -> str:
    return name[0] + "".join(c for c in name[1:] if c not in "aeiou")
