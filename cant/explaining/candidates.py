"""Changes that might help where nothing fits: decisions with the numbers that speak for and against them.

Only candidates: :mod:`cant.explaining.options` plans each one and drops what does not fit.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.explaining.alignment import Alignment
from cant.explaining.candidate import Candidate
from cant.explaining.decisions import (
    Change,
    ClassSpeed,
    CurveKey,
    ExceptionalValues,
    ExcessWaived,
    SiteBounds,
)
from cant.explaining.local import Answer
from cant.explaining.room import (
    speeds_for_excess,
    without_excess,
    without_site,
)
from cant.model.curves import none_if_nan
from cant.planning.line import Line
from cant.planning.outcome import Outcome
from cant.planning.rules import Asked
from cant.quantities.kinematics import equilibrium_cant

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


class Proposals:
    """Candidates for some curves of a plan.

    Parameters
    ----------
    outcome : Outcome
    at : ndarray of int
        The curves.
    length_step_m, radius_step_m : float
        To what lengths and radii are rounded up.
    """

    def __init__(
        self,
        outcome: Outcome,
        at: IntArray,
        length_step_m: float,
        radius_step_m: float,
    ) -> None:
        self._outcome, self._at = outcome, at
        self._names = outcome.traffic.class_names
        line: Line = outcome.line.take(at)
        self._line = line
        grid = outcome.grid.take(at)
        target = outcome.target(line, np.nan_to_num(line.planned_kmh))[:, 0]
        self._raised = without_excess(line, grid)
        self._faster = speeds_for_excess(line, self._raised)
        asked = Asked(line, line.planned_kmh, False)
        self._excess_limit = np.broadcast_to(asked.limit("cant excess").value, line.runs.shape)
        self._excess = self._raised[:, None] - equilibrium_cant(
            line.planned_kmh, line.radius_m, line.constant
        )
        self._unsited = without_site(line, grid, target)
        self._alignment = Alignment(outcome, at, length_step_m, radius_step_m)

    def of(self, j: int) -> Iterator[Candidate]:
        """Yield what might help the j-th curve, but what needs another run of the planner to know."""
        yield from self._faster_slow(j)
        yield from self._waived(j)
        yield from self._alignment.of(j)
        yield from self._released(j)

    def slower(self, curve: int, outcome: Outcome, at: dict[int, int], kind: str) -> Candidate | None:
        """Give the candidate of running no faster than a plan lets the classes run.

        Parameters
        ----------
        curve : int
            The curve that it is for.
        outcome : Outcome
            Whose speeds are taken: those that are lower than the speeds run in the plan as it is, or than
            planned.
        at : dict of int to int
            The curves concerned, each with its position in that outcome.
        kind : str
        """
        changes: list[tuple[int, Change]] = []
        facts: list[dict[str, Any]] = []
        for own, position in at.items():
            run = outcome.proposed.run_kmh[position]
            before = self._outcome.proposed.run_kmh if outcome is not self._outcome and own != curve else None
            planned = outcome.line.planned_kmh[position] if before is None else before[own]
            with np.errstate(invalid="ignore"):
                slow = np.flatnonzero(outcome.line.runs[position] & (run < planned - 1e-6))
            if (run[slow] < 1.0).any():
                return None
            for k in slow:
                name, low, high = self._names[k], float(run[k]), float(planned[k])
                changes.append((own, self._on(ClassSpeed, own, class_name=name, speed_kmh=low)))
                where = None if own == curve else self._outcome.curves.curve[own]
                facts.append({"curve": where, "class": name, "from_kmh": high, "to_kmh": low})
        if not changes:
            return None
        lost = float(sum(outcome.proposed.lost_s[position] for position in at.values()))
        lost -= float(sum(self._outcome.proposed.lost_s[own] for own in at if own != curve))
        departure = max(1.0 - fact["to_kmh"] / fact["from_kmh"] for fact in facts)
        return Candidate(kind, curve, tuple(changes), departure, {"speeds": facts, "seconds": lost})

    def approved(self, curve: int, answer: Answer) -> Candidate | None:
        """Give the candidate of using exceptional values on the chain, with the speeds they still need."""
        changes: list[tuple[int, Change]] = [(own, self._on(ExceptionalValues, own)) for own in answer.at]
        facts: dict[str, Any] = {}
        departure = 0.0
        if answer.status(curve) == "restrict":
            slower = self.slower(curve, answer.outcome, {curve: answer.at[curve]}, "lower speed")
            if slower is None:
                return None
            changes += slower.changes
            facts, departure = slower.facts, slower.departure
        elif answer.status(curve) != "exceptional":
            return None
        return Candidate("exceptional value", curve, tuple(changes), departure, facts)

    def _on(self, kind: Any, curve: int, **values: Any) -> Any:
        return kind(on=CurveKey.of(self._outcome.curves, curve), **values)

    def _faster_slow(self, j: int) -> Iterator[Candidate]:
        line, curve = self._line, int(self._at[j])
        slow = np.flatnonzero(~np.isnan(self._faster[j]))
        if np.isnan(self._raised[j]) or not len(slow):
            return
        planned, wanted = line.planned_kmh[j, slow], self._faster[j, slow]
        if (planned <= 0).any() or (wanted > np.nanmax(line.planned_kmh[j])).any():
            return
        yield Candidate(
            "faster slow class",
            curve,
            tuple(
                (curve, self._on(ClassSpeed, curve, class_name=self._names[k], speed_kmh=float(v)))
                for k, v in zip(slow, wanted, strict=True)
            ),
            float((wanted / planned - 1.0).max()),
            {
                "speeds": [
                    {"class": self._names[k], "from_kmh": float(a), "to_kmh": float(b)}
                    for k, a, b in zip(slow, planned, wanted, strict=True)
                ]
            },
        )

    def _waived(self, j: int) -> Iterator[Candidate]:
        curve = int(self._at[j])
        if np.isnan(self._raised[j]):
            return
        with np.errstate(invalid="ignore"):
            over = self._line.regular[j] & (self._excess[j] > self._excess_limit[j] + 1e-3)
        classes = np.flatnonzero(over)
        if not len(classes):
            return
        excess, limit = self._excess[j, classes], self._excess_limit[j, classes]
        with np.errstate(divide="ignore", invalid="ignore"):
            share = np.where(limit > 0, excess / limit - 1.0, 10.0)
        yield Candidate(
            "excess waived",
            curve,
            tuple((curve, self._on(ExcessWaived, curve, class_name=self._names[k])) for k in classes),
            float(share.max()),
            {
                "excesses": [
                    {"class": self._names[k], "excess_mm": float(e), "limit_mm": float(m)}
                    for k, e, m in zip(classes, excess, limit, strict=True)
                ]
            },
        )

    def _released(self, j: int) -> Iterator[Candidate]:
        curve, curves = int(self._at[j]), self._outcome.curves
        cant = float(self._unsited[j])
        if np.isnan(cant):
            return
        if curves.held(curve) is not None:
            return
        fixed = bool(self._line.fixed[j, 0])
        most, least = (none_if_nan(v[curve]) for v in (curves.cant_at_most_mm, curves.cant_at_least_mm))
        old = curves.cant_mm[curve] if fixed else None
        new_most = max(most, cant) if most is not None else None
        new_least = min(least, cant) if least is not None else None
        if not fixed and new_most == most and new_least == least:
            return
        moved = [abs(cant - bound) / max(bound, 20.0) for bound in (old, most, least) if bound is not None]
        yield Candidate(
            "site bound",
            curve,
            ((curve, self._on(SiteBounds, curve, cant_at_most_mm=new_most, cant_at_least_mm=new_least)),),
            float(max(moved)),
            {
                "fixed_mm": none_if_nan(old) if old is not None else None,
                "at_most_mm": (most, new_most) if new_most != most else None,
                "at_least_mm": (least, new_least) if new_least != least else None,
            },
        )
