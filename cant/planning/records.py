"""Records of a plan, made when somebody looks: from arrays of a block of curves to what the JSON holds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.model.curves import LEFT, RIGHT, none_if_nan
from cant.model.limits import LimitRow
from cant.planning.assess import Speeds, line_speeds
from cant.planning.governing import (
    NOTHING,
    Governing,
    bounds,
    next_trial,
    shared_stoppers,
    speed_stoppers,
)
from cant.planning.line import Line
from cant.planning.needed import EndFigures, end_figures
from cant.planning.neighbours import AFTER, BEFORE, Pairs
from cant.planning.outcome import TODAY_WORDS, UNKNOWN, Outcome
from cant.planning.passed import PassedLimit, passed_limits
from cant.planning.permissible import lowest_speeds, speed_steps
from cant.planning.rules import Rule
from cant.planning.shared import Meeting
from cant.planning.targets import rms_speed
from cant.quantities.kinematics import equilibrium_cant, felt_acceleration, unbalanced_acceleration
from cant.quantities.speeds import equilibrium_speed

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass
class _View:
    """Some curves with given cants: what each class then has; arrays (n, k)."""

    cant_mm: FloatArray
    speeds: Speeds
    normal: Speeds
    balance_mm: FloatArray
    unbalanced_ms2: FloatArray
    felt_ms2: FloatArray
    lowest_kmh: FloatArray
    stopped_by: Governing
    ends: tuple[EndFigures, EndFigures]
    passed: list[list[PassedLimit]]


def _view(
    line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool, at_planned: bool, wanted: int
) -> _View:
    """Look at given cants; the limits passed are those of the first ``wanted`` curves."""
    cant = cant_mm[:, None]
    speeds = line_speeds(line, pairs, cant_mm, exceptional)
    normal = line_speeds(line, pairs, cant_mm, False) if exceptional else speeds
    balance = equilibrium_cant(speeds.run_kmh, line.radius_m, line.constant)
    unbalanced = unbalanced_acceleration(balance, cant, line.spacing_mm)
    return _View(
        cant_mm=cant_mm,
        speeds=speeds,
        normal=normal,
        balance_mm=balance,
        unbalanced_ms2=unbalanced,
        felt_ms2=felt_acceleration(unbalanced, line.roll),
        lowest_kmh=lowest_speeds(line, cant, exceptional),
        stopped_by=_stopped_by(line, pairs, cant, speeds, exceptional),
        ends=end_figures(line, pairs, cant_mm, speeds.run_kmh),
        passed=passed_limits(
            line, pairs, cant_mm, line.planned_kmh if at_planned else speeds.run_kmh, wanted
        ),
    )


def _stopped_by(line: Line, pairs: Pairs, cant: FloatArray, speeds: Speeds, exceptional: bool) -> Governing:
    """Find what forbids the next multiple of the speed step above each permissible speed."""
    trial = next_trial(speeds.permissible_kmh, speed_steps(line))
    found = speed_stoppers(line, cant, trial, exceptional)
    known = ~np.isnan(cant[:, 0])
    pairs = pairs.take(np.flatnonzero(known[pairs.first] & known[pairs.second]))
    if not len(pairs):
        return found
    sides = (pairs.first, pairs.second)
    results = shared_stoppers(
        Meeting.of(line, pairs),
        (cant[pairs.first], cant[pairs.second]),
        (speeds.own_kmh[pairs.first], speeds.own_kmh[pairs.second]),
        (trial[pairs.first], trial[pairs.second]),
        exceptional,
    )
    for owner, other in zip(sides, results, strict=True):
        for number, rule in enumerate(other.rules):
            worse = (other.rule == number) & (other.value > found.value[owner])
            spread = Governing.nothing(found.value.shape, 0.0)
            spread.value[owner], spread.column[owner], spread.row[owner] = (
                other.value,
                other.column,
                other.row,
            )
            where = np.zeros(found.value.shape, dtype=np.bool_)
            where[owner] = worse
            found.replace(where, spread.value, rule, spread.column, spread.row)
    return found


class RecordBlock:
    """The records of some curves of a plan.

    Parameters
    ----------
    outcome : Outcome
    at : ndarray of int
        Curves wanted.
    """

    def __init__(self, outcome: Outcome, at: IntArray) -> None:
        self._outcome = outcome
        self._at = at
        every = outcome.pairs.beside(at)
        line, pairs = outcome.line.take(every), outcome.pairs.among(every)
        self._line = line
        tier = outcome.settings.allows_exceptional
        self._names = outcome.traffic.class_names
        self._proposed = _view(line, pairs, outcome.cant_mm[every], tier, False, len(at))
        today = np.where(outcome.planned, outcome.curves.cant_mm, np.nan)[every]
        self._today = _view(line, pairs, today, tier, True, len(at))
        self._bounds = [bounds(line, exceptional) for exceptional in ((False, True) if tier else (False,))]
        self._rms = rms_speed(line, line.planned_kmh)[:, 0]
        self._target = outcome.target(line, np.nan_to_num(self._proposed.speeds.run_kmh))[:, 0]
        self._shares_next = set(outcome.pairs.first[np.isin(outcome.pairs.first, at)].tolist())
        self._shares_before = set(outcome.pairs.second[np.isin(outcome.pairs.second, at)].tolist())

    def record(self, j: int) -> dict[str, Any]:
        """Give the record of the j-th curve wanted."""
        outcome, curves = self._outcome, self._outcome.curves
        i = int(self._at[j])
        planned = bool(outcome.planned[i])
        exceptional = bool(outcome.exceptional[i])
        low, high = self._bounds[1 if exceptional and len(self._bounds) > 1 else 0]
        cant = outcome.cant_mm[i]
        record: dict[str, Any] = {
            "sheet": curves.sheet[i],
            "row": int(curves.row[i]),
            "line": curves.line[i],
            "track": curves.track[i],
            "curve": curves.curve[i],
            "radius_m": none_if_nan(curves.radius_m[i]),
            "hand": {LEFT: "L", RIGHT: "R"}.get(int(curves.hand[i])),
            "existing_cant_mm": none_if_nan(curves.cant_mm[i]),
            "recommended_cant_mm": none_if_nan(cant),
            "cant_held": curves.held(i),
            "status": outcome.status[i],
            "tier": "exceptional" if exceptional else "normal",
            "lower_mm": none_if_nan(low.value[j]) if planned else None,
            "upper_mm": none_if_nan(high.value[j]) if planned else None,
            "lower_by": self._governs(low, j) if planned else None,
            "upper_by": self._governs(high, j) if planned else None,
            "target_cant_mm": none_if_nan(self._target[j]) if planned else None,
            "rms_speed_kmh": none_if_nan(self._rms[j]) if planned and self._rms[j] > 0 else None,
            "equilibrium_speed_kmh": self._equilibrium_speed(j) if planned else None,
            "running_time_lost_s": float(outcome.proposed.lost_s[i]) if planned else None,
            "shares_transition_with_next": (self._shares_before if self._turned(i) else self._shares_next)
            >= {i},
            "classes": self._classes(self._proposed, j) if planned else [],
            "limits_passed": [self._passed(limit) for limit in self._proposed.passed[j]] if planned else [],
            "transitions": self._ends(self._proposed, j, i) if planned else {},
            "today": self._of_today(j, i),
            "findings": [f.as_json() for f in outcome.findings_of(i)],
            "options": [],
            "as_read": curves.as_read(i),
        }
        return record

    def _turned(self, i: int) -> bool:
        return bool(self._outcome.neighbourhood.descending[i])

    def _equilibrium_speed(self, j: int) -> float | None:
        cant = self._proposed.cant_mm[j]
        if not cant >= 0:
            return None
        return none_if_nan(float(equilibrium_speed(cant, self._line.radius_m[j, 0], self._line.constant)))

    def _limit_row(self, number: int) -> LimitRow | None:
        return self._outcome.limits.rows[number] if number >= 0 else None

    def _by(self, rule: Rule | None, column: int, number: int) -> dict[str, Any] | None:
        if rule is None:
            return None
        row = self._limit_row(number)
        of_class = rule.of_class and column != NOTHING
        if rule.quantity in ("cant", "cant gradient") and row is not None:
            of_class = bool(row.category) or row.speed_over_kmh is not None or row.speed_up_to_kmh is not None
        return {
            "quantity": rule.quantity,
            "clause": (row.clause or None) if row is not None else None,
            "class": self._names[column] if of_class else None,
            "place": rule.place,
        }

    def _governs(self, governing: Governing, j: int) -> dict[str, Any] | None:
        return self._by(governing.rule_at(j), int(governing.column[j]), int(governing.row[j]))

    def _passed(self, limit: PassedLimit) -> dict[str, Any]:
        by = self._by(limit.rule, limit.column, limit.row)
        return {
            **(by or {}),
            "value": limit.value,
            "limit": limit.limit,
            "exceptional_limit": none_if_nan(limit.exceptional),
            "within_exceptional": limit.within_exceptional,
        }

    def _classes(self, view: _View, j: int) -> list[dict[str, Any]]:
        line, figures = self._line, []
        for k in np.flatnonzero(line.runs[j]):
            balance, cant = view.balance_mm[j, k], view.cant_mm[j]
            permissible = none_if_nan(view.speeds.permissible_kmh[j, k])
            stopped = view.stopped_by.rule_at((j, int(k)))
            row = int(view.stopped_by.row[j, k])
            figures.append(
                {
                    "class": self._names[k],
                    "speed_kmh": float(line.planned_kmh[j, k]),
                    "run_speed_kmh": none_if_nan(view.speeds.run_kmh[j, k]),
                    "equilibrium_cant_mm": none_if_nan(balance),
                    "deficiency_mm": none_if_nan(np.maximum(balance - cant, 0.0)),
                    "excess_mm": none_if_nan(np.maximum(cant - balance, 0.0)),
                    "unbalanced_acceleration_ms2": none_if_nan(view.unbalanced_ms2[j, k]),
                    "felt_acceleration_ms2": none_if_nan(view.felt_ms2[j, k]),
                    "permissible_speed_kmh": permissible,
                    "permissible_by": self._by(stopped, int(k), row),
                    "permissible_speed_normal_kmh": none_if_nan(view.normal.permissible_kmh[j, k]),
                    "lowest_speed_kmh": none_if_nan(view.lowest_kmh[j, k]),
                    "regular": bool(line.regular[j, k]),
                }
            )
        return figures

    def _of_today(self, j: int, i: int) -> dict[str, Any]:
        outcome = self._outcome
        known = outcome.today[i] != UNKNOWN
        return {
            "status": TODAY_WORDS[outcome.today[i]],
            "breaks": [self._passed(limit) for limit in self._today.passed[j]] if known else [],
            "classes": self._classes(self._today, j) if known else [],
        }

    def _ends(self, view: _View, j: int, i: int) -> dict[str, Any]:
        before, after = (self._end(view, end, j, i) for end in (BEFORE, AFTER))
        return {"in": after, "out": before} if self._turned(i) else {"in": before, "out": after}

    def _end(self, view: _View, end: int, j: int, i: int) -> dict[str, Any]:
        figures, neighbourhood = view.ends[end], self._outcome.neighbourhood
        shared = i in (self._shares_next if end == AFTER else self._shares_before)
        kind = "not known"
        if shared:
            kind = "shared"
        elif neighbourhood.on_straight[end, i]:
            kind = "none"
        elif figures.length_m[j] > 0:
            kind = "to straight"
        ramp_class, transition_class = int(figures.ramp_by[j]), int(figures.transition_by[j])
        return {
            "kind": kind,
            "length_m": none_if_nan(figures.length_m[j]),
            "ramp_m": none_if_nan(figures.ramp_m[j]),
            "ramp_room_m": none_if_nan(neighbourhood.ramp_room_m[end, i]),
            "change_of_cant_mm": none_if_nan(figures.change_mm[j]),
            "cant_gradient_mm_per_m": none_if_nan(figures.gradient_mm_per_m[j]),
            "ramp_needed_m": none_if_nan(figures.ramp_needed_m[j]),
            "ramp_needed_by": self._names[ramp_class] if ramp_class >= 0 else None,
            "transition_needed_m": none_if_nan(figures.transition_needed_m[j]),
            "transition_needed_by": self._names[transition_class] if transition_class >= 0 else None,
            "classes": [
                {
                    "class": self._names[k],
                    "rate_of_change_of_cant_mm_per_s": none_if_nan(figures.cant_rate_mm_per_s[j, k]),
                    "rate_of_change_of_cant_deficiency_mm_per_s": none_if_nan(
                        figures.deficiency_rate_mm_per_s[j, k]
                    ),
                    "abrupt_change_of_cant_deficiency_mm": none_if_nan(figures.jump_mm[j, k]),
                }
                for k in np.flatnonzero(self._line.runs[j])
            ],
        }
