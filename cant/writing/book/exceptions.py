"""The register of exceptions and the sheet of speed changes: what somebody has to approve, one row each."""

from __future__ import annotations

from typing import Any

from cant.model.display import Display
from cant.writing.book.limit_lookup import kind_of
from cant.writing.columns import Cell, Record, governing_text
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets, TableSheet

_EXCEPTION_HEADS = (
    ("Line", 19.0),
    ("Track", 7.0),
    ("Curve", 8.0),
    ("Limit passed", 31.0),
    ("Where", 10.0),
    ("Class", 12.0),
    ("Value", 8.0),
    ("Normal limit", 8.0),
    ("Exceptional limit", 11.0),
    ("Unit", 7.0),
    ("Clause", 15.0),
    ("Kept", 12.0),
    ("Reason", 44.0),
    ("Decided by (name)", 14.0),
    ("Decision", 14.0),
    ("Date", 10.0),
)
_PLACES = {"curve": "curve", "between": "shared end", "before": "lower end", "after": "upper end"}


class Exceptions:
    """One row for each limit that the plan passes at its normal value, with room for a decision.

    Parameters
    ----------
    book : NewSheets
    name : str
    display : Display
    repeat : bool
        Whether the reason stands in every row of a curve, or in its first one alone.
    """

    def __init__(self, book: NewSheets, name: str, display: Display, repeat: bool = True) -> None:
        self._repeat = repeat
        self._display = display
        self._sheet = book.table(name)
        self._sheet.paragraph(
            "Every limit that the proposal passes at its normal value, at the speeds run. A row without a "
            "signed "
            "decision is no permission. 'Lower' and 'upper end' are the ends at the smaller and the greater "
            "chainage.",
            13,
            150,
        )
        self._sheet.header([Heading(title, width) for title, width in _EXCEPTION_HEADS], keep=3)
        self.count = 0

    def add(self, record: Record) -> None:
        """Write the rows of a curve."""
        for number, passed in enumerate(record["limits_passed"]):
            self._row(record, passed, record["reason"] if self._repeat or not number else None)

    def _row(self, record: Record, passed: dict[str, Any], reason: str | None) -> None:
        shown = self._display[kind_of(passed["quantity"])]
        names: list[Cell] = [record["line"], record["track"], record["curve"]]
        values = [_rounded(shown.value(passed[key]), shown.decimals + 1) for key in _VALUES]
        kept = "exceptional" if passed["within_exceptional"] else "NOT KEPT"
        number = self._sheet.row(
            [
                *names,
                passed["quantity"],
                _PLACES.get(passed.get("place", ""), passed.get("place", "")),
                passed.get("class"),
                *values,
                shown.unit,
                passed.get("clause"),
                kept,
                reason,
            ]
        )
        if number is not None:
            self.count += 1

    def finish(self) -> None:
        """Frame the room for decisions; say so where there is nothing to decide."""
        last = len(_EXCEPTION_HEADS) - 1
        if self.count:
            self._sheet.frame(3, (last - 2, last))
        else:
            self._sheet.line("No limit is passed at its normal value.")


_VALUES = ("value", "limit", "exceptional_limit")


def _rounded(value: float | None, decimals: int) -> float | None:
    return None if value is None else round(value, decimals)


_SPEED_HEADS = (
    ("Line", 16.0, ""),
    ("Track", 7.0, ""),
    ("Curve", 9.0, ""),
    ("Start", 9.0, "chainage"),
    ("End", 9.0, "chainage"),
    ("Class", 16.0, ""),
    ("Planned speed", 9.0, "speed"),
    ("Speed to set", 9.0, "speed"),
    ("Change", 9.0, "speed"),
    ("At normal limits", 9.0, "speed"),
    ("Ends by", 40.0, ""),
    ("Order of work", 40.0, ""),
    ("Reason", 44.0, ""),
)


class SpeedChanges:
    """One row for each class that may not run at its planned speed on a curve.

    Parameters
    ----------
    book : NewSheets
    name : str
    display : Display
    """

    def __init__(self, book: NewSheets, name: str, display: Display) -> None:
        self._display = display
        self._sheet: TableSheet = book.table(name)
        self._sheet.paragraph(
            "Classes that may not run at their planned speed with the proposed cants. Speeds are put down "
            "before "
            "the track is changed. Braking and accelerating, signalling and boards are not examined.",
            11,
            150,
        )
        heads = []
        for title, width, kind in _SPEED_HEADS:
            shown = display[kind] if kind else None
            unit = f" ({shown.unit})" if shown else ""
            heads.append(Heading(title + unit, width, shown.number_format if shown else None))
        self._sheet.header(heads, keep=3)
        self.count = 0

    def add(self, record: Record) -> None:
        """Write the rows of a curve."""
        speed, chainage, read = self._display["speed"], self._display["chainage"], record["as_read"]
        for entry in record["classes"]:
            run, planned = entry["run_speed_kmh"], entry["speed_kmh"]
            if run is None or run >= planned - 1e-6:
                continue
            self._sheet.row(
                [
                    record["line"],
                    record["track"],
                    record["curve"],
                    chainage.value(read["start_km"]),
                    chainage.value(read["end_km"]),
                    entry["class"],
                    speed.value(planned),
                    speed.value(run),
                    speed.value(run - planned),
                    speed.value(entry["permissible_speed_normal_kmh"]),
                    governing_text(entry["permissible_by"]),
                    _order(record, entry),
                    record["reason"],
                ]
            )
            self.count += 1

    def finish(self) -> None:
        """Say so where there is nothing."""
        if not self.count:
            self._sheet.line("Every class may run at its planned speed on every curve planned.")


def _order(record: Record, entry: Record) -> str:
    """Say what comes first: the speed or the track."""
    old, new = record["existing_cant_mm"], record["recommended_cant_mm"]
    for today in record["today"]["classes"]:
        permitted = today["permissible_speed_kmh"]
        if today["class"] == entry["class"] and (permitted is None or permitted < entry["speed_kmh"] - 1e-6):
            return "Lower the speed now: today's cant does not permit the planned speed either."
    if old is not None and new is not None and new < old:
        return "Lower the speed, then change the track: cant comes down."
    return "Lower the speed before the track is changed."
