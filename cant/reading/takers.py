"""How the text of one cell is taken, by the kind of its column: length, radius, cant, speed.

Chainages and degrees have notations of their own, see their modules.
"""

from __future__ import annotations

import re

import numpy as np

from cant.model.curves import LEFT, RIGHT
from cant.reading.cells import NONE, PAIR, STRAIGHT, Taken
from cant.reading.numbers import parse_quantity
from cant.reading.text import fold
from cant.reading.words import lexicon, meaning_of

_PAIR = re.compile(r"(?P<first>[^/|;]+?)\s*[/|;]\s*(?P<second>[^/|;]+)")
_HAND_BEHIND = re.compile(r"^(?P<body>.*\d.*?)[\s,(]+(?P<word>[^\W\d_]{1,10})\.?\)?$")
_HAND_BEFORE = re.compile(r"^(?P<word>[^\W\d_]{1,10})[\s.:,]+(?P<body>\S*\d.*)$")
HANDS = {"L": LEFT, "R": RIGHT}


def take_amount(text: str, decimal: str, dimension: str, what: str) -> Taken:
    """Read one number with or without its unit.

    Parameters
    ----------
    text : str
    decimal : str
        Decimal mark of the sheet, "" where it has not shown it.
    dimension : str
        Dimension that a unit in the cell must have.
    what : str
        What belongs there, for the message.
    """
    found = parse_quantity(text, decimal)
    if found is None:
        return Taken(problem=f"'{text}' is no {what}")
    value, unit, tail = found
    if unit is not None and unit.dimension != dimension:
        return Taken(problem=f"'{text}' is no {what}: its unit is a {unit.dimension}")
    if tail and not tail.startswith("("):
        return Taken(problem=f"'{text}' is no {what}: '{tail}' is no unit")
    return Taken(value=value, unit=unit.symbol if unit else "")


def take_length(text: str, decimal: str = "") -> Taken:
    """Read a length: ``250``, ``250 m``, ``820 ft``."""
    return take_amount(text, decimal, "length", "length")


def take_transition(text: str, decimal: str = "") -> Taken:
    """Read a length of transition or a pair of them: ``60``, ``80/70``, ``none``."""
    if meaning_of("nothing", text) == NONE:
        return Taken(value=0.0, state=NONE)
    single = take_length(text, decimal)
    if not single.problem:
        return single
    pair = _take_pair(text, decimal, take_transition_part)
    return pair if pair is not None else Taken(problem=f"'{text}' is no length of a transition")


def take_transition_part(text: str, decimal: str = "") -> Taken:
    """Read one side of a pair of transition lengths; a dash is a length not known."""
    if meaning_of("nothing", text) == NONE:
        return Taken(value=0.0)
    if text.strip() in ("-", "–", "?"):
        return Taken()
    return take_length(text, decimal)


def _take_pair(text: str, decimal: str, part: object) -> Taken | None:
    match = _PAIR.fullmatch(text) or re.fullmatch(
        r"(?P<first>[\d.,]+)\s*[-–+&]\s*(?P<second>[\d.,]+.*)", text
    )
    if match is None or not callable(part):
        return None
    first, second = part(match["first"].strip(), decimal), part(match["second"].strip(), decimal)
    if first.problem or second.problem:
        return None
    if first.unit and second.unit and first.unit != second.unit:
        return None
    return Taken(first.value, second.value, second.unit or first.unit, PAIR)


def take_radius(text: str, decimal: str = "") -> Taken:
    """Read a radius: ``650``, ``R=650``, ``650 m L``, ``-650``, ``∞``; two radii are kept as a pair."""
    if is_straight(text):
        return Taken(state=STRAIGHT)
    single = take_amount(text, decimal, "length", "radius")
    if not single.problem:
        return single
    if pair := _take_pair(text, decimal, take_length):
        return pair
    for pattern in (_HAND_BEHIND, _HAND_BEFORE):
        match = pattern.match(text)
        hand = meaning_of("hands", match["word"]) if match else None
        if match is not None and hand is not None:
            bare = take_amount(match["body"].strip(), decimal, "length", "radius")
            if not bare.problem:
                return Taken(bare.value, unit=bare.unit, hand=HANDS[hand])
    return Taken(problem=f"'{text}' is no radius; a number such as 650 belongs there")


def is_straight(text: str) -> bool:
    """Whether a text says straight track, in any of the usual words."""
    return (fold(text) or text.strip()) in lexicon("straight")


def take_cant(text: str, decimal: str = "") -> Taken:
    """Read a cant: ``110``, ``7,5 cm``, ``3 1/2"``, ``nil``; two cants are kept as a pair."""
    if meaning_of("nothing", text) == NONE:
        return Taken(value=0.0, state=NONE)
    single = take_amount(text, decimal, "length", "cant")
    if not single.problem:
        return single
    pair = _take_pair(text, decimal, take_length)
    return pair if pair is not None else single


_SPEED_LABEL = re.compile(
    r"^(?:psr|tsr|mps|vmax|v|max\.?|p|f|psgr|frt|pass)\s*[-=:. ]?\s*(?=\d)", re.IGNORECASE
)


def take_speed(text: str, decimal: str = "") -> Taken:
    """Read a speed: ``100``, ``60 mph``, ``PSR 60``, ``none``; ``100/80`` is kept as a pair."""
    if meaning_of("nothing", text) == NONE:
        return Taken(state=NONE)
    single = take_amount(_SPEED_LABEL.sub("", text), decimal, "speed", "speed")
    if not single.problem:
        return single
    pair = _take_pair(text, decimal, take_speed)
    return pair if pair is not None else single


def same(first: float, second: float, tolerance: float) -> bool:
    """Whether two numbers differ by no more than a share of the larger (nan equals nothing)."""
    return bool(np.isclose(first, second, rtol=tolerance, atol=0.0))
