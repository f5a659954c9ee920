"""Chainages of a block: which unit or notation bare numbers are in, told from headings, spans and lengths.

``12.0748`` is 12 miles 748 yards or 12.0748 miles, ``12.34`` 12 miles 34 chains or 12.34 miles or km,
``45320`` metres or feet: the columns of a block are looked at together, and asked about where they do not
settle it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import Numbers, take_column
from cant.reading.chainages import STATION, miles_chains, miles_yards, split_decimals, take_location
from cant.reading.draft import Draft
from cant.reading.evidence import Evidence
from cant.reading.headings import MILES_CHAINS, MILES_YARDS
from cant.reading.legends import notation_said
from cant.reading.miles import like_miles_and_yards, mile_notations
from cant.reading.sheet_column import Column
from cant.units import FOOT_M, ratio

LOCATIONS = ("Transition start", "Start", "End", "Transition end")
KM, METRES, MILES, FEET = "km", "m", "mi", "ft"
_WORDS = {
    KM: "kilometres",
    METRES: "metres",
    MILES: "decimal miles",
    FEET: "feet",
    MILES_CHAINS: "miles.chains",
    MILES_YARDS: "miles.yards",
}
_UNITS = {words: unit for unit, words in _WORDS.items()}
_STATION_FEET, _STATION_METRES = "stations of 100 ft", "stations of 100 m"


@dataclass
class _Located:
    """The chainage columns of a block, as they stand."""

    items: dict[str, Column]
    numbers: dict[str, Numbers]


def settle_locations(draft: Draft, evidence: Evidence) -> dict[str, FloatArray]:
    """Turn the chainages of a block into kilometres.

    Returns
    -------
    dict of str to ndarray, shape (n,)
        By meaning (``Start`` ...) [km]; nan where nothing or nothing usable stands.
    """
    items = {name: item for name in LOCATIONS if (item := draft.column(name)) is not None}
    numbers = {
        name: take_column(item.cells, lambda text: take_location(text, draft.decimal))
        for name, item in items.items()
    }
    if not items:
        return {}
    located = _Located(items, numbers)
    plain = _plain_unit(draft, located, evidence)
    station = _station_unit(draft, located, evidence)
    result: dict[str, FloatArray] = {}
    for name, item in items.items():
        result[name] = _kilometres(numbers[name], plain, station)
        item.unit = item.unit or (plain if plain not in (MILES_CHAINS, MILES_YARDS) else "mi")
        for index, text in numbers[name].problems.items():
            _unusable(draft, item, index, text)
    return result


def _unusable(draft: Draft, item: Column, index: int, text: str) -> None:
    if "mast" in text:
        item.note = "kilometre and mast: kept as it stands, no distances are taken from it"
        item.confidence = "likely"
    else:
        draft.fail(index, item, text)


def _kilometres(numbers: Numbers, plain: str, station: float) -> FloatArray:
    result = in_kilometres(numbers.values, plain)
    for index, own in numbers.units.items():
        value = numbers.values[index]
        result[index] = value * station if own == STATION else value * ratio(own, "km")
    return result


def in_kilometres(values: FloatArray, unit: str) -> FloatArray:
    """Give bare numbers of a unit or notation in kilometres."""
    if unit == MILES_CHAINS:
        miles, chains = split_decimals(values, 2)
        return np.asarray(miles_chains(miles, chains), dtype=np.float64)
    if unit == MILES_YARDS:
        miles, yards = split_decimals(values, 4)
        return np.asarray(miles_yards(miles, yards), dtype=np.float64)
    return values * ratio(unit, "km")


def _bare(numbers: Numbers) -> FloatArray:
    values = numbers.values.copy()
    if numbers.units:
        values[list(numbers.units)] = np.nan
    return values


def _plain_unit(draft: Draft, located: _Located, evidence: Evidence) -> str:
    bare = {name: _bare(n) for name, n in located.numbers.items()}
    every = np.concatenate(list(bare.values()))
    every = every[~np.isnan(every)]
    first = next(
        (i for i in located.items.values() if i.notation or i.unit), next(iter(located.items.values()))
    )
    if not len(every):
        return KM
    notation = first.notation if first.notation in (MILES_CHAINS, MILES_YARDS) else ""
    if not notation and first.unit in ("", "mi"):
        notation = notation_said(draft.block.title)
    if notation:
        first.unit_from = first.unit_from or ("heading" if first.notation else "legend")
        _spread(located, first)
        return notation
    candidates = _candidates(draft, first, every, bare, evidence)
    if len(candidates) > 1:
        candidates = _by_length(draft, bare, candidates)
    if len(candidates) == 1:
        _spread(located, first)
        return candidates[0]
    return _ask(draft, located, first, candidates, bare)


def _spread(located: _Located, first: Column) -> None:
    for item in located.items.values():
        item.unit_from = item.unit_from or (first.unit_from and "other columns") or "values"


SURE = 8
"""So many decimals below .1760 are no chance."""


def counts_miles_and_yards(draft: Draft) -> bool:
    """Whether chainages without unit are miles and yards: by an answer, or all decimals are below .1760."""
    items = [item for name in LOCATIONS if (item := draft.column(name)) is not None]
    if not items or any(item.unit or item.notation for item in items) or draft.canonical:
        return False
    answer = (_WORDS[MILES_YARDS],)
    if any(draft.context.answers.choice(draft.sheet, item.heading.text, answer) for item in items):
        return True
    bare = [_bare(take_column(item.cells, lambda text: take_location(text, draft.decimal))) for item in items]
    every = np.concatenate(bare)
    every = every[~np.isnan(every)]
    return len(every) >= SURE and like_miles_and_yards(every)


def _candidates(
    draft: Draft, first: Column, every: FloatArray, bare: dict[str, FloatArray], evidence: Evidence
) -> list[str]:
    """Give the readings that headings, decimals and spans leave open, the likeliest first."""
    named = first.unit
    if named == "mi":
        open_ones = mile_notations(first, every, evidence)
        if _may_be_kilometres(first, evidence):
            open_ones = [*open_ones, KM]
    elif named:
        open_ones = (
            [named, METRES] if named == KM and first.unit_from not in ("answer", "legend") else [named]
        )
    elif draft.canonical:
        open_ones = [KM, METRES]
    elif evidence.counts_miles and not _says_km(draft):
        open_ones = [*mile_notations(first, every, evidence), KM, METRES, FEET]
    elif len(every) >= 4 and like_miles_and_yards(every):
        open_ones = [MILES_YARDS, KM]
    else:
        open_ones = [KM, METRES]
    fitting = [unit for unit in open_ones if _spans_fit(bare, unit, every)]
    if named == KM or not named:
        metric = [unit for unit in fitting if unit in (KM, METRES)]
        if fitting and set(metric) == set(fitting):
            return metric[:1]
    return fitting or open_ones[:1]


def _may_be_kilometres(first: Column, evidence: Evidence) -> bool:
    """Whether a mileage may be in kilometres: it names no unit, and nothing else of the sheet is imperial."""
    spelled = "mile" in first.heading.text.casefold() and "mileage" not in first.heading.text.casefold()
    metric = bool(evidence.metric & {"km/h", "km", "kmh", "kmph"})
    return first.unit_from == "heading" and not spelled and metric and not evidence.imperial - {"mi"}


def _says_km(draft: Draft) -> bool:
    return any("km" in c.heading.text.casefold().split() for c in draft.columns)


def _spans_fit(bare: dict[str, FloatArray], unit: str, every: FloatArray) -> bool:
    spans = _spans(bare, unit)
    if spans is None:
        top = float(np.max(np.abs(every)))
        return (unit in (METRES, FEET)) == (top > 3000)
    return 3.0 <= float(np.median(spans)) <= 6000.0 and float(np.max(spans)) < 40_000.0


def _spans(bare: dict[str, FloatArray], unit: str) -> FloatArray | None:
    if "Start" not in bare or "End" not in bare:
        return None
    spans = np.abs(in_kilometres(bare["End"], unit) - in_kilometres(bare["Start"], unit)) * 1000
    spans = spans[~np.isnan(spans)]
    return spans if len(spans) else None


def _by_length(draft: Draft, bare: dict[str, FloatArray], candidates: list[str]) -> list[str]:
    """Let the column of lengths decide where it agrees with one reading alone."""
    item = draft.column("Length")
    if item is None or _spans(bare, KM) is None:
        return candidates
    lengths = take_column(item.cells, lambda text: take_location(text, draft.decimal)).values
    units = [item.unit] if item.unit else ["m", "ft", "yd", "ch"]
    agreeing: list[str] = []
    for unit in candidates:
        spans = np.abs(in_kilometres(bare["End"], unit) - in_kilometres(bare["Start"], unit)) * 1000
        for length_unit in units:
            with np.errstate(invalid="ignore", divide="ignore"):
                off = np.abs(spans - lengths * ratio(length_unit, "m")) / np.maximum(spans, 1.0)
            off = off[~np.isnan(off)]
            if len(off) and float(np.median(off)) < 0.06 and unit not in agreeing:
                agreeing.append(unit)
    return agreeing if len(agreeing) == 1 else candidates


def _ask(
    draft: Draft, located: _Located, first: Column, candidates: list[str], bare: dict[str, FloatArray]
) -> str:
    choices = tuple(_WORDS[unit] for unit in candidates)
    answer = draft.context.answers.choice(draft.sheet, first.heading.text, choices)
    if answer is not None:
        first.unit_from = "answer"
        return _UNITS[answer]
    reasons = "; ".join(f"{_WORDS[unit]}: {_reason(bare, unit)}" for unit in candidates)
    where = [int(i) for i in np.flatnonzero(~np.isnan(bare.get("Start", next(iter(bare.values())))))]
    draft.ask(
        first,
        f"'{first.samples(1)[0]}' can be read in more than one way ({reasons}). Which is it?",
        choices,
        where,
    )
    return candidates[0]


def _reason(bare: dict[str, FloatArray], unit: str) -> str:
    spans = _spans(bare, unit)
    return "possible" if spans is None else f"curves are {np.median(spans):.0f} m long in the middle"


def _station_unit(draft: Draft, located: _Located, evidence: Evidence) -> float:
    """Give the kilometres that one unit of a station ``1234+56`` is."""
    with_station = [
        (item, located.numbers[name])
        for name, item in located.items.items()
        if STATION in located.numbers[name].units.values()
    ]
    if not with_station:
        return 0.001
    if evidence.only_imperial or any(item.unit == "ft" for item, _ in with_station):
        return FOOT_M / 1000
    if evidence.only_metric or evidence.language != "en":
        return 0.001
    item, numbers = with_station[0]
    choices = (_STATION_FEET, _STATION_METRES)
    answer = draft.context.answers.choice(draft.sheet, item.heading.text, choices)
    if answer is None:
        where = [i for i, own in numbers.units.items() if own == STATION]
        draft.ask(
            item,
            f"'{item.samples(1)[0]}' is a station of 100 ft, as in US lists, or of 100 m. Which is it?",
            choices,
            where,
        )
    return 0.001 if answer == _STATION_METRES else FOOT_M / 1000
