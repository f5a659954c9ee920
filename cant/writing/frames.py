"""A plan as pandas data frames, for engineers who work in notebooks: flat, metric, names as in the JSON.

The nested JSON is flattened by one stated rule, so that both speak of a number by the same name.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cant.limit_sets import as_table
from cant.writing.document import traffic_entry

if TYPE_CHECKING:
    import pandas as pd

    from cant.writing.records import PlannedRecords

_KEY = ("sheet", "row", "line", "track", "curve")


def to_frames(planned: PlannedRecords) -> dict[str, pd.DataFrame]:
    """Give a plan as data frames.

    Parameters
    ----------
    planned : PlannedRecords
        The plan.

    Returns
    -------
    dict of str to DataFrame
        ``curves`` one row a curve (``lower_by`` and the like as ``lower_by_quantity``, ``as_read`` as
        ``as_read_radius_m`` ...); ``classes`` one row a curve and class with the proposed cant (``cant`` is
        ``proposed``) and with today's (``today``); ``findings``, ``options``, ``limits_passed`` one row each;
        ``rejected`` rows; ``limits`` and ``traffic`` as used. Metric; the columns ``sheet, row, line, track,
        curve`` tell everywhere which curve is meant.
    """
    import pandas as pd  # only where frames are asked for: it is slow to load and large

    rows: dict[str, list[dict[str, Any]]] = {
        name: [] for name in ("curves", "classes", "findings", "options", "limits_passed")
    }
    for record in planned.records():
        key = {name: record[name] for name in _KEY}
        rows["curves"].append(_flat(record))
        rows["classes"] += _class_rows(key, record)
        for name in ("findings", "options", "limits_passed"):
            rows[name] += [{**key, **_flat(entry)} for entry in record.get(name, [])]
    nowhere = dict.fromkeys(_KEY, None)
    rows["findings"] += [{**nowhere, **f.as_json()} for f in planned.explanation.plan_findings]
    rows["rejected"] = [row.as_json() for row in planned.reading.rejected]
    rows["limits"] = as_table(planned.plan.limits)
    rows["traffic"] = traffic_entry(planned.plan.traffic)
    return {name: pd.DataFrame.from_records(entries) for name, entries in rows.items()}


def _class_rows(key: dict[str, Any], record: dict[str, Any]) -> list[dict[str, Any]]:
    proposed = [("proposed", entry) for entry in record["classes"]]
    today = [("today", entry) for entry in record["today"]["classes"]]
    return [{**key, "cant": which, **_flat(entry)} for which, entry in proposed + today]


def _flat(record: dict[str, Any]) -> dict[str, Any]:
    """Flatten dicts into ``outer_inner``; lists have frames of their own and are left out."""
    flat: dict[str, Any] = {}
    for name, value in record.items():
        if isinstance(value, dict):
            flat |= {f"{name}_{inner}": v for inner, v in _flat(value).items()}
        elif not isinstance(value, list):
            flat[name] = value
    return flat
