"""Checks of single rows and of a list by itself: what is missing, impossible, contradictory or there twice.

What needs neighbours along the line (gaps, overlaps, length against chainages) is the planner's.
"""

from __future__ import annotations

import numpy as np

from cant.model.curves import DOES_NOT_RUN, BoolArray
from cant.reading.draft import Draft

LARGEST_CANT_MM = 300.0
SMALLEST_CANT_MM = -150.0
SMALLEST_RADIUS_M, LARGEST_RADIUS_M = 20.0, 100_000.0
LARGEST_SPEED_KMH = 500.0
LONGEST_TRANSITION_M, LONGEST_CURVE_M = 2000.0, 50_000.0
"""Beyond these a value is taken for a mistake of unit or typing, not for a railway (common practice)."""


def check(draft: Draft) -> None:
    """Check every row of a block on its own."""
    _radius(draft)
    for meaning, attribute in (
        ("Transition in", "transition_in_m"),
        ("Transition out", "transition_out_m"),
        ("Cant ramp in", "ramp_in_m"),
        ("Cant ramp out", "ramp_out_m"),
    ):
        _range(draft, meaning, attribute, 0.0, LONGEST_TRANSITION_M, "m", "a length from 0 to 2000 m")
    _range(draft, "Length", "length_m", 1e-9, LONGEST_CURVE_M, "m", "a length above 0 and up to 50 km")
    _range(draft, "Speed", "speed_kmh", 1e-9, LARGEST_SPEED_KMH, "km/h", "a speed above 0 and up to 500 km/h")
    for meaning in ("Cant", "Cant at most", "Cant at least"):
        low = SMALLEST_CANT_MM
        _range(
            draft,
            meaning,
            {"Cant": "cant_mm", "Cant at most": "cant_at_most_mm", "Cant at least": "cant_at_least_mm"}[
                meaning
            ],
            low,
            LARGEST_CANT_MM,
            "mm",
            f"a cant from {low:g} to 300 mm",
        )
    _class_speeds(draft)
    _needed_cant(draft)
    _order(draft)
    _bounds(draft)
    _fixed(draft)


NEEDED_CANT_MM = 700.0
"""Equilibrium cant beyond which radius and speed of a row are doubted in a note."""


def _needed_cant(draft: Draft) -> None:
    with np.errstate(invalid="ignore", divide="ignore"):
        needed = 11.8 * draft.numbers["speed_kmh"] ** 2 / np.abs(draft.numbers["radius_m"])
        doubtful = np.flatnonzero(needed > NEEDED_CANT_MM)
    if len(doubtful):
        rows = ", ".join(str(int(draft.rows[i])) for i in doubtful[:12])
        more = f" and {len(doubtful) - 12} more" if len(doubtful) > 12 else ""
        where = f"sheet '{draft.sheet}', " if draft.sheet else ""
        draft.context.notes.append(
            f"{where}rows {rows}{more}: line speed and radius hardly belong together; check both"
        )


def _at(draft: Draft, bad: BoolArray) -> list[int]:
    return [int(i) for i in np.flatnonzero(bad)]


def _radius(draft: Draft) -> None:
    values = draft.numbers["radius_m"]
    item = draft.column("Radius") or draft.column("Degree") or draft.column("Versine")
    with np.errstate(invalid="ignore"):
        wrong = (np.abs(values) < SMALLEST_RADIUS_M) | (np.abs(values) > LARGEST_RADIUS_M)
    for index in _at(draft, wrong):
        draft.fail(index, item, f"a radius of {values[index]:.6g} m is not possible; 20 m to 100 km is")
    for index in _at(draft, np.isnan(values)):
        if index not in draft.problems:
            draft.fail(index, item, "the row has no radius; a curve needs one (or a degree or versine)")


def _range(
    draft: Draft, meaning: str, attribute: str, low: float, high: float, unit: str, right: str
) -> None:
    values = draft.numbers[attribute]
    with np.errstate(invalid="ignore"):
        wrong = (values < low) | (values > high)
    for index in _at(draft, wrong):
        draft.fail(
            index,
            draft.column(meaning),
            f"{meaning} of {values[index]:.6g} {unit} is not possible; {right} belongs there",
        )


def _class_speeds(draft: Draft) -> None:
    for name, values in draft.class_speeds.items():
        with np.errstate(invalid="ignore"):
            wrong = ((values < 0) & (values != DOES_NOT_RUN)) | (values > LARGEST_SPEED_KMH)
        for index in _at(draft, wrong):
            draft.fail(
                index,
                speed_column(draft, name),
                f"a speed of {values[index]:.6g} km/h is not possible for {name}",
            )


def speed_column(draft: Draft, name: str):  # type: ignore[no-untyped-def]
    """Give the column of a class's speed, None where its heading goes by another name."""
    found = [c for c in draft.columns if c.meaning == "Speed" and c.train_name.casefold() == name.casefold()]
    return found[0] if found else None


def _order(draft: Draft) -> None:
    start, end = draft.numbers["start_km"], draft.numbers["end_km"]
    with np.errstate(invalid="ignore"):
        falls, rises = start > end + 1e-9, end > start + 1e-9
    equal = np.abs(start - end) <= 1e-9
    for index in _at(draft, equal):
        draft.fail(index, draft.column("End"), "start and end are the same; a curve has a length")
    groups: dict[tuple[str, str], list[int]] = {}
    for index in _at(draft, falls | rises):
        groups.setdefault((draft.line[index], draft.track[index]), []).append(index)
    for indices in groups.values():
        down = [i for i in indices if falls[i]]
        if not down or len(down) == len(indices):
            continue
        few = down if 2 * len(down) <= len(indices) else [i for i in indices if rises[i]]
        for index in few:
            draft.fail(
                index,
                draft.column("Start"),
                "start and end lie the other way round than in the rest of the track's list",
            )


def _bounds(draft: Draft) -> None:
    """Note bounds of a site that contradict each other; the planner takes what breaks them least."""
    low, high = draft.numbers["cant_at_least_mm"], draft.numbers["cant_at_most_mm"]
    with np.errstate(invalid="ignore"):
        crossed = low > high
    if crossed.any():
        rows = ", ".join(str(int(draft.rows[i])) for i in _at(draft, crossed))
        where = f"sheet '{draft.sheet}', " if draft.sheet else ""
        draft.context.notes.append(
            f"{where}row {rows}: Cant at least is above Cant at most; no cant keeps both, check them"
        )


def _fixed(draft: Draft) -> None:
    for index in _at(draft, draft.cant_fixed & np.isnan(draft.numbers["cant_mm"])):
        draft.fail(index, draft.column("Cant fixed"), "the cant is fixed but not stated; Cant belongs there")


def check_duplicates(drafts: list[Draft]) -> None:
    """Find curves of the same line, track and name: none can be told from the other, but for hidden rows."""
    seen: dict[tuple[str, str, str], tuple[Draft, int]] = {}
    for draft in drafts:
        for index, name in enumerate(draft.curve):
            if not name:
                continue
            key = (draft.line[index], draft.track[index], name)
            if key not in seen:
                seen[key] = (draft, index)
                continue
            first, at = seen[key]
            hidden, first_hidden = _is_hidden(draft, index), _is_hidden(first, at)
            if not first_hidden or hidden:
                _twice(draft, index, first, at, "already", hidden and not first_hidden)
            if not hidden or first_hidden:
                _twice(first, at, draft, index, "again", first_hidden and not hidden)
            if first_hidden and not hidden:
                seen[key] = (draft, index)


def _is_hidden(draft: Draft, index: int) -> bool:
    return int(draft.rows[index]) in draft.block.sheet.hidden_rows


def _twice(draft: Draft, index: int, other: Draft, at: int, word: str, hidden: bool) -> None:
    where = (
        f"row {other.rows[at]}"
        if other.sheet == draft.sheet
        else f"sheet '{other.sheet}', row {other.rows[at]}"
    )
    why = "this row is hidden, that one is not" if hidden else "a curve is known by line, track and name"
    text = f"curve '{draft.curve[index]}' is there {word} ({where}); {why}"
    if not any(p.text == text for p in draft.problems.get(index, ())) and (
        word == "already" or index not in draft.problems
    ):
        draft.fail(index, draft.column("Curve"), text)
