"""Number formats of a workbook, and which of them make a number a date or a time."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from datetime import date, datetime, time, timedelta

from cant.files.markup import Element

BUILT_IN = {
    1: "0", 2: "0.00", 3: "#,##0", 4: "#,##0.00", 9: "0%", 10: "0.00%", 11: "0.00E+00", 12: "# ?/?",
    13: "# ??/??", 14: "mm-dd-yy", 15: "d-mmm-yy", 16: "d-mmm", 17: "mmm-yy", 18: "h:mm AM/PM",
    19: "h:mm:ss AM/PM", 20: "h:mm", 21: "h:mm:ss", 22: "m/d/yy h:mm", 37: "#,##0 ;(#,##0)",
    38: "#,##0 ;[Red](#,##0)", 39: "#,##0.00;(#,##0.00)", 40: "#,##0.00;[Red](#,##0.00)", 45: "mm:ss",
    46: "[h]:mm:ss", 47: "mmss.0", 48: "##0.0E+0", 49: "@",
}  # fmt: skip
"""Number formats that a workbook need not spell out (ISO/IEC 29500-1, 18.8.30)."""

_EAST_ASIAN_DATES = frozenset([*range(27, 37), *range(50, 59)])
_NOT_A_SIGN = re.compile(r'"[^"]*"|\\.|_.|\*.|\[(?!h+\]|m+\]|s+\])[^\]]*\]', re.IGNORECASE)
_ELAPSED = re.compile(r"\[(h+|m+|s+)\]", re.IGNORECASE)
_DATE_SIGN = re.compile(r"[ymdhs]", re.IGNORECASE)
LAST_SERIAL = 2_958_466
"""Serial number of the day after 31 December 9999."""


def is_date_format(code: str) -> bool:
    """Tell whether a number format shows a date or a time of day; elapsed time (``[h]:mm``) is neither."""
    signs = _NOT_A_SIGN.sub("", code.split(";")[0])
    return _ELAPSED.search(signs) is None and _DATE_SIGN.search(signs.replace("General", "")) is not None


class CellFormats:
    """What the cell styles of a workbook say about numbers.

    Parameters
    ----------
    styles : Element or None
        The styles part, None where there is none.
    """

    def __init__(self, styles: Element | None) -> None:
        self.codes: list[str] = []
        self.dates: frozenset[int] = frozenset()
        if styles is None:
            return
        own: dict[int, str] = {}
        formats = styles.child("numFmts")
        for one in formats.all("numFmt") if formats else ():
            own[_integer(one.get("numFmtId"))] = one.get("formatCode")
        cell_styles = styles.child("cellXfs")
        ids = [_integer(one.get("numFmtId")) for one in cell_styles.all("xf")] if cell_styles else []
        self.codes = [own.get(one) or BUILT_IN.get(one, "General") for one in ids]
        is_date = {code: is_date_format(code) for code in set(self.codes)}
        self.dates = frozenset(
            index
            for index, (one, code) in enumerate(zip(ids, self.codes, strict=True))
            if is_date[code] or (one in _EAST_ASIAN_DATES and one not in own)
        )

    def code(self, style: int) -> str:
        """Give the number format of a cell style, General where there is no such style."""
        return self.codes[style] if 0 <= style < len(self.codes) else "General"


def _integer(text: str) -> int:
    return int(text) if text.isdecimal() and len(text) < 10 else 0


def from_serial(serial: float, epoch_1904: bool) -> datetime | date | time | float:
    """Give the date, time or both that a serial number of days means; the number itself out of range.

    Parameters
    ----------
    serial : float
        Days since the workbook's epoch.
    epoch_1904 : bool
        Whether its days count from 1 January 1904.

    Returns
    -------
    datetime, date, time or float
        A date for whole days, a time of day below one day, else both.
    """
    if not 0 <= serial < LAST_SERIAL:
        return serial
    milliseconds = round(serial * 86_400_000)
    if milliseconds < 86_400_000 and not (epoch_1904 and serial == 0):
        return (datetime(1900, 1, 1) + timedelta(milliseconds=milliseconds)).time()
    start = datetime(1904, 1, 1) if epoch_1904 else datetime(1899, 12, 30 if serial >= 60 else 31)
    try:
        moment = start + timedelta(milliseconds=milliseconds)
    except OverflowError:
        return serial
    return moment if moment.time() != time() else moment.date()


def to_serial(moment: datetime | date | time) -> float | None:
    """Give the serial number of days since 1900 of a date or time, None before 1900."""
    if isinstance(moment, time):
        seconds = moment.hour * 3600 + moment.minute * 60 + moment.second + moment.microsecond / 1e6
        return seconds / 86_400
    full = moment.replace(tzinfo=None) if isinstance(moment, datetime) else datetime.combine(moment, time())
    if full.year < 1900:
        return None
    start = datetime(1899, 12, 30 if full >= datetime(1900, 3, 1) else 31)
    return (full - start) / timedelta(days=1)


class NumberFormats(Mapping[tuple[int, int], str]):
    """Number formats by cell, held as one row of style numbers that like rows share.

    Parameters
    ----------
    formats : CellFormats
        The workbook's.
    """

    def __init__(self, formats: CellFormats) -> None:
        self._formats = formats
        self._shared: dict[tuple[int, ...], tuple[int, ...]] = {}
        self.rows: dict[int, tuple[int, ...]] = {}

    def add_row(self, row: int, styles: list[int]) -> None:
        """Remember the style numbers of a row's cells from column A on."""
        if any(styles):
            key = tuple(styles)
            self.rows[row] = self._shared.setdefault(key, key)

    def __getitem__(self, cell: tuple[int, int]) -> str:
        row, column = cell
        styles = self.rows[row]
        if not 0 <= column < len(styles):
            raise KeyError(cell)
        code = self._formats.code(styles[column])
        if code == "General":
            raise KeyError(cell)
        return code

    def __iter__(self) -> Iterator[tuple[int, int]]:
        for row, styles in self.rows.items():
            for column, style in enumerate(styles):
                if self._formats.code(style) != "General":
                    yield row, column

    def __len__(self) -> int:
        return sum(1 for _ in self)
