"""The traffic and the limits as files with the canonical headers, to take out and to bring in again."""

from __future__ import annotations

import re

import pandas as pd

from cant import limit_sets
from cant.model.limits import LimitSet
from cant.model.traffic import Traffic

TRAFFIC_FILE = "Traffic.csv"
FORMULA_START = ("=", "+", "-", "@", "\t", "\r", "\n", "\uff1d", "\uff0b", "\uff0d", "\uff20")
"""Letters with which a spreadsheet begins a formula, the wide ones of some languages too."""


def traffic_csv(traffic: Traffic) -> bytes:
    """Give a traffic table as csv, UTF-8, speeds in km/h and masses in t."""
    rows = [
        {
            "Class": row.name,
            "Category": row.category,
            "Speed (km/h)": row.speed_kmh,
            "Trains per day": row.trains_per_day,
            "Mass (t)": row.mass_t,
            "Roll coefficient": row.roll_coefficient,
            "Centre of gravity (m)": row.centre_of_gravity_m,
            "Regular": "yes" if row.regular else "no",
            "Line": row.line,
            "Track": row.track,
        }
        for row in traffic.rows
    ]
    return _csv(pd.DataFrame(rows))


def limits_csv(limits: LimitSet) -> bytes:
    """Give the rows of a limit set as csv, UTF-8, each value in its stated unit."""
    return _csv(pd.DataFrame(limit_sets.as_table(limits)))


def file_name(name: str, ending: str) -> str:
    """Give a name that any file system takes: letters, digits, ``-`` and ``_``, and an ending."""
    return f"{re.sub(r'[^0-9A-Za-z_-]+', '-', name).strip('-') or 'cant'}{ending}"


def _csv(table: pd.DataFrame) -> bytes:
    """Give a table as csv; a text that a spreadsheet would take for a formula gets an apostrophe."""
    safe = table.map(lambda v: f"'{v}" if isinstance(v, str) and v.startswith(FORMULA_START) else v)
    return safe.to_csv(index=False, lineterminator="\r\n").encode("utf-8-sig")
