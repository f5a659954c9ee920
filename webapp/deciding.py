"""Whether a decision can be followed: the list must be readable with it before it is kept."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from cant import service
from cant.errors import InputError
from cant.model.limits import QUANTITIES, LimitSet
from cant.model.reading import Reading
from cant.model.traffic import Traffic
from cant.units import UNITS
from webapp.keeping.store import StoredPlan
from webapp.tables import TRAFFIC_FILE, traffic_csv


class _Undecided:
    """Stands for what a decision leaves as it was."""


AS_BEFORE = _Undecided()


def check_reading(
    plan: StoredPlan,
    data: bytes,
    *,
    answers: Mapping[str, Any] | _Undecided | None = AS_BEFORE,
    traffic: Traffic | _Undecided | None = AS_BEFORE,
    limits: LimitSet | _Undecided | None = AS_BEFORE,
    traffic_file: tuple[bytes, str] | None = None,
    limits_file: tuple[bytes, str] | None = None,
) -> Reading:
    """Read a plan's file as if something else were decided.

    Parameters
    ----------
    plan : StoredPlan
    data : bytes
        Content of its file.
    answers, traffic, limits : optional
        What replaces the decision that holds; None takes it back.
    traffic_file, limits_file : (bytes, str), optional
        A file whose table replaces it.

    Raises
    ------
    CantError
        The list cannot be read then: what, where, and what would be right.
    """
    decided = plan.decided
    used_traffic = decided.traffic if isinstance(traffic, _Undecided) else traffic
    used_limits = decided.limits if isinstance(limits, _Undecided) else limits
    used_answers = decided.answers if isinstance(answers, _Undecided) else answers
    as_file = None if used_traffic is None else (traffic_csv(used_traffic), TRAFFIC_FILE)
    return service.read_curves(
        data,
        plan.file_name,
        traffic=traffic_file or as_file,
        limits=limits_file or used_limits,
        answers=used_answers,
    )


def checked_units(limits: LimitSet) -> LimitSet:
    """Give limits back where each is stated in a unit that fits its quantity; InputError where one is not."""
    for row in limits.rows:
        fits = QUANTITIES[row.quantity].dimensions
        if UNITS[row.unit].dimension not in fits:
            symbols = [symbol for symbol, unit in UNITS.items() if unit.dimension in fits]
            message = f"{row.quantity} cannot be stated in {row.unit}; use one of {', '.join(symbols)}"
            raise InputError(message)
    return limits
