"""The hand of every curve: from words, and from signs of radius and cant where the file says what they mean.

A bare sign says nothing: some railways count left-hand curves positive, some right-hand ones. A legend, a
heading or a few rows with both sign and word settle it; nothing else does.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np

from cant.model.curves import LEFT, RIGHT
from cant.reading.draft import Draft
from cant.reading.sheet_column import Column
from cant.reading.takers import HANDS
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.words import lexicon, meaning_of

NEGATIVE_RIGHT, NEGATIVE_LEFT = "negative is right-hand", "negative is left-hand"
_CHOICES = (NEGATIVE_RIGHT, NEGATIVE_LEFT)
_PLUS = r"(?P<plus>\+|positive|pos\.?|plus|positif|positivo|positiv)"
_MINUS = r"(?P<minus>[-−–]|negative|neg\.?|minus|négatif|negativo|negativ|<\s*0)"
_SIGN = re.compile(
    rf"(?:{_PLUS}|{_MINUS})[\s=:(]*(?:is|are|R|radius|means|für|pour)?[\s=:(]*(?P<word>[^\W\d_]{{1,12}})",
    re.IGNORECASE,
)
_WORD_SIGN = re.compile(
    rf"(?P<word>[^\W\d_]{{1,12}})[\s=:(]*(?:is|are)?[\s=:(]*(?:{_PLUS}|{_MINUS})(?![\d\w])", re.IGNORECASE
)


def settle_hands(draft: Draft) -> None:
    """Set the hand of every row, and make radius and cant free of signs that only repeat it."""
    _from_words(draft)
    signs, item = _signs(draft)
    if item is not None:
        _from_signs(draft, signs, item)
    draft.numbers["radius_m"] = np.abs(draft.numbers["radius_m"])
    _free_cant(draft)


def _from_words(draft: Draft) -> None:
    item = draft.column("Hand")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        text = squeeze(shown(cell))
        if is_blank(cell) or text in ("+", "-"):
            continue
        found = meaning_of("hands", text)
        if found is None:
            draft.fail(index, item, f"'{text}' is no hand; L or R belongs there")
        else:
            draft.hand[index] = HANDS[found]


def _signs(draft: Draft) -> tuple[np.ndarray, Column | None]:
    """Give the signs that stand for hands (0 for none) and the column that has them."""
    radius = draft.numbers["radius_m"]
    with np.errstate(invalid="ignore"):
        signs = np.where(radius < 0, -1, np.where(radius > 0, 1, 0))
    if (signs < 0).any():
        item = draft.column("Radius") or draft.column("Degree") or draft.column("Versine")
        return signs, item
    item = draft.column("Hand")
    if item is not None:
        bare = np.array(
            [{"+": 1, "-": -1, "−": -1}.get(squeeze(shown(c)), 0) for c in item.cells], dtype=np.int64
        )
        if (bare != 0).sum() >= 2 and (bare < 0).any() and (bare > 0).any():
            return bare, item
    return signs, _signed_cant(draft, signs)


def _signed_cant(draft: Draft, signs: np.ndarray) -> Column | None:
    """Tell cants whose sign is the hand's: no other column says the hand, and both signs are common."""
    if draft.hand.any():
        return None
    cant = draft.numbers["cant_mm"]
    with np.errstate(invalid="ignore"):
        below, above = int((cant < 0).sum()), int((cant > 0).sum())
    if min(below, above) < 0.2 * (below + above) or not below:
        return None
    with np.errstate(invalid="ignore"):
        signs[:] = np.sign(np.nan_to_num(cant)).astype(np.int64)
    return draft.column("Cant")


def _from_signs(draft: Draft, signs: np.ndarray, item: Column) -> None:
    if ((draft.hand != 0) & (signs != 0)).any():
        _beside_words(draft, signs, item)
        return
    turn = sign_rule([item.heading.text, *draft.block.title])
    if turn == 0:
        answer = draft.context.answers.choice(draft.sheet, item.heading.text, _CHOICES)
        turn = {NEGATIVE_RIGHT: 1, NEGATIVE_LEFT: -1, None: 0}[answer]
    if turn == 0:
        where = [int(i) for i in np.flatnonzero(signs != 0)]
        draft.ask(
            item,
            "Values carry a sign and nothing says which hand it means: positive is left-hand in some lists "
            "and right-hand in others. Which is it?",
            _CHOICES,
            where,
        )
        return
    draft.hand[:] = np.where(signs == 0, draft.hand, np.where(signs * turn > 0, LEFT, RIGHT))


def _beside_words(draft: Draft, signs: np.ndarray, item: Column) -> None:
    """Let hands in words say what the signs mean, and refuse the rows whose sign says otherwise."""
    plus, minus = _share_of_left(draft, signs, 1), _share_of_left(draft, signs, -1)
    turn = 0
    if (np.isnan(plus) or plus >= 0.8) and (np.isnan(minus) or minus <= 0.2):
        turn = 1
    elif (np.isnan(plus) or plus <= 0.2) and (np.isnan(minus) or minus >= 0.8):
        turn = -1
    known = (draft.hand != 0) & (signs != 0)
    wrong = known & (draft.hand != turn * signs) if turn else known & (signs < 0)
    for index in np.flatnonzero(wrong):
        draft.fail(int(index), item, "the sign contradicts the hand that the row names")
    if turn:
        fillable = (draft.hand == 0) & (signs != 0)
        draft.hand[fillable] = np.where(turn * signs[fillable] > 0, LEFT, RIGHT)


def _share_of_left(draft: Draft, signs: np.ndarray, sign: int) -> float:
    hands = draft.hand[(signs == sign) & (draft.hand != 0)]
    return float((hands == LEFT).mean()) if len(hands) else np.nan


def _free_cant(draft: Draft) -> None:
    """Take the sign off cants where it only repeats the hand; else it stays: the outer rail is the lower."""
    cant = draft.numbers["cant_mm"]
    with np.errstate(invalid="ignore"):
        both = (cant != 0) & ~np.isnan(cant)
        below = both & (cant < 0)
    if not below.any() or draft.canonical:
        return
    item = draft.column("Cant")
    if item is not None and item.confidence == "asked":
        draft.numbers["cant_mm"] = np.abs(cant)
        return
    hands = draft.hand.astype(np.int64)
    radius_item = draft.column("Radius")
    if not hands.any() and radius_item is not None and radius_item.confidence == "asked":
        draft.numbers["cant_mm"] = np.abs(cant)
        return
    usable = both & (hands != 0)
    if not usable.any():
        return
    signs = np.sign(np.nan_to_num(cant)).astype(np.int64)
    agree = float((hands[usable] == signs[usable]).mean())
    if (agree >= 0.9 or agree <= 0.1) and below.sum() >= 2 and (both & (cant > 0)).sum() >= 1:
        draft.numbers["cant_mm"] = np.abs(cant)
        if item is not None:
            item.note = item.note or "its sign repeats the hand"


def sign_rule(texts: Iterable[str]) -> int:
    """Tell from legends what a sign means: 1 where positive is left-hand, -1 right-hand, 0 not said."""
    words = lexicon("hands")
    for text in texts:
        for pattern in (_SIGN, _WORD_SIGN):
            for match in pattern.finditer(text):
                hand = words.get(fold(match["word"]))
                if hand is not None:
                    positive = 1 if match["plus"] else -1
                    return positive if hand == "L" else -positive
    return 0
