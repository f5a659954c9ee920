"""What the columns of a block mean: headings first, then what the values look like.

Decides only; values are turned into quantities elsewhere, with what is decided here.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

from cant.errors import InputError, Place
from cant.files.grid import Value
from cant.reading.answers import Answers
from cant.reading.columns import column
from cant.reading.definitions import definitions
from cant.reading.headings import Match, analyse, matches, split_unit
from cant.reading.layout import Block, BlockColumn
from cant.reading.neighbours import bracketed_trains, continue_speeds, hand_by_values
from cant.reading.sheet_column import Column
from cant.reading.text import fold, is_blank, squeeze
from cant.reading.trains import known_train, names_only_trains, says_speed, train_words
from cant.reading.words import lexicon, words_of
from cant.units import find_unit, unit

PROPOSED, EXISTING = "proposed", "existing"


def decide(block: Block, cells: dict[int, Sequence[Value]]) -> list[Column]:
    """Decide what the columns of a block mean.

    Parameters
    ----------
    block : Block
    cells : dict of int to sequence of Value
        Values of the data rows by column.
    """
    said = definitions(block.title)
    columns = [_from_heading(_as_defined(c, said), cells.get(c.index, [])) for c in block.columns]
    for item in columns:
        if item.index in block.sheet.hidden_columns and item.meaning:
            item.confidence, item.note = "likely", "a hidden column"
    continue_speeds(columns)
    bracketed_trains(columns)
    hand_by_values(columns)
    return columns


def _as_defined(source: BlockColumn, said: dict[str, str]) -> BlockColumn:
    """Read a short heading that a legend explains as what the legend says: ``lp = transition``."""
    if not said or not source.parts:
        return source
    words = analyse(source.parts[-1]).words
    stem = words.rstrip("0123456789")
    phrase = said.get(words) or said.get(stem)
    if phrase is None or len(words) > 6:
        return source
    tail = words[len(stem) :] if words not in said else ""
    return BlockColumn(source.index, (f"{phrase} {tail}".strip(),), source.unit_row, source.heading)


def correct(columns: list[Column], answers: Answers, place: Place) -> None:
    """Put a person's corrections over what was decided.

    Raises
    ------
    InputError
        A unit that measures something else than the column does.
    """
    for item in columns:
        given = answers.correction(place.sheet, item.heading.text, item.index)
        if given is None:
            continue
        if given.unit is not None:
            item.unit, item.unit_from = given.unit, "answer"
        if given.meaning is not None:
            item.train = item.train_name = ""
            item.literal = False
            item.meaning = given.meaning
            if given.meaning.startswith("Speed "):
                item.meaning, item.train_name = "Speed", given.meaning[6:]
                item.train, item.literal = fold(item.train_name), True
        if given.unit is not None and item.meaning:
            _refuse_foreign_unit(item, place)
        item.confidence, item.note = "certain", "as told"


def _refuse_foreign_unit(item: Column, place: Place) -> None:
    """Refuse a told unit that measures something else: a radius in mph."""
    usual = column("curves", item.meaning).unit
    if usual and unit(item.unit).dimension != unit(usual).dimension:
        message = (
            f"the answers give '{item.heading.text}', read as {item.meaning}, the unit {item.unit}; "
            f"one like {usual} belongs there"
        )
        raise InputError(message, place.at(column=item.index))


def _from_heading(source: BlockColumn, cells: Sequence[Value]) -> Column:
    heading = analyse(source.heading)
    if source.written:
        heading = replace(heading, text=source.written)
    result = Column(source.index, heading, unit=heading.unit, cells=cells)
    result.unit_from = "heading" if heading.unit else ""
    if source.unit_row:
        bare = source.unit_row.strip("()[] .")
        named = find_unit(bare)
        if named is not None and not result.unit:
            result.unit, result.unit_from = named.symbol, "unit row"
        elif named is None:
            result.heading = replace(analyse(f"{source.heading} ({bare})"), text=heading.text)
            if not result.unit and result.heading.unit:
                result.unit, result.unit_from = result.heading.unit, "unit row"
    if not source.parts:
        return result
    _set_meaning(result, source)
    _drop_foreign_unit(result)
    return result


def _set_meaning(result: Column, source: BlockColumn) -> None:
    if _RAMP_RATIO.search(result.heading.text):
        result.meaning = "Other"
        return
    if any(m.score == 1.0 and m.meaning == "Hand" for b in result.heading.brackets for m in matches(fold(b))):
        result.meaning = "Hand"
        return
    words = _without_state(result.heading.words)
    best = _best(words, [analyse(part).words for part in reversed(source.parts)])
    states = {lexicon("states").get(t) for t in result.heading.words.split()}
    proposed = PROPOSED in states and EXISTING not in states
    if (
        best is not None
        and (best.score == 1.0 or _rules_speed_out(best, words))
        and best.meaning != "Speed"
        and not _unit_says_speed(result, best)
    ):
        result.meaning = best.meaning
        result.confidence = "certain" if best.score >= 0.6 else "likely"
    elif _as_speed(result, source, best):
        return
    elif best is not None and best.score >= 0.4:
        result.meaning = best.meaning
        result.confidence = "certain" if best.score >= 0.6 else "likely"
    if best is None or best.score < 1.0 or result.heading.brackets or result.unit == "in":
        _tell_ends_apart(result, words)
    if proposed and result.meaning:
        result.meaning = "Proposed cant" if result.meaning in ("Cant", "Proposed cant", "Design cant") else ""
        result.note = "a proposal: shown, not taken"


def _unit_says_speed(result: Column, best: Match) -> bool:
    """Whether the unit is a speed's and what the words may mean is measured in something else: ``mph P``."""
    usual = column("curves", best.meaning).unit
    return (
        bool(result.unit)
        and unit(result.unit).dimension == "speed"
        and bool(usual)
        and unit(usual).dimension != "speed"
    )


_NO_RIVALS = frozenset({"Curve", "Line", "Track", "Number", "Start", "End"})


def _rules_speed_out(best: Match, words: str) -> bool:
    """Whether a heading that also says speed means something else: ``cant deficiency at vmax``."""
    first = words.split()[0] if words else ""
    rival = best.score >= 0.4 and best.meaning not in _NO_RIVALS
    return rival and not says_speed(first) and not known_train(first)


_PLACES = frozenset(words_of("little_words", "place"))
_RAMP_RATIO = re.compile(r"\b1\s*:\s*[nmx]\b|\b1\s+in\s+[nx]\b|\b1/n\b", re.IGNORECASE)
_END_OF = {
    "Transition": ("Transition in", "Transition out"),
    "Cant ramp": ("Cant ramp in", "Cant ramp out"),
    "Start": ("Start", "End"),
    "End": ("Start", "End"),
}


def _tell_ends_apart(result: Column, words: str) -> None:
    """Make transition and chainage those of one end, where a word of the heading says which."""
    if result.unit == "in" and result.meaning.startswith(("Transition", "Cant ramp")):
        result.unit, result.unit_from, words = "", "", words + " in"
    tokens = [*words.split(), *fold(" ".join(result.heading.brackets)).split()]
    ends = {lexicon("ends")[t] for t in tokens if t in lexicon("ends")}
    if len(ends) != 1:
        return
    at = 0 if ends == {"in"} else 1
    if not result.meaning:
        rest = " ".join(t for t in words.split() if t not in lexicon("ends"))
        if any(m.meaning == "Transition" for m in matches(rest)):
            result.meaning, result.confidence = "Transition", "likely"
        elif _PLACES & set(words.split()):
            result.meaning, result.confidence = "Start", "likely"
    if result.meaning in _END_OF:
        result.meaning = _END_OF[result.meaning][at]


def _without_state(words: str) -> str:
    """Leave out words such as "existing", and both where a heading names existing and proposed."""
    states = {lexicon("states").get(t) for t in words.split()}
    dropped = {EXISTING, PROPOSED} if {EXISTING, PROPOSED} <= states else {EXISTING}
    kept = " ".join(t for t in words.split() if lexicon("states").get(t) not in dropped)
    if len(dropped) == 2:
        return kept
    exact = matches(words) and matches(words)[0].score == 1.0
    return kept if kept and matches(kept) and not exact else words


def _best(words: str, parts: list[str]) -> Match | None:
    """Give the best meaning of a heading: of all its words, else of its lowest part that is exact."""
    joined = matches(words)
    if joined and joined[0].score == 1.0:
        return joined[0]
    found = [matches(part) for part in parts]
    for at, part in enumerate(found):
        if part and part[0].score == 1.0 and not (at and found[0] and part[0].meaning == "Curve"):
            return part[0]
    both = sorted((*joined, *(found[0] if found else ())), key=lambda m: -m.score)
    return both[0] if both else None


def _as_speed(result: Column, source: BlockColumn, best: Match | None) -> bool:
    words = result.heading.words
    whole = matches(_without_state(words))
    if whole and whole[0].score == 1.0 and whole[0].meaning == "Speed":
        return _take_speed(result, source, "")
    in_speed_unit = bool(result.unit) and unit(result.unit).dimension == "speed"
    if (
        says_speed(words)
        or in_speed_unit
        or (names_only_trains(words) and (best is None or best.score < 0.6))
    ):
        return _take_speed(result, source, train_words(words))
    return False


def _take_speed(result: Column, source: BlockColumn, train: str) -> bool:
    result.meaning = "Speed"
    result.train = train
    if not train:
        return True
    text = squeeze(source.heading)
    name, bracket = split_unit(text)
    whole = name if not bracket or find_unit(bracket) is not None else text
    result.literal = text.casefold().startswith("speed ") and len(source.parts) == 1
    if result.literal:
        result.train_name, result.train_part = whole[6:].strip(), fold(whole[6:])
    else:
        result.train_name = _own_words(squeeze(text.split("(")[0].split("[")[0]), train)
        result.train_part = analyse(source.parts[-1]).words
    return True


def _own_words(text: str, train: str) -> str:
    """Give the words of a heading that fold to the train's words, as the user wrote them."""
    tokens = train.split()
    kept = [word for word in text.split() if any(t in fold(word).split() for t in tokens)]
    return " ".join(kept) or train


def _drop_foreign_unit(result: Column) -> None:
    """Forget a unit that cannot be this meaning's (the m of a chord, a degree's)."""
    if not result.meaning or not result.unit:
        return
    info = column("curves", result.meaning)
    if info.unit and unit(info.unit).dimension != unit(result.unit).dimension:
        result.unit, result.unit_from = "", ""


_PAIRED = {"Transition": ("Transition in", "Transition out")}


def settle_doubles(columns: list[Column]) -> None:
    """Let each meaning belong to one column: pairs become in and out, the surer heading wins."""
    by_meaning: dict[str, list[Column]] = {}
    for item in columns:
        if item.meaning and not (item.meaning == "Speed" and item.train):
            by_meaning.setdefault(item.meaning, []).append(item)
    for meaning, found in by_meaning.items():
        if len(found) == 2 and meaning in _PAIRED:
            for item, name in zip(found, _PAIRED[meaning], strict=True):
                item.meaning, item.confidence = name, "likely"
        elif len(found) > 1 and meaning not in ("Remarks", "Other", "Deficiency", "Excess", "Proposed cant"):
            _keep_surest(found)


def _keep_surest(found: list[Column]) -> None:
    surest = max(found, key=lambda c: (c.confidence == "certain", _filled(c) > 0, -c.index))
    for item in found:
        if item is not surest:
            item.note = f"'{surest.heading.text}' is taken as {item.meaning}"
            item.meaning = ""


def _filled(item: Column) -> int:
    return sum(not is_blank(cell) for cell in item.cells)
