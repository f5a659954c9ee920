"""Changes that might help where nothing fits: decisions with the numbers that speak for and against them.

Only candidates: :mod:`cant.explaining.options` plans each one and drops what does not fit.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.explaining.candidate import Candidate
from cant.explaining.decisions import (
    Change,
    ClassSpeed,
    CurveKey,
    ExceptionalValues,
    ExcessWaived,
    Flatter,
    SharedLength,
    SiteBounds,
    TransitionLength,
)
from cant.explaining.local import Answer
from cant.explaining.room import (
    lengths_needed,
    radius_needed,
    shared_lengths_needed,
    speeds_for_excess,
    without_ends,
    without_excess,
    without_site,
)
from cant.model.curves import none_if_nan
from cant.planning.line import Line
from cant.planning.outcome import Outcome
from cant.planning.rules import Asked
from cant.quantities.geometry import apex_offset, turn_of_curve
from cant.quantities.kinematics import equilibrium_cant
from cant.quantities.shapes import shift_of_arc

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

_LARGEST_TURN_RAD = 2.5
"""Curves that turn further have no useful apex between their tangents."""

_WIDE_MOVE_M = 20.0
"""Moving the apex of a curve this far departs from what is there as much as doubling its radius."""


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

    def __init__(self, outcome: Outcome, at: IntArray, length_step_m: float, radius_step_m: float) -> None:
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
        self._lengths = lengths_needed(line, grid, target, length_step_m)
        self._radius = radius_needed(line, grid, target, radius_step_m)
        self._shared = self._shared_lengths(length_step_m)

    def _shared_lengths(self, rounding_m: float) -> dict[int, list[tuple[int, int, float, float]]]:
        """Give for each curve (first, second, length there is, length needed) of its shared transitions."""
        outcome = self._outcome
        every = outcome.pairs.beside(self._at)
        line, pairs = outcome.line.take(every), outcome.pairs.among(every)
        target = outcome.target(line, np.nan_to_num(line.planned_kmh))[:, 0]
        cant = without_ends(line, outcome.grid.take(every), target)
        needed = shared_lengths_needed(line, pairs, cant, rounding_m)
        found: dict[int, list[tuple[int, int, float, float]]] = {}
        for j in np.flatnonzero(~np.isnan(needed)):
            first, second = int(every[pairs.first[j]]), int(every[pairs.second[j]])
            for curve in (first, second):
                found.setdefault(curve, []).append(
                    (first, second, float(pairs.length_m[j]), float(needed[j]))
                )
        return found

    def of(self, j: int) -> Iterator[Candidate]:
        """Yield what might help the j-th curve, but what needs another run of the planner to know."""
        yield from self._faster_slow(j)
        yield from self._waived(j)
        yield from self._longer(j)
        yield from self._flatter(j)
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

    def _longer(self, j: int) -> Iterator[Candidate]:
        curve, curves = int(self._at[j]), self._outcome.curves
        turned = bool(self._outcome.neighbourhood.descending[curve])
        changes, facts, departure, taken = [], [], 0.0, 0.0
        for end in (0, 1):
            wanted = self._lengths[end][j]
            if np.isnan(wanted):
                continue
            has = float(np.nan_to_num(self._line.transition_m[end][j, 0]))
            side = ("out" if end == 0 else "in") if turned else ("in" if end == 0 else "out")
            changes.append((curve, self._on(TransitionLength, curve, end=side, length_m=float(wanted))))
            radius, shape = float(self._line.radius_m[j, 0]), curves.shape[curve]
            shift = float(shift_of_arc(wanted, radius, shape) - shift_of_arc(has, radius, shape))
            facts.append({"end": side, "from_m": has, "to_m": float(wanted), "shift_m": shift})
            departure = max(departure, (wanted - has) / max(has, 20.0))
            taken += (wanted - has) / 2
        for first, second, has, wanted in self._shared.get(curve, []):
            after = CurveKey.of(curves, second)
            changes.append((first, self._on(SharedLength, first, length_m=wanted, next=after)))
            bend = abs(
                curves.hand[first] / curves.radius_m[first] - curves.hand[second] / curves.radius_m[second]
            )
            radius = 1.0 / max(float(bend), 1e-9)
            shift = float(shift_of_arc(wanted, radius, curves.shape[first])) - float(
                shift_of_arc(has, radius, curves.shape[first])
            )
            other = curves.curve[second if first == curve else first]
            facts.append({"shared_with": other, "from_m": has, "to_m": wanted, "shift_m": shift})
            departure = max(departure, (wanted - has) / max(has, 20.0))
            taken += (wanted - has) / 2
        arc = self._outcome.neighbourhood.weight_length_m[curve]
        if changes and taken < arc - 1.0:
            yield Candidate("longer transition", curve, tuple(changes), departure, {"transitions": facts})

    def _flatter(self, j: int) -> Iterator[Candidate]:
        curve, curves = int(self._at[j]), self._outcome.curves
        wanted, today = self._radius[j], float(self._line.radius_m[j, 0])
        if np.isnan(wanted):
            return
        arc = np.nanmax(
            [curves.length_m[curve], 1000 * abs(curves.end_km[curve] - curves.start_km[curve]), -1.0]
        )
        ends = np.nan_to_num([curves.transition_in_m[curve], curves.transition_out_m[curve]])
        turn = float(turn_of_curve(arc, today, ends[0], ends[1])) if arc > 0 else np.nan
        if turn > _LARGEST_TURN_RAD:
            return
        offset = none_if_nan(float(apex_offset(today, wanted, turn))) if not np.isnan(turn) else None
        yield Candidate(
            "flatter curve",
            curve,
            ((curve, self._on(Flatter, curve, radius_m=float(wanted))),),
            max(float(wanted / today - 1.0), (offset or 0.0) / _WIDE_MOVE_M),
            {"from_m": today, "to_m": float(wanted), "offset_m": offset},
        )

    def _released(self, j: int) -> Iterator[Candidate]:
        curve, curves = int(self._at[j]), self._outcome.curves
        cant = float(self._unsited[j])
        if np.isnan(cant):
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
