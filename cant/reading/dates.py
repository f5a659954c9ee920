"""Dates that were fractions or pairs: a spreadsheet turned ``1/2`` into 2 January.

The date and its number format say what may have been typed; where only one of that is possible in the column,
it is taken, else the row is refused with both readings named.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import date, datetime

from cant.files.grid import Sheet, Value
from cant.reading.cells import PAIR, Taken
from cant.reading.chainages import take_location
from cant.reading.columns import column
from cant.reading.sheet_column import Column
from cant.reading.takers import take_cant, take_transition

_TAKERS: dict[str, Callable[[str, str], Taken]] = {
    "cant": take_cant,
    "transition": take_transition,
    "transition_pair": take_transition,
    "location": take_location,
}


def typed_texts(value: date, number_format: str) -> tuple[str, ...]:
    """Give what may have been typed for a date to stand there, most likely first."""
    shape = number_format.casefold().replace("\\", "")
    if "y" in shape and "d" not in shape:
        return (f"{value.month}/{value.year % 100:02d}",)
    if "y" in shape or value.year < 1930:
        return ()
    return tuple(dict.fromkeys((f"{value.month}/{value.day}", f"{value.day}/{value.month}")))


def undo_dates(sheet: Sheet, rows: Sequence[int], columns: Sequence[Column]) -> None:
    """Put back the typed text of dates in columns of numbers, where only one is possible."""
    for item in columns:
        if not item.meaning or item.train or not any(isinstance(c, date) for c in item.cells):
            continue
        taker = _TAKERS.get(column("curves", item.meaning).kind)
        if taker is not None:
            cells: list[Value] = list(item.cells)
            for index, cell in enumerate(cells):
                if isinstance(cell, date):
                    cells[index] = _undone(
                        cell, sheet.number_formats.get((rows[index], item.index), ""), taker
                    )
            item.cells = cells


def _undone(cell: date, number_format: str, taker: Callable[[str, str], Taken]) -> Value:
    day = cell.date() if isinstance(cell, datetime) else cell
    single = taker is take_cant
    texts = typed_texts(day, number_format)
    readings = {text: taker(text, "") for text in texts}
    possible = [t for t, r in readings.items() if not r.problem and not (single and r.state == PAIR)]
    return possible[0] if len(possible) == 1 else cell
