"""The result: the records of a plan as its JSON has them, and the findings.

The numbers of a plan live in arrays (:mod:`cant.planning`); these models say what is written out. A record is
made when somebody looks at a curve, not before.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict

Status = Literal["not assessed", "not compliant", "restrict", "exceptional", "kept", "change"]
STATUSES: tuple[Status, ...] = ("not assessed", "not compliant", "restrict", "exceptional", "kept", "change")
"""From the gravest to the least; the first that holds is a curve's status."""

TodayStatus = Literal["keeps normal limits", "needs exceptional limits", "breaks limits", "not known"]
Severity = Literal["stop", "warning", "advice"]


@dataclass(frozen=True, slots=True)
class Finding:
    """Something a good engineer would notice.

    Attributes
    ----------
    code : str
        Short name of the kind of finding, for filters; lower case with hyphens.
    severity : str
        ``stop`` (do not use before it is settled), ``warning`` or ``advice``.
    text : str
        One sentence with its numbers and units.
    curve : int or None
        Index of the curve in the list; None where it concerns the whole plan.
    clause : str
        Clause of the limit concerned, "" where there is none.
    """

    code: str
    severity: Severity
    text: str
    curve: int | None = None
    clause: str = ""

    def as_json(self) -> dict[str, Any]:
        """Give the finding as the JSON of a plan has it."""
        return {"code": self.code, "severity": self.severity, "text": self.text, "clause": self.clause}


class _Record(BaseModel):
    model_config = ConfigDict(extra="allow")


class Governing(_Record):
    """What governs a bound or a speed. Keys ``quantity``, ``clause`` and ``class`` in JSON."""

    quantity: str
    clause: str | None = None


class ClassFigures(_Record):
    """What one class has on a curve with a cant as set (key ``class`` names it)."""

    speed_kmh: float
    run_speed_kmh: float
    equilibrium_cant_mm: float
    deficiency_mm: float
    excess_mm: float
    unbalanced_acceleration_ms2: float
    felt_acceleration_ms2: float | None
    permissible_speed_kmh: float | None
    permissible_by: Governing | None
    permissible_speed_normal_kmh: float | None
    lowest_speed_kmh: float


class Today(_Record):
    """The same with today's cant."""

    status: TodayStatus
    breaks: list[dict[str, Any]]
    classes: list[ClassFigures]


class AsRead(_Record):
    """The row after units and notation are resolved."""

    radius_m: float | None
    hand: str | None
    length_m: float | None
    start_km: float | None
    end_km: float | None
    transition_in_m: float | None
    transition_out_m: float | None
    cant_mm: float | None
    speed_kmh: float | None
    situation: str | None


class CurveRecord(_Record):
    """One curve of the plan."""

    sheet: str
    row: int
    line: str
    track: str
    curve: str
    radius_m: float | None
    hand: str | None
    existing_cant_mm: float | None
    recommended_cant_mm: float | None
    status: Status
    lower_mm: float | None
    upper_mm: float | None
    lower_by: Governing | None
    upper_by: Governing | None
    rms_speed_kmh: float | None
    equilibrium_speed_kmh: float | None
    shares_transition_with_next: bool
    classes: list[ClassFigures]
    today: Today
    findings: list[dict[str, Any]]
    options: list[dict[str, Any]]
    as_read: AsRead


class PlanDocument(_Record):
    """The whole JSON of a plan (metric always)."""

    curves: list[CurveRecord]
    rejected: list[dict[str, Any]]
    questions: list[dict[str, Any]]
    limits: dict[str, Any]
    settings: dict[str, Any]
    findings: list[dict[str, Any]]
