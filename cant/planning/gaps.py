"""What the limits leave open: bands without a row where a row is needed, quantities without any row."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from cant.errors import InputError, Place
from cant.model.curves import CurveList
from cant.model.limits import QUANTITIES, LimitSet
from cant.model.plan import Finding
from cant.model.traffic import Traffic
from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE, Pairs
from cant.planning.rules import Asked

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

_NEEDED = (
    "cant",
    "cant deficiency",
    "cant excess",
    "felt acceleration",
    "cant gradient",
    "rate of change of cant",
    "rate of change of cant deficiency",
    "abrupt change of cant deficiency",
)


def needed(line: Line, pairs: Pairs, quantity: str) -> BoolArray:
    """Tell on which curve and for which class a quantity is needed, shape (n, k)."""
    ends = (BEFORE, AFTER)
    if quantity in ("cant gradient", "rate of change of cant"):
        alone, between = [~np.isnan(line.ramp_m[end]) for end in ends], ~pairs.equal_cants
    elif quantity == "rate of change of cant deficiency":
        alone, between = [line.transition_m[end] > 0 for end in ends], pairs.length_m > 0
    elif quantity == "abrupt change of cant deficiency":
        alone, between = [line.transition_m[end] == 0 for end in ends], pairs.length_m == 0
    else:
        return line.regular if quantity == "cant excess" else line.runs
    where: BoolArray = line.runs & (alone[BEFORE] | alone[AFTER])
    both = line.runs[pairs.first] & line.runs[pairs.second] & between[:, None]
    where[pairs.first] |= both
    where[pairs.second] |= both
    return where


def find_gaps(line: Line, pairs: Pairs, curves: CurveList, traffic: Traffic) -> list[Finding]:
    """Find the gaps in the limits at planned speeds: a finding for each curve and quantity concerned."""
    asked = Asked(line, line.planned_kmh, False)
    names = traffic.class_names
    findings = []
    for quantity in _NEEDED:
        if not line.table.may_have_gap(quantity):
            continue
        gap = asked.limit(quantity).gap & needed(line, pairs, quantity)
        for i in np.flatnonzero(gap.any(axis=-1)):
            j = int(np.argmax(gap[i]))
            text = (
                f"The limits have a gap: rows of '{quantity}' hold for {names[j]} here, but none at "
                f"{line.planned_kmh[i, j]:g} km/h and a radius of {curves.radius_m[i]:g} m."
            )
            findings.append(Finding("gap-in-limits", "stop", text, int(i)))
    findings += _gaps_without_trains(line, asked, curves)
    return findings


def _gaps_without_trains(line: Line, asked: Asked, curves: CurveList) -> list[Finding]:
    empty = ~line.runs.any(axis=-1) & ~np.isnan(line.radius_m[:, 0])
    if not empty.any():
        return []
    gap = asked.curve_limit("cant").gap[:, 0] & empty
    return [
        Finding(
            "gap-in-limits",
            "stop",
            f"The limits have a gap: no row of 'cant' holds at a radius of {curves.radius_m[i]:g} m.",
            int(i),
        )
        for i in np.flatnonzero(gap)
    ]


def find_unlimited(limits: LimitSet, traffic: Traffic) -> list[Finding]:
    """Say once for each quantity, or category of train, that nothing limits it."""
    findings = []
    categories = sorted({row.category for row in traffic.rows})
    for quantity, info in QUANTITIES.items():
        if not info.bounds:
            continue
        rows = limits.of(quantity)
        if not rows:
            text = f"The limits have no row of '{quantity}': it is not limited and was not checked."
            findings.append(Finding("not-limited", "warning", text))
            continue
        if any(not row.category for row in rows):
            continue
        known = {row.category.casefold() for row in rows}
        for category in categories:
            if category.casefold() not in known:
                text = (
                    f"The limits have no row of '{quantity}' for the category '{category}': "
                    "it is not limited there and was not checked."
                )
                findings.append(Finding("not-limited", "warning", text))
    return findings + _rows_of_no_class(limits, categories)


def _rows_of_no_class(limits: LimitSet, categories: list[str]) -> list[Finding]:
    """Say where a user's rows speak of a category that no class has: a typing error leaves them unused."""
    usual = {"passenger", "freight", *(category.casefold() for category in categories)}
    rows: dict[str, list[str]] = {}
    for row in limits.rows:
        if row.category and row.category.casefold() not in usual and row.place != Place():
            rows.setdefault(row.category, []).append(str(row.place.row))
    return [
        Finding(
            "category-without-class",
            "warning",
            f"No class of the traffic has the category '{category}': the limits of row{'s' * (len(at) > 1)} "
            f"{', '.join(at)} hold for none.",
        )
        for category, at in rows.items()
    ]


def demand_roll_coefficients(line: Line, traffic: Traffic) -> None:
    """Refuse a class without a roll coefficient where its felt acceleration is limited.

    Raises
    ------
    InputError
        Naming the row of the traffic table.
    """
    if not line.table.has("felt acceleration"):
        return
    limit = Asked(line, line.planned_kmh, False).limit("felt acceleration")
    lacking = np.asarray((np.isfinite(limit.value) & line.runs & np.isnan(line.roll)).any(axis=0))
    for name, lacks in zip(traffic.class_names, lacking, strict=True):
        if lacks:
            row = next(row for row in traffic.rows if row.name == name and row.roll_coefficient is None)
            message = (
                f"class '{name}' has no roll coefficient, and the limits have rows of 'felt acceleration' "
                "for it: give the coefficient, or take those rows out"
            )
            raise InputError(message, row.place)
