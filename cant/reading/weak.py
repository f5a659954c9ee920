"""Headings of one or two letters (R, D, E, h, p): decided by values, other columns and the language.

``D`` is a degree, a cant or a deficiency. What the values exclude is dropped, and what another column already
is; where two meanings remain, the file is asked about, never guessed.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from cant.files.grid import Value
from cant.model.curves import FloatArray
from cant.reading.cells import Numbers, take_column
from cant.reading.chainages import take_location
from cant.reading.columns import column
from cant.reading.degrees import take_degree
from cant.reading.headings import matches
from cant.reading.numbers import parse_number
from cant.reading.sheet_column import Column
from cant.reading.takers import take_cant, take_length, take_radius, take_speed, take_transition
from cant.reading.text import fold, is_blank, shown
from cant.reading.words import lexicon

LANGUAGE_FIRST: dict[tuple[str, str], str] = {
    ("d", "fr"): "Cant",
    ("e", "fr"): "Excess",
    ("e", "es"): "Excess",
    ("p", "es"): "Cant",
    ("p", "cs"): "Cant",
    ("h", "it"): "Cant",
    ("h", "pl"): "Cant",
    ("s", "pt"): "Cant",
    ("u", "de"): "Cant",
    ("e", "en"): "Cant",
    ("h", "no"): "Cant",
}
"""What a letter stands for in one language's trade, where the values leave more than one meaning open."""

_SAMPLE = 400


@dataclass(frozen=True)
class Doubt:
    """A column whose heading has two honest meanings left."""

    column: Column
    meanings: tuple[str, ...]


def settle_weak(columns: Sequence[Column], decimal: str, language: str) -> list[Doubt]:
    """Give every column with a weak heading its meaning, or leave it in doubt.

    Parameters
    ----------
    columns : sequence of Column
        With cells; those whose heading is weak are ``likely``.
    decimal : str
        Decimal mark of the sheet.
    language : str
        Language of most headings.
    """
    doubts: list[Doubt] = []
    open_ones = {id(c): _open_meanings(c) for c in columns}
    taken = Counter(c.meaning for c in columns if c.meaning and not c.train and not open_ones[id(c)])
    for item in columns:
        candidates = open_ones[id(item)]
        if not candidates:
            continue
        free = [m for m in candidates if not taken[m]]
        left = [m for m in free if _fits(m, item, columns, decimal)] or [
            m for m in free if _fits(m, _usable(item, m, decimal), columns, decimal)
        ]
        if "Degree" in left and not any(taken[m] for m in _GEOMETRY) and not _may_be_radius(columns, item):
            left = ["Degree"]
        if len(left) > 1:
            left = _preferred(item, left, language)
        if len(left) == 1:
            item.meaning = left[0]
            taken[left[0]] += 1
        elif left:
            item.meaning = ""
            doubts.append(Doubt(item, tuple(left)))
        else:
            item.note = "neither values nor other columns fit what the heading may mean"
            item.meaning = ""
    return doubts


_GEOMETRY = ("Radius", "Degree", "Versine", "Radius at start")


def _may_be_radius(columns: Sequence[Column], but: Column) -> bool:
    return any(c is not but and "Radius" in _open_meanings(c) for c in columns)


def _open_meanings(item: Column) -> list[str]:
    if item.note == "as told" or item.meaning == "" or item.train or item.confidence != "likely":
        return []
    found = matches(item.heading.words)
    if not found or found[0].score != 0.5:
        found = matches(item.heading.words.split()[-1]) if item.heading.words else ()
    weak = [m.meaning for m in found if m.score == 0.5]
    return weak if item.meaning in weak else []


def _usable(item: Column, meaning: str, decimal: str) -> Column:
    """Give the column with the cells alone that its meaning can use: a few bad ones must not hide it."""
    kind = column("curves", meaning).kind
    if kind in _LEXICONS:
        known = lexicon(_LEXICONS[kind])
        words = [c if (fold(shown(c)) or shown(c).strip()) in known else None for c in item.cells[:_SAMPLE]]
        return replace(item, cells=words) if any(words) else item
    taker = _TAKERS.get(kind)
    if taker is None:
        return item
    found = take_column(item.cells[:_SAMPLE], lambda text: taker(text, decimal))
    kept = [None if i in found.problems else cell for i, cell in enumerate(item.cells[:_SAMPLE])]
    return replace(item, cells=kept)


_LEXICONS = {"hand": "hands", "element": "elements", "shape": "shapes"}
_TAKERS = {
    "radius": take_radius,
    "degree": take_degree,
    "cant": take_cant,
    "length": take_length,
    "transition": take_transition,
    "transition_pair": take_transition,
    "speed": take_speed,
    "versine": take_length,
    "location": take_location,
}


def _preferred(item: Column, left: list[str], language: str) -> list[str]:
    letter = item.heading.words.split()[-1] if item.heading.words else ""
    if item.unit:
        dimension_fits = [m for m in left if column("curves", m).unit]
        left = dimension_fits or left
    if set(left) == {"Hand", "Track"}:
        return ["Hand"]
    first = LANGUAGE_FIRST.get((letter, language))
    if first in left:
        return [first]
    if set(left) <= {"Start", "End", "Transition start", "Transition end"}:
        return left[:1]
    return left


def _fits(meaning: str, item: Column, columns: Sequence[Column], decimal: str) -> bool:
    filled = [c for c in item.cells[:_SAMPLE] if not is_blank(c)]
    if not filled:
        return True
    if (
        item.unit
        and column("curves", meaning).unit
        and item.unit_from == "heading"
        and not _same_dimension(meaning, item)
    ):
        return False
    rule = _RULES.get(meaning)
    return rule is None or rule(filled, item, columns, decimal)


def _same_dimension(meaning: str, item: Column) -> bool:
    from cant.units import unit

    return unit(column("curves", meaning).unit).dimension == unit(item.unit).dimension


def _numbers(
    cells: Sequence[Value], taker: Callable[[str, str], object], decimal: str
) -> tuple[FloatArray, float]:
    found: Numbers = take_column(cells, lambda text: taker(text, decimal))  # type: ignore[arg-type,return-value]
    usable = ~np.isnan(found.values)
    states = len(found.states)
    return np.abs(found.values[usable]), (float(usable.sum()) + states) / max(len(cells), 1)


def _window(taker: Callable[[str, str], object], low: float, high: float) -> Callable[..., bool]:
    def rule(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
        values, share = _numbers(cells, taker, decimal)
        values = values[values > 0]
        return share >= 0.6 and (not len(values) or low <= float(np.median(values)) <= high)

    return rule


def _beside(meaning: str) -> Callable[..., bool]:
    """Make a rule for points of transitions: they lie beside the arc's ends, lengths do not."""

    def rule(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
        arc = next((c for c in columns if c.meaning == meaning and c is not item), None)
        if arc is None:
            return not _window(take_transition, 3, 400)(cells, item, columns, decimal)
        points = take_column(item.cells[:_SAMPLE], lambda t: take_location(t, decimal)).values
        ends = take_column(arc.cells[:_SAMPLE], lambda t: take_location(t, decimal)).values
        off = np.abs(points - ends)
        off = off[~np.isnan(off)]
        return bool(len(off)) and float(np.median(off)) <= (
            1.5 if float(np.nanmedian(ends)) < 2000 else 1500.0
        )

    return rule


def _degree(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
    if any(isinstance(c, str) and any(m in c for m in "°º") for c in cells):
        return True
    if not _window(take_degree, 0.05, 25)(cells, item, columns, decimal):
        return False
    radius = next((c for c in columns if c.meaning == "Radius" and c is not item), None)
    if radius is None:
        return True
    degrees = take_column(item.cells[:_SAMPLE], lambda t: take_degree(t, decimal)).values
    radii = np.abs(take_column(radius.cells[:_SAMPLE], lambda t: take_radius(t, decimal)).values)
    with np.errstate(invalid="ignore"):
        products = (radii * degrees)[~np.isnan(radii * degrees)]
    known = (1746.4, 1145.9, 5729.6, 86.81)
    return not len(products) or any(abs(float(np.median(products)) / k - 1) < 0.1 for k in known)


def _words(group: str) -> Callable[..., bool]:
    def rule(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
        known = lexicon(group)
        hits = sum((fold(shown(c)) or shown(c).strip()) in known for c in cells)
        return hits >= 0.6 * len(cells)

    return rule


def _name(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
    return len({shown(c) for c in cells}) >= 0.5 * len(cells)


def _line(cells: Sequence[Value], item: Column, columns: Sequence[Column], decimal: str) -> bool:
    return any(parse_number(shown(c)) is None for c in cells) or len({shown(c) for c in cells}) < 0.5 * len(
        cells
    )


_RULES: dict[str, Callable[..., bool]] = {
    "Radius": _window(take_radius, 8, 30_000),
    "Degree": _degree,
    "Cant": _window(take_cant, 0.5, 220),
    "Deficiency": _window(take_cant, 0.3, 320),
    "Excess": _window(take_cant, 0.3, 320),
    "Length": _window(take_length, 3, 10_000),
    "Transition": _window(take_transition, 3, 1500),
    "Transition in": _window(take_transition, 3, 1500),
    "Transition out": _window(take_transition, 3, 1500),
    "Speed": _window(take_speed, 8, 400),
    "Versine": _window(take_length, 0.3, 800),
    "Start": _window(take_location, 0, 1e9),
    "End": _window(take_location, 0, 1e9),
    "Transition start": _beside("Start"),
    "Transition end": _beside("End"),
    "Hand": _words("hands"),
    "Element": _words("elements"),
    "Shape": _words("shapes"),
    "Curve": _name,
    "Line": _line,
}
