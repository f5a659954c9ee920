"""Situation words: those that the limits in use name, and the usual words of the trade in many languages."""

from __future__ import annotations

import re
from collections.abc import Iterable, Set

from cant.model.curves import PLAIN
from cant.model.limits import LimitSet
from cant.reading.text import fold
from cant.reading.words import lexicon


def canonical_situation(text: str) -> str:
    """Give one situation word, lower case with single blanks; a trade word of any language in English."""
    word = " ".join(text.casefold().split())
    return lexicon("trade_situations").get(fold(text), word)


def known_situations(limits: LimitSet | None) -> frozenset[str]:
    """Give the situation words that a curve may carry: those of the limits, and the trade's."""
    named: Iterable[str] = ()
    if limits is not None:
        named = (*(row.situation for row in limits.rows if row.situation), *limits.situations)
    return frozenset({word.casefold() for word in named} | set(lexicon("trade_situations").values()))


def read_situations(text: str, known: frozenset[str]) -> tuple[frozenset[str], tuple[str, ...]]:
    """Read the words of a cell.

    Parameters
    ----------
    text : str
        Words separated by ``;`` (a comma or slash serves where the whole is no word of its own).
    known : frozenset of str
        From :func:`known_situations`.

    Returns
    -------
    tuple of frozenset of str, tuple of str
        The words, ``{"plain"}`` where there are none, and those that are not known.
    """
    words: set[str] = set()
    unknown: list[str] = []
    for part in (p.strip() for p in text.split(";")):
        if not part:
            continue
        pieces = [part] if _known(part, known) else [p for p in re.split(r"[,/+&\n]", part) if p.strip()]
        for piece in pieces:
            word = _known(piece, known)
            if word is None:
                unknown.append(piece.strip())
            else:
                words.add(word)
    if len(words) > 1:
        words.discard("plain")
    return frozenset(words) or PLAIN, tuple(unknown)


def _known(piece: str, known: frozenset[str]) -> str | None:
    word = " ".join(piece.casefold().split())
    if word in known:
        return word
    trade = canonical_situation(piece)
    return trade if trade in known else None


def situations_in(text: str, wanted: Set[str]) -> frozenset[str]:
    """Give the wanted situation words that a free text names as whole words, in any language."""
    tokens = fold(text).split()
    found: set[str] = set()
    for size in (1, 2, 3):
        for at in range(len(tokens) - size + 1):
            phrase = " ".join(tokens[at : at + size])
            word = phrase if phrase in wanted else lexicon("trade_situations").get(phrase)
            if word in wanted and word is not None:
                found.add(word)
    return frozenset(found)
