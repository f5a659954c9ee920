"""Which rows of a block are curves: sets apart headers, straights, stations, totals, legends, examples.

No row vanishes without a word: what is set apart is named in the notes, and a row in doubt stays a curve.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from cant.files.grid import Sheet, Value
from cant.reading.cells import take_column
from cant.reading.degrees import take_degree
from cant.reading.headers import heading_score
from cant.reading.layout import Block
from cant.reading.sheet_column import Column
from cant.reading.takers import is_straight, take_length, take_radius
from cant.reading.text import fold, is_blank, is_text, shown, squeeze
from cant.reading.words import lexicon, meaning_of

GEOMETRY: dict[str, Callable[[str, str], object]] = {
    "Radius": take_radius,
    "Degree": take_degree,
    "Versine": take_length,
    "Radius at start": take_radius,
    "Radius at end": take_radius,
}
"""Columns of which one makes a row a curve."""

_FIGURES = frozenset(
    {
        "Radius",
        "Degree",
        "Versine",
        "Length",
        "Transition in",
        "Transition out",
        "Transition",
        "Cant",
        "Speed",
    }
)


@dataclass
class Sifted:
    """What the rows of a block are.

    Attributes
    ----------
    curves : list of int
        Positions of the rows that are curves, or that should be.
    sections : list of (int, str)
        Rows that only name a place, line or track: position and text.
    straights, totals, headers, legends, parents : list of int
        Positions of rows set apart.
    """

    curves: list[int] = field(default_factory=list)
    sections: list[tuple[int, str]] = field(default_factory=list)
    straights: list[int] = field(default_factory=list)
    totals: list[int] = field(default_factory=list)
    headers: list[int] = field(default_factory=list)
    legends: list[int] = field(default_factory=list)
    parents: list[int] = field(default_factory=list)

    def notes(self, rows: np.ndarray, sheet: str, element_list: bool) -> list[str]:
        """Say in words which rows were set apart."""
        where = f"sheet '{sheet}', " if sheet else ""
        kinds = (
            ("straight track, no curve", [] if element_list else self.straights),
            ("names a place or section, no curve", [i for i, _ in self.sections]),
            ("a sum or mean, no curve", self.totals),
            ("heads the parts of a compound curve that follow, no curve itself", self.parents),
            ("the header again", self.headers),
            ("text below or between the table, no curve", self.legends),
        )
        return [
            f"{where}{_row_list([int(rows[i]) for i in found])}: {what}" for what, found in kinds if found
        ]


def _row_list(rows: list[int]) -> str:
    shown_rows = ", ".join(str(r) for r in rows[:12]) + (
        f" and {len(rows) - 12} more" if len(rows) > 12 else ""
    )
    return f"row{'s' if len(rows) > 1 else ''} {shown_rows}"


def sift(block: Block, columns: list[Column], decimal: str, elements: bool) -> Sifted:
    """Tell the curves of a block from all other rows.

    Parameters
    ----------
    block : Block
    columns : list of Column
        With their cells; every column has the same length.
    decimal : str
        Decimal mark of the sheet.
    elements : bool
        True where each row is an element: then straights are kept as rows.
    """
    count = max((len(c.cells) for c in columns), default=0)
    sure = np.zeros(count, dtype=np.bool_)
    straight = np.zeros(count, dtype=np.bool_)
    for item in columns:
        if item.meaning in GEOMETRY:
            _geometry(item, decimal, sure, straight)
    straight &= ~sure
    if elements and (kinds := next((c for c in columns if c.meaning == "Element"), None)) is not None:
        known = lexicon("elements")
        sure |= np.array([isinstance(c, str) and fold(c) in known for c in kinds.cells], dtype=np.bool_)
    result = Sifted()
    totals = _totals(columns)
    last = int(np.flatnonzero(sure | straight)[-1]) if (sure | straight).any() else -1
    for index in range(count):
        if index in totals:
            result.totals.append(index)
        elif sure[index] or (straight[index] and (elements or _says_curve(columns, index))):
            result.curves.append(index)
        else:
            _place(result, block, columns, index, bool(straight[index]), index > last)
    _set_parents_apart(result, columns, sure)
    return result


def _says_curve(columns: list[Column], index: int) -> bool:
    """Whether a row without curvature has a hand or a cant: then its radius is a mistake, not a straight."""
    for item in columns:
        cell = item.cells[index]
        if item.meaning == "Cant" and isinstance(cell, int | float) and cell != 0:
            return True
        if item.meaning == "Hand" and isinstance(cell, str) and _names_hand(cell):
            return True
    return False


def _names_hand(cell: str) -> bool:
    """Whether a cell names a hand beyond doubt: a bare G or S may say straight."""
    return meaning_of("hands", cell) is not None and (len(cell.strip()) > 2 or fold(cell) in ("l", "r"))


def _set_parents_apart(result: Sifted, columns: list[Column], sure: np.ndarray) -> None:
    """Set apart a row ``12`` without radius whose parts ``12a``, ``12b`` follow as rows of their own."""
    names = next((c for c in columns if c.meaning == "Curve"), None)
    if names is None or not result.curves:
        return
    texts = [squeeze(shown(names.cells[i])).casefold() for i in result.curves]
    parents = {
        at
        for at, (index, text) in enumerate(zip(result.curves, texts, strict=True))
        if not sure[index]
        and text
        and at + 1 < len(texts)
        and re.fullmatch(re.escape(text) + r"[\s./-]?[a-h1-9i]+", texts[at + 1])
    }
    result.parents = [result.curves[at] for at in sorted(parents)]
    result.curves = [index for at, index in enumerate(result.curves) if at not in parents]


def _geometry(item: Column, decimal: str, sure: np.ndarray, straight: np.ndarray) -> None:
    taker = GEOMETRY[item.meaning]
    numbers = take_column(item.cells, lambda text: taker(text, decimal))  # type: ignore[arg-type,return-value]
    with np.errstate(invalid="ignore"):
        sure |= np.abs(numbers.values) > 0
        straight |= numbers.values == 0
    for index, state in numbers.states.items():
        if state == "straight":
            straight[index] = True
        elif state == "pair":
            sure[index] = True
    for index, cell in enumerate(item.cells) if numbers.problems else ():
        if index in numbers.problems and any(c.isdigit() for c in shown(cell)) and len(shown(cell)) < 25:
            sure[index] = True


def _totals(columns: list[Column]) -> frozenset[int]:
    words = lexicon("totals")
    found: set[int] = set()
    for item in (c for c in columns[:5] if c.meaning not in ("Line", "Track", "Remarks")):
        verdicts: dict[str, bool] = {}
        for index, cell in enumerate(item.cells):
            if isinstance(cell, str) and cell[:2].strip().isalpha():
                if cell not in verdicts:
                    verdicts[cell] = _is_total(cell, words)
                if verdicts[cell]:
                    found.add(index)
    return frozenset(found)


def _is_total(text: str, words: dict[str, str]) -> bool:
    if any(c.isdigit() for c in text.split(maxsplit=1)[0]):
        return False
    tokens = fold(text).split()
    for size in (3, 2, 1):
        if " ".join(tokens[:size]) in words and len(tokens) >= size:
            return all(token.isdigit() or token in _COUNTED for token in tokens[size:])
    return False


_COUNTED = frozenset(
    [
        "curve",
        "curves",
        "length",
        "of",
        "km",
        "m",
        "courbes",
        "courbe",
        "longueur",
        "curvas",
        "longitud",
        "curve",
        "sviluppo",
        "bogen",
        "kurven",
        "lange",
        "oblouky",
        "oblouku",
        "luki",
        "lukow",
        "kurver",
        "kurvor",
        "radius",
        "cant",
        "page",
        "pages",
        "sheet",
        "track",
        "line",
        "section",
    ]
)


def _place(
    result: Sifted, block: Block, columns: list[Column], index: int, straight: bool, after: bool
) -> None:
    filled = [c for c in columns if not is_blank(c.cells[index])]
    texts = [squeeze(str(c.cells[index])) for c in filled if is_text(c.cells[index])]
    figures = [c for c in filled if c.meaning in _FIGURES and _is_figure(c.cells[index])]
    placed = [c for c in filled if c.meaning in ("Start", "End", "Transition start", "Transition end")]
    if _is_header(block, columns, index):
        result.headers.append(index)
    elif straight or any(is_straight(t) for t in texts):
        result.straights.append(index)
    elif _is_named(filled, index) and len(filled) >= 2 and not after:
        result.curves.append(index)
    elif not figures and len(filled) <= 2 and len(placed) <= 2 and texts:
        if after and len(placed) == 0 and not _is_place(texts[0]):
            result.legends.append(index)
        else:
            result.sections.append((index, " ".join(texts)))
    elif not figures and not placed and (after or all(is_text(c.cells[index]) for c in filled)):
        result.legends.append(index)
    elif filled:
        result.curves.append(index)


def _is_named(filled: list[Column], index: int) -> bool:
    """Whether a row carries the number of a curve, so that its missing radius is a fault and no intent."""
    name = next((c.cells[index] for c in filled if c.meaning == "Curve"), None)
    return name is not None and len(shown(name)) <= 12 and any(c.isdigit() for c in shown(name))


def _is_figure(value: Value) -> bool:
    return isinstance(value, float | int) or (is_text(value) and str(value).strip()[:1].isdigit())


def _is_place(text: str) -> bool:
    return len(text) <= 30 and not re.match(r"^(\*|note|remark|legend|\d+\)|\(\d)", text, re.IGNORECASE)


def _is_header(block: Block, columns: list[Column], index: int) -> bool:
    same = texts = 0
    score = 0.0
    for item, source in zip(columns, block.columns, strict=False):
        cell = item.cells[index]
        if is_text(cell):
            texts += 1
            text = squeeze(str(cell))
            same += any(fold(text) == fold(part) for part in source.parts) or text == source.unit_row
            score += heading_score(text)
        elif not is_blank(cell):
            return False
    return texts >= 2 and (same >= 0.6 * texts or score >= 0.75 * texts)


def fill_merged(sheet: Sheet, rows: Sequence[int], columns: list[Column]) -> None:
    """Give all cells of a merged range the value of its first: down the rows, and over both transitions."""
    position = {row: i for i, row in enumerate(rows)}
    for area in sheet.merged:
        inside = [position[r] for r in range(area.first_row, area.last_row + 1) if r in position]
        over = [c for c in columns if area.first_column <= c.index <= area.last_column]
        sisters = len(over) == 2 and {c.meaning for c in over} in _SISTERS
        if not inside or (area.last_row == area.first_row and not sisters):
            continue
        value = sheet.value(area.first_row, area.first_column)
        for item in over:
            if item.index == area.first_column or sisters or area.first_column == area.last_column:
                cells = list(item.cells)
                for index in inside:
                    cells[index] = value
                item.cells = cells


_SISTERS = ({"Transition in", "Transition out"}, {"Cant ramp in", "Cant ramp out"})
