"""A limit set as the canonical ``Limits`` table: for the command, the sheet of a workbook, an export.

The same headers that the reader knows, so that a printed set can be edited and given back.
"""

from __future__ import annotations

import math

from cant.model.limits import LimitRow, LimitSet
from cant.units import ratio

Cell = str | float | None

_US_SPEED, _US_RADIUS = "mph", "ft"


def as_table(limit_set: LimitSet) -> list[dict[str, Cell]]:
    """Give the rows of a limit set under the canonical headers.

    Parameters
    ----------
    limit_set : LimitSet
        Any set, the user's own as well.

    Returns
    -------
    list of dict
        One a row, in order, all with the same keys in the order of the columns: ``Quantity``, ``Normal``,
        ``Exceptional``, ``Unit``, ``Category``, ``Situation``, ``Speed over``, ``Speed up to``,
        ``Radius over``, ``Radius up to``, ``Per metre of radius``, ``Kind``, ``Clause``, ``Note``. In a set
        in US units the conditions are in mph and ft, and their headers say so: ``Speed over (mph)``.
        Values as stated; ``none`` where not limited; None for a blank.
    """
    return [_as_cells(row, us=limit_set.units == "us") for row in limit_set.rows]


def headers(limit_set: LimitSet) -> list[str]:
    """Give the headers of :func:`as_table`, in order, for a set with or without rows."""
    probe = LimitRow(quantity="cant", normal=0.0, unit="mm")
    return list(_as_cells(probe, us=limit_set.units == "us"))


def _as_cells(row: LimitRow, *, us: bool) -> dict[str, Cell]:
    """Put one row under its headers."""
    speed, radius = (f" ({_US_SPEED})", f" ({_US_RADIUS})") if us else ("", "")
    return {
        "Quantity": row.quantity,
        "Normal": _stated(row.normal),
        "Exceptional": _stated(row.exceptional),
        "Unit": row.unit,
        "Category": row.category or None,
        "Situation": row.situation or None,
        f"Speed over{speed}": _condition(row.speed_over_kmh, "km/h", _US_SPEED if us else "km/h"),
        f"Speed up to{speed}": _condition(row.speed_up_to_kmh, "km/h", _US_SPEED if us else "km/h"),
        f"Radius over{radius}": _condition(row.radius_over_m, "m", _US_RADIUS if us else "m"),
        f"Radius up to{radius}": _condition(row.radius_up_to_m, "m", _US_RADIUS if us else "m"),
        "Per metre of radius": row.per_metre_of_radius or None,
        "Kind": row.kind,
        "Clause": row.clause or None,
        "Note": row.note or None,
    }


def _stated(value: float | None) -> Cell:
    """Give a value as a cell: ``none`` where not limited, None where blank."""
    if value is None or math.isfinite(value):
        return value
    return "none"


def _condition(value: float | None, source: str, target: str) -> Cell:
    """Turn a condition into the unit shown; rounded at 1e-9 so that 25 mph comes back as 25."""
    return None if value is None else round(value * ratio(source, target), 9)
