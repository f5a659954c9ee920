"""From the cells of a block to quantities in canonical units, column by column."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from cant.errors import InputError, Place
from cant.model.curves import DOES_NOT_RUN, SHAPES, FloatArray
from cant.reading.cells import NONE, PAIR, STRAIGHT, Numbers, Taken, take_column
from cant.reading.chainages import take_location
from cant.reading.columns import column
from cant.reading.draft import NUMERIC, Draft
from cant.reading.meanings import Column
from cant.reading.situations import known_situations, read_situations
from cant.reading.takers import HANDS, take_cant, take_length, take_radius, take_speed, take_transition
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.trains import classes_meant
from cant.reading.words import lexicon, meaning_of

TAKERS: dict[str, Callable[[str, str], Taken]] = {
    "location": take_location,
    "radius": take_radius,
    "length": take_length,
    "transition": take_transition,
    "cant": take_cant,
    "speed": take_speed,
}


def numbers_of(draft: Draft, item: Column) -> Numbers:
    """Read the numbers of one column as they stand."""
    taker = TAKERS[column("curves", item.meaning).kind]
    return take_column(item.cells, lambda text: taker(text, draft.decimal))


def fill(draft: Draft) -> None:
    """Turn every column of a block into quantities, and note what cannot be used."""
    _names(draft)
    _hands(draft)
    _shapes(draft)
    _situations(draft)
    _fixed(draft)
    for meaning, (attribute, target) in NUMERIC.items():
        item = draft.column(meaning)
        if item is not None:
            numbers = numbers_of(draft, item)
            draft.numbers[attribute] = _canonical(draft, item, numbers, target)
    _class_speeds(draft)


def _canonical(draft: Draft, item: Column, numbers: Numbers, target: str) -> FloatArray:
    if not item.unit:
        item.unit, item.unit_from = column("curves", item.meaning).unit, "canonical"
    values = numbers.converted(item.unit, target)
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)
    for index, state in numbers.states.items():
        if state == PAIR:
            values[index] = np.nan
            draft.fail(
                index,
                item,
                f"two values stand where one {item.meaning} belongs; give each its own row or column",
            )
        elif state == STRAIGHT:
            draft.fail(index, item, "straight track is no curve")
        elif state == NONE and item.meaning in ("Radius", "Speed"):
            draft.fail(index, item, f"none is no {item.meaning}")
    for index, hand in numbers.hands.items():
        draft.hand[index] = hand
    return values


def _texts(item: Column | None, count: int) -> list[str]:
    if item is None:
        return [""] * count
    return ["" if cell is None else squeeze(shown(cell)) for cell in item.cells]


def _names(draft: Draft) -> None:
    count = len(draft)
    draft.curve = _texts(draft.column("Curve"), count)
    for meaning, attribute in (("Line", "line"), ("Track", "track")):
        texts = _texts(draft.column(meaning), count)
        for index in range(1, count):
            if not texts[index]:
                texts[index] = texts[index - 1]
        setattr(draft, attribute, texts)


def _hands(draft: Draft) -> None:
    item = draft.column("Hand")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        if is_blank(cell):
            continue
        text = squeeze(shown(cell))
        found = meaning_of("hands", text)
        if found is None:
            draft.fail(index, item, f"'{text}' is no hand; L or R belongs there")
        else:
            draft.hand[index] = HANDS[found]


def _shapes(draft: Draft) -> None:
    item = draft.column("Shape")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        if is_blank(cell):
            continue
        text = squeeze(shown(cell))
        found = meaning_of("shapes", text) or (fold(text) if fold(text) in SHAPES else None)
        if found is not None:
            draft.shape[index] = found
        elif meaning_of("nothing", text) is None:
            draft.fail(index, item, f"'{text}' is no shape of a transition; it is one of {', '.join(SHAPES)}")


def _situations(draft: Draft) -> None:
    item = draft.column("Situation")
    if item is None:
        return
    known = draft.context.situations
    for index, cell in enumerate(item.cells):
        if is_blank(cell):
            continue
        words, unknown = read_situations(squeeze(shown(cell)), known)
        draft.situations[index] = words
        if unknown:
            listed = ", ".join(sorted(known_situations(draft.context.limits)))
            draft.fail(index, item, f"the situation '{unknown[0]}' is not known; known are {listed}")


def _fixed(draft: Draft) -> None:
    item = draft.column("Cant fixed")
    if item is None:
        return
    for index, cell in enumerate(item.cells):
        if isinstance(cell, bool):
            draft.cant_fixed[index] = cell
        elif cell is not None:
            text = squeeze(shown(cell))
            meaning = lexicon("yes_no").get(fold(text) or text)
            if meaning is None and not is_blank(cell):
                draft.fail(index, item, f"'{text}' stands where yes or no belongs")
            draft.cant_fixed[index] = meaning == "yes"


def _class_speeds(draft: Draft) -> None:
    sure: set[str] = set()
    for item in sorted((c for c in draft.columns if c.meaning == "Speed" and c.train), key=lambda c: c.index):
        names = _classes(draft, item)
        numbers = numbers_of(draft, item)
        if not names:
            continue
        values = _speeds(draft, item, numbers)
        exact = len(names) == 1
        for name in names:
            if exact or name not in sure:
                draft.class_speeds[name] = values
            if exact:
                sure.add(name)


def _speeds(draft: Draft, item: Column, numbers: Numbers) -> FloatArray:
    if not item.unit:
        item.unit, item.unit_from = "km/h", "canonical"
    values = numbers.converted(item.unit, "km/h")
    for index, text in numbers.problems.items():
        draft.fail(index, item, text)
    for index, state in numbers.states.items():
        if state == NONE:
            values[index] = DOES_NOT_RUN
    return values


def _classes(draft: Draft, item: Column) -> list[str]:
    traffic = draft.context.traffic
    if traffic is None:
        return [item.train_name]
    found = classes_meant(item.train, traffic)
    if not found and item.literal:
        place = Place(draft.context.file, draft.sheet, draft.block.header_last, item.index)
        known = ", ".join(traffic.class_names)
        message = f"'{item.heading.text}' names a class that the traffic lacks; its classes are {known}"
        raise InputError(message, place)
    if not found:
        item.note = f"no class of the traffic is called '{item.train_name}'; not used"
        item.confidence = "likely"
    return found
