"""Tables of pandas as sheets, so that a notebook and a workbook are read by one reader."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import date, datetime, time
from typing import TYPE_CHECKING, Any

import numpy as np

from cant.files.grid import Sheet, Value, Workbook
from cant.model.limits import LimitSet
from cant.model.reading import Reading
from cant.model.settings import METHODS
from cant.reading.settings import settings_from_mapping
from cant.reading.workbook import read_workbook

if TYPE_CHECKING:
    import pandas as pd


def sheet_from_frame(frame: pd.DataFrame, name: str) -> Sheet:
    """Turn a DataFrame into a sheet: its column names are row 1, its rows follow from row 2.

    Parameters
    ----------
    frame : DataFrame
        A named index is taken as the first columns, an unnamed one left out.
    name : str
        Name of the sheet.
    """
    import pandas as pd  # where frames are used: it would be a third of what the command needs to start

    table = frame.reset_index() if any(n is not None for n in frame.index.names) else frame
    columns = [
        [None if v is pd.NA or v is pd.NaT else _value(v) for v in table.iloc[:, i].tolist()]
        for i in range(table.shape[1])
    ]
    header: list[Value] = [_heading(c) for c in table.columns]
    return Sheet(name, [header, *(list(row) for row in zip(*columns, strict=True))])


def _heading(label: Any) -> str:
    return " ".join(str(part) for part in label) if isinstance(label, tuple) else str(label)


def _value(value: Any) -> Value:
    if value is None:
        return None
    if isinstance(value, bool | np.bool_):
        return bool(value)
    if isinstance(value, int | float | np.integer | np.floating):
        return None if value != value else float(value)
    if isinstance(value, datetime | date | time):
        return value
    text = str(value)
    return text if text.strip() else None


def read_frames(
    curves: pd.DataFrame,
    traffic: pd.DataFrame | None = None,
    limits: pd.DataFrame | LimitSet | None = None,
    settings: Mapping[str, Any] | None = None,
    *,
    answers: Mapping[str, Any] | None = None,
    methods: Sequence[str] = METHODS,
) -> Reading:
    """Read tables from memory by the same rules as a workbook.

    Parameters
    ----------
    curves, traffic, limits : DataFrame
        With canonical column names, or any that a workbook might have; ``limits`` may be a set.
    settings : mapping, optional
        Names of settings (``Rail spacing`` or ``rail_spacing_mm``) to values.
    answers : mapping, optional
        See :mod:`cant.reading.answers`.
    methods : sequence of str
        Names that the setting ``Method`` may have.

    Raises
    ------
    InputError
        As :func:`cant.reading.workbook.read_workbook`; rows are numbered as in a sheet with one header row.
    """
    book = Workbook("", "frame", [sheet_from_frame(curves, "Curves")])
    reading = read_workbook(
        book,
        answers=answers,
        traffic=None if traffic is None else Workbook("", "frame", [sheet_from_frame(traffic, "Traffic")]),
        limits=limits if isinstance(limits, LimitSet) else None,
        limits_table=Workbook("", "frame", [sheet_from_frame(limits, "Limits")])
        if limits is not None and not isinstance(limits, LimitSet)
        else None,
        methods=methods,
    )
    if settings is not None:
        reading.settings = settings_from_mapping(settings, methods)
    return reading
