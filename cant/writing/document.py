"""The JSON of a plan: the contract's document, streamed curve by curve.

Metric always, whatever units people are shown; numbers that do not exist are null, never nan.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING, Any

import numpy as np

from cant.limit_sets import as_table
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from cant.version import __version__
from cant.writing.cautions import CAUTIONS, UNVERIFIED

if TYPE_CHECKING:
    from cant.writing.records import PlannedRecords

_BATCH = 200


def limits_entry(limits: LimitSet) -> dict[str, Any]:
    """Give ``limits`` of the JSON: which set, which edition, whether edited, and every row as stated.

    Parameters
    ----------
    limits : LimitSet
        The limits that the plan used.
    """
    head = limits.model_dump(exclude={"rows"}, mode="json")
    return {**head, "rows": as_table(limits)}


def settings_entry(settings: Settings) -> dict[str, Any]:
    """Give ``settings`` of the JSON: as stated, with the constant [mm m/(km/h)2] and e [mm] that follow."""
    return {
        **settings.model_dump(mode="json"),
        "equilibrium_constant_used": settings.constant,
        "rail_spacing_used_mm": settings.spacing_mm,
    }


def traffic_entry(traffic: Traffic) -> list[dict[str, Any]]:
    """Give ``traffic`` of the JSON: every row of the table, metric."""
    return [row.model_dump(mode="json") for row in traffic.rows]


def cautions_of(limits: LimitSet) -> list[str]:
    """Give the cautions that an output with these limits carries, the gravest first."""
    return [*([] if limits.verified else [UNVERIFIED]), *CAUTIONS]


def frame_of(planned: PlannedRecords) -> dict[str, Any]:
    """Give everything of the JSON but the curves.

    Parameters
    ----------
    planned : PlannedRecords
        The plan with its reading.
    """
    plan, reading = planned.plan, planned.reading
    return {
        "rejected": [row.as_json() for row in reading.rejected],
        "questions": [question.as_json() for question in reading.questions],
        "limits": limits_entry(plan.limits),
        "settings": settings_entry(plan.settings),
        "findings": [finding.as_json() for finding in planned.explanation.plan_findings],
        "traffic": traffic_entry(plan.traffic),
        "counts": {**plan.counts(), "rejected": int(np.count_nonzero(plan.curves.rejected))},
        "notes": list(reading.notes),
        "cautions": cautions_of(plan.limits),
        "input": {"file": reading.name, "sha256": reading.sha256},
        "program": {"name": "cant", "version": __version__},
    }


def chunks(
    planned: PlannedRecords, also: Callable[[dict[str, Any]], object] | None = None
) -> Iterator[bytes]:
    """Give the JSON as UTF-8 in pieces of some hundred curves.

    Parameters
    ----------
    planned : PlannedRecords
        The plan with its reading.
    also : callable, optional
        Called with each record, for another output that is made of them in the same pass.
    """
    yield b'{"curves": ['
    batch: list[str] = []
    begun = False
    for record in planned.records():
        batch.append(_text(record))
        if also is not None:
            also(record)
        if len(batch) == _BATCH:
            yield _joined(batch, begun)
            begun, batch = True, []
    if batch:
        yield _joined(batch, begun)
    rest = _text(frame_of(planned))
    yield ("\n], " + rest[1:] + "\n").encode()


def _joined(batch: list[str], begun: bool) -> bytes:
    return ((",\n" if begun else "\n") + ",\n".join(batch)).encode()


def _text(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False, default=_plain)


def _plain(value: Any) -> Any:
    """Turn what numpy holds into what JSON knows."""
    if isinstance(value, np.generic):
        return value.item()
    if isinstance(value, np.ndarray):
        return value.tolist()
    message = f"{type(value).__name__} has no place in the JSON of a plan"
    raise TypeError(message)
