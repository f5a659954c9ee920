"""Which curves the sheets of calculation hold, and their figures as flat arrays: one entry a curve and class.

Long registers are thinned by a rule that the sheets state: a workbook of a million formulas is nobody's to
check.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning import Plan
from cant.planning.limit_table import LimitAt
from cant.planning.permissible import speed_steps
from cant.quantities.kinematics import equilibrium_cant

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

CALCULATED = 1000
"""Most curves that the sheets of calculation hold."""

_GRAVEST_FIRST = ("not compliant", "restrict", "exceptional", "change", "kept")


def chosen_curves(plan: Plan, most: int = CALCULATED) -> IntArray:
    """Choose the curves to be calculated: all, or of a long list the gravest, in the order of the list.

    Parameters
    ----------
    plan : Plan
    most : int
        Most curves.
    """
    planned = np.flatnonzero(plan.outcome.planned)
    if len(planned) <= most:
        return planned
    rank = {status: number for number, status in enumerate(_GRAVEST_FIRST)}
    gravity = np.array([rank.get(plan.status[i], len(rank)) for i in planned])
    return np.asarray(np.sort(planned[np.argsort(gravity, kind="stable")[:most]]))


def rule_of_choice(plan: Plan, count: int) -> str:
    """Say which curves the sheets of calculation hold."""
    every = int(plan.outcome.planned.sum())
    if count == every:
        return "All curves that were planned."
    return (
        f"{count} of the {every} planned curves, so that the sheet can be checked and opened: the gravest "
        "first "
        "(not compliant, then speed restricted, exceptional, changed, kept), in the order of the list. The "
        "sheet 'Plan' and the JSON hold all."
    )


class Selection:
    """The chosen curves as arrays; a class that runs on one is an entry of its own, in the order of the list.

    Parameters
    ----------
    plan : Plan
    curves : ndarray of int
        Indices of the curves.

    Attributes
    ----------
    line : Line
        The curves alone.
    pos, column : ndarray of int, shape (entries,)
        Curve (its place among the chosen) and class of each entry.
    tier : ndarray of bool, shape (curves,)
        Whether exceptional values count on the curve.
    last_tier : ndarray of bool, shape (curves,)
        Whether exceptional values count there for permissible speeds.
    step_kmh : ndarray, shape (entries,)
        Speed step.
    run_kmh, permissible_kmh, lowest_kmh : ndarray, shape (entries,)
        Filled by :meth:`take`; nan until then.
    """

    def __init__(self, plan: Plan, curves: IntArray) -> None:
        outcome = plan.outcome
        self.plan = plan
        self.curves = curves
        self.place = {int(index): number for number, index in enumerate(curves)}
        self.line = outcome.line.take(curves)
        self.cant_mm: FloatArray = outcome.cant_mm[curves]
        allowed = outcome.curves.exceptional_allowed
        tier = outcome.exceptional[curves] & outcome.settings.allows_exceptional
        self.tier: BoolArray = tier if allowed is None else tier & allowed[curves]
        last = np.full(len(curves), outcome.settings.allows_exceptional)
        self.last_tier: BoolArray = last if allowed is None else last & allowed[curves]
        self.pos, self.column = (part.astype(np.int64) for part in np.nonzero(self.line.runs))
        self.start = np.searchsorted(self.pos, np.arange(len(curves) + 1))
        self.planned_kmh: FloatArray = self.line.planned_kmh[self.pos, self.column]
        self.step_kmh: FloatArray = np.broadcast_to(speed_steps(self.line), self.line.runs.shape)[
            self.pos, self.column
        ]
        self.run_kmh: FloatArray = np.full(len(self.pos), np.nan)
        self.permissible_kmh: FloatArray = np.full(len(self.pos), np.nan)
        self.lowest_kmh: FloatArray = np.full(len(self.pos), np.nan)
        self.records: list[dict[str, Any] | None] = [None] * len(curves)

    def __len__(self) -> int:
        return len(self.curves)

    def take(self, number: int, record: dict[str, Any]) -> None:
        """Take the figures of a curve from its record.

        Parameters
        ----------
        number : int
            Its place among the chosen.
        record : dict
        """
        at = int(self.start[number])
        for offset, entry in enumerate(record["classes"]):
            for array, key in (
                (self.run_kmh, "run_speed_kmh"),
                (self.permissible_kmh, "permissible_speed_kmh"),
                (self.lowest_kmh, "lowest_speed_kmh"),
            ):
                array[at + offset] = np.nan if entry[key] is None else entry[key]
        self.records[number] = {
            key: record[key]
            for key in ("lower_mm", "upper_mm", "lower_by", "upper_by", "rms_speed_kmh", "status")
        }
        self.records[number]["permissible_by"] = [e["permissible_by"] for e in record["classes"]]  # type: ignore[index]

    def of_curve(self, values: FloatArray) -> FloatArray:
        """Spread values of curves (curves,) or (curves, 1) over the entries."""
        return np.asarray(values.reshape(len(self))[self.pos])

    def of_class(self, values: npt.NDArray[Any]) -> npt.NDArray[Any]:
        """Take values of curve and class (curves, classes) at the entries."""
        return np.asarray(values[self.pos, self.column])

    def limit(
        self, quantity: str, speed_kmh: FloatArray, exceptional: bool, at: IntArray | None = None
    ) -> LimitAt:
        """Ask a limit at the speed of each entry, or of some of them."""
        pos, column = (self.pos, self.column) if at is None else (self.pos[at], self.column[at])
        return self.line.table.at(
            quantity,
            exceptional=exceptional,
            category=self.line.category[pos, column],
            situation=self.line.situation[pos, 0],
            speed=speed_kmh,
            radius=self.line.radius_m[pos, 0],
        )

    def tier_limit(self, quantity: str, speed_kmh: FloatArray, at: IntArray | None = None) -> LimitAt:
        """Ask a limit in the tier that counts on each curve."""
        pos = self.pos if at is None else self.pos[at]
        exceptional = self.tier[pos]
        loose, normal = (self.limit(quantity, speed_kmh, which, at) for which in (True, False))
        return LimitAt(
            np.where(exceptional, loose.value, normal.value),
            np.where(exceptional, loose.tolerance, normal.tolerance),
            np.where(exceptional, loose.row, normal.row),
            np.where(exceptional, loose.gap, normal.gap),
        )

    def balance(self, speed_kmh: FloatArray, at: IntArray | None = None) -> FloatArray:
        """Give the equilibrium cant [mm] of each entry at a speed."""
        pos = self.pos if at is None else self.pos[at]
        return equilibrium_cant(speed_kmh, self.line.radius_m[pos, 0], self.line.constant)

    def clauses(self, limit: LimitAt) -> list[str]:
        """Give the clause of the row that makes each limit, "" where none."""
        rows = self.plan.limits.rows
        return [rows[number].clause if number >= 0 else "" for number in limit.row.tolist()]


def number_or(values: Sequence[float] | FloatArray, word: str) -> list[float | str | None]:
    """Give finite numbers, and a word for the others."""
    return [value if np.isfinite(value) else word for value in np.asarray(values, dtype=np.float64).tolist()]
