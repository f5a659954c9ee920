"""Speed columns: the line's, one for each class of train, and several speeds in one cell.

A cell ``100/80`` is taken apart where the heading names what stands on each side of the stroke, or where the
traffic leaves one reading; else it is asked about.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cant.errors import InputError, Place
from cant.files.grid import Value
from cant.model.curves import DOES_NOT_RUN, FloatArray
from cant.reading.cells import NONE, PAIR, Numbers, take_column
from cant.reading.draft import Draft
from cant.reading.headings import analyse, split_unit
from cant.reading.sheet_column import Column
from cant.reading.takers import take_speed
from cant.reading.text import fold, is_blank, is_text, squeeze
from cant.reading.trains import classes_meant, known_train, ranked_classes
from cant.units import find_unit

PASSENGER_FREIGHT = "first passenger, second freight"
LINE_OTHER = "the first is the line speed"


def speed_numbers(draft: Draft, item: Column) -> Numbers:
    """Read the numbers of a speed column as they stand."""
    return take_column(item.cells, lambda text: take_speed(text, draft.decimal))


def name_classes(draft: Draft) -> None:
    """Let ``Speed NAME`` be the speed of the class of just that name, whatever else its words may say."""
    traffic = draft.context.traffic
    names = {fold(name) for name in traffic.class_names} if traffic else set()
    for item in draft.columns:
        text = squeeze(item.heading.text)
        words, bracket = split_unit(text)
        whole = words if not bracket or find_unit(bracket) is not None else text
        if text.casefold().startswith("speed ") and fold(whole[6:]) in names and item.note != "as told":
            item.meaning, item.literal, item.confidence, item.note = "Speed", True, "certain", ""
            item.train = item.train_part = fold(whole[6:])
            item.train_name = whole[6:].strip()


def split_speed_columns(draft: Draft) -> None:
    """Take columns of ``100/80`` apart into one column a speed, where it is known whose each is."""
    for item in [c for c in draft.columns if c.meaning == "Speed"]:
        parts = _most_parts(item.cells)
        if parts < 2:
            continue
        names = _names(draft, item, parts)
        if names is None:
            continue
        for position, name in enumerate(names):
            draft.columns.append(_part(item, position, name))
        if "" not in names and not item.train and any(_alone(c) for c in item.cells):
            draft.columns.append(_lone(item))
        item.meaning, item.note = (
            "",
            "several speeds in a cell: " + ", ".join(n or "line speed" for n in names),
        )


def _most_parts(cells: Sequence[Value]) -> int:
    counts = [
        str(c).count("/") + 1
        for c in dict.fromkeys(c for c in cells if is_text(c))
        if any(d.isdigit() for d in str(c)) and "h/" not in str(c) and "/h" not in str(c)
    ]
    return max(counts, default=1)


def _names(draft: Draft, item: Column, parts: int) -> list[str] | None:
    """Give whose speed stands in each place, None where it is asked."""
    for bracket in item.heading.brackets:
        named = [squeeze(p) for p in bracket.split("/")]
        if len(named) == parts:
            return _with_base(draft, item, named)
    tail = [squeeze(p) for p in item.heading.text.split("/")]
    letters = {fold(t).removeprefix("v") for t in tail}
    if parts == 2 and len(tail) == 2 and (known_train(fold(tail[1])) or letters <= set(_LETTERS)):
        first = " ".join(tail[0].split()[-1:])
        return [first, tail[1]]
    if parts != 2:
        return None
    choices = (PASSENGER_FREIGHT, LINE_OTHER)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer == LINE_OTHER:
        return ["", "second speed"]
    if answer == PASSENGER_FREIGHT or _only_passenger_and_freight(draft, item):
        return ["passenger", "freight"]
    where = [i for i, c in enumerate(item.cells) if is_text(c) and "/" in str(c)]
    draft.ask(
        item,
        f"Two speeds stand in one cell ({squeeze(str(item.cells[where[0]]))}) and nothing says whose. Which?",
        choices,
        where,
    )
    return None


def _with_base(draft: Draft, item: Column, named: list[str]) -> list[str]:
    traffic = draft.context.traffic
    if not item.train or traffic is None or all(classes_meant(fold(n), traffic) for n in named):
        short = bool(item.train) and traffic is None
        return [f"{item.train_name} {n}" if short and len(fold(n)) < 3 else n for n in named]
    return [f"{item.train_name} {n}" for n in named]


def _only_passenger_and_freight(draft: Draft, item: Column) -> bool:
    traffic = draft.context.traffic
    if traffic is None or {row.category for row in traffic.rows} != {"passenger", "freight"}:
        return False
    numbers = speed_numbers(draft, item)
    pairs = [i for i, state in numbers.states.items() if state == PAIR]
    return all(numbers.values[i] >= numbers.second[i] for i in pairs)


def _part(item: Column, position: int, name: str) -> Column:
    cells: list[Value] = []
    for cell in item.cells:
        pieces = str(cell).split("/") if is_text(cell) else []
        if len(pieces) > 1:
            cells.append(squeeze(pieces[position]) if position < len(pieces) else None)
        else:
            cells.append(cell if item.train or not name else None)
    return _speed_column(item, name, cells, "one of several in a cell")


def _alone(cell: Value) -> bool:
    return not is_blank(cell) and not (is_text(cell) and "/" in str(cell))


def _lone(item: Column) -> Column:
    """Give the cells with one speed: the line's, no train goes faster than its own for it."""
    cells = [cell if _alone(cell) else None for cell in item.cells]
    return _speed_column(item, "", cells, "where one speed stands in a cell")


def _speed_column(item: Column, name: str, cells: list[Value], note: str) -> Column:
    heading = replace(analyse(item.heading.text), brackets=())
    return Column(
        item.index,
        heading,
        "Speed",
        item.unit,
        item.unit_from,
        train=fold(name),
        train_name=name,
        confidence="likely",
        note=note,
        cells=cells,
    )


def settle_speeds(draft: Draft) -> None:
    """Turn speed columns into the line's speed and those of the classes."""
    _letters_are_categories(draft)
    _lone_speed_is_the_lines(draft)
    ranked: dict[str, tuple[int, int]] = {}
    for item in draft.columns:
        if item.meaning != "Speed":
            continue
        values = _kilometres_an_hour(draft, item)
        if not item.train:
            draft.numbers["speed_kmh"] = values
            continue
        sure, names = classes_of(draft, item)
        rank = (sure, len(names))
        if names and draft.context.traffic and [fold(n) for n in names] != [fold(item.train_name)]:
            item.note = "; ".join(filter(None, (item.note, "speed of " + ", ".join(names))))
        for name in names:
            if name in ranked and rank == ranked[name]:
                _note_rival(draft, item, name, values)
            if name not in ranked or rank < ranked[name]:
                draft.class_speeds[name], ranked[name] = values.copy(), rank


_LETTER = re.compile(r"v?[a-z]")
_LETTERS = {
    "p": "passenger",
    "r": "passenger",
    "f": "freight",
    "g": "freight",
    "t": "freight",
    "n": "freight",
}


def _letters_are_categories(draft: Draft) -> None:
    """Take two speeds ``P`` and ``F`` (``Vp`` and ``Vt``) for passenger and freight."""
    traffic = draft.context.traffic
    trains = [c for c in draft.columns if c.meaning == "Speed" and _LETTER.fullmatch(c.train)]
    letters = [c.train.removeprefix("v") if len(c.train) == 2 else c.train for c in trains]
    meant = [_LETTERS.get(letter) for letter in letters]
    if sorted(str(m) for m in meant) != ["freight", "passenger"] or (
        "p" not in letters and "r" not in letters
    ):
        return
    own = {*letters, *(c.train for c in trains)}
    if traffic and any(fold(name) in own for name in traffic.class_names):
        return
    for item, category in zip(trains, meant, strict=True):
        item.train, item.note = str(category), f"{category}, beside the other letter"


def _lone_speed_is_the_lines(draft: Draft) -> None:
    """Take the one speed column whose words name no train for the line's, where the list has no other."""
    if draft.column("Speed") is not None:
        return
    traffic = draft.context.traffic
    strange = [
        c
        for c in draft.columns
        if c.meaning == "Speed"
        and not c.literal
        and not known_train(c.train)
        and not (traffic and (classes_meant(c.train, traffic) or classes_meant(c.train_part, traffic)))
    ]
    if len(strange) == 1 and len(strange[0].train) > 2:
        item = strange[0]
        item.train = item.train_name = ""
        item.confidence, item.note = "likely", "names no train: taken for the line's speed"


def _kilometres_an_hour(draft: Draft, item: Column) -> FloatArray:
    numbers = speed_numbers(draft, item)
    values = numbers.converted(item.unit or "km/h", "km/h")
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)
    for index, state in numbers.states.items():
        if state == NONE and item.train:
            values[index] = DOES_NOT_RUN
        elif state == NONE:
            draft.fail(index, item, "none is no line speed; a number belongs there, or nothing")
        elif state == PAIR:
            values[index] = np.nan
            if index not in draft.problems:
                draft.fail(index, item, "two speeds stand in one cell; give each its own column")
    if item.train:
        with np.errstate(invalid="ignore"):
            negative = [int(i) for i in np.flatnonzero(values < 0)]
        for index in (i for i in negative if numbers.states.get(i) != NONE):
            draft.fail(index, item, "a speed is 0 or more; none where the class does not run")
            values[index] = np.nan
    return values


def classes_of(draft: Draft, item: Column) -> tuple[int, list[str]]:
    """Give the traffic classes that a speed column speaks of; its own name where there is no traffic.

    Returns
    -------
    tuple of int, list of str
        How sure the agreement is, 0 the surest, and the classes.

    Raises
    ------
    InputError
        ``Speed NAME`` for a class that the traffic lacks.
    """
    traffic = draft.context.traffic
    if traffic is None:
        return 0, [item.train_name]
    exact = [name for name in traffic.class_names if item.train_part and fold(name) == item.train_part]
    if exact:
        return 0, exact
    sure, found = ranked_classes(item.train, traffic)
    if found:
        return sure, found
    if item.literal:
        place = Place(draft.context.file, draft.sheet, draft.block.header_last, item.index)
        known = ", ".join(traffic.class_names)
        message = f"'{item.heading.text}' names a class that the traffic lacks; its classes are {known}"
        raise InputError(message, place)
    item.note = f"no class of the traffic is called '{item.train_name}'; not used"
    item.confidence = "likely"
    draft.context.notes.append(f"column '{item.heading.text}': {item.note}")
    return sure, []


def _note_rival(draft: Draft, item: Column, name: str, values: FloatArray) -> None:
    """Say that a class has its speed from another column that fits it as well."""
    if not np.array_equal(values, draft.class_speeds[name], equal_nan=True):
        item.note = f"class '{name}' has its speed from an earlier column; not used"
        item.confidence = "likely"
        draft.context.notes.append(f"column '{item.heading.text}': {item.note}")


def highest_speed(draft: Draft) -> FloatArray:
    """Give the highest speed of each row [km/h], nan where none is known; a help to tell units apart."""
    columns = [draft.numbers["speed_kmh"], *draft.class_speeds.values()]
    stacked = np.where(np.vstack(columns) > 0, np.vstack(columns), -np.inf)
    top = np.max(stacked, axis=0)
    traffic = draft.context.traffic
    known = [r.speed_kmh for r in traffic.rows if r.speed_kmh] if traffic else []
    fallback = max(known) if known else np.nan
    return np.asarray(np.where(np.isfinite(top), top, fallback), dtype=np.float64)
