"""Two ends in one cell: ``12.345 - 12.800``, ``del km 12,345 al km 12,800``, told apart before reading."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

from cant.files.grid import Value
from cant.reading.sheet_column import Column
from cant.reading.text import is_blank, squeeze

_NUMBER = r"(?:km|pk|mp|k)?\s*\.?\s*\d+(?:[.,]\d+)?(?:\s*[+]\s*\d{2,3}(?:[.,]\d+)?)?"
_RANGE = re.compile(
    rf"(?:del?|von|from|du|da|od|dal|fra|från|between|desde)?\s*(?P<start>{_NUMBER})"
    rf"\s*(?:-{{1,2}}|÷|\.\.\.?|to|bis|al?|au|à|do|til|till|ao|até|hasta|and)\s*(?P<end>{_NUMBER})",
    re.IGNORECASE,
)


def split_ranges(columns: list[Column]) -> None:
    """Split a column of ranges into start and end, where the list has no column of ends."""
    meanings = {c.meaning for c in columns}
    if "End" in meanings:
        return
    for item in columns:
        may_be_places = item.meaning == "Start" or (
            "Start" not in meanings and item.meaning in ("", "Situation")
        )
        if may_be_places and (ends := _ends(item.cells)):
            note = "start and end in one cell"
            end = replace(item, meaning="End", cells=[e[1] for e in ends], confidence="likely", note=note)
            item.meaning, item.cells, item.confidence, item.note = (
                "Start",
                [e[0] for e in ends],
                "likely",
                note,
            )
            columns.append(end)
            return


def _ends(cells: Sequence[Value]) -> list[tuple[Value, Value]]:
    filled = [cell for cell in cells if not is_blank(cell)]
    texts = [squeeze(cell).translate(_DASHES) for cell in filled if isinstance(cell, str)]
    hits = sum(_RANGE.fullmatch(text) is not None for text in texts)
    if not texts or hits < 0.6 * len(filled):
        return []
    found: list[tuple[Value, Value]] = []
    for cell in cells:
        match = _RANGE.fullmatch(squeeze(cell).translate(_DASHES)) if isinstance(cell, str) else None
        found.append((match["start"], match["end"]) if match else (cell, None))
    return found


_DASHES = str.maketrans("–—−", "---")
