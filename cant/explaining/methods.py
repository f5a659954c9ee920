"""The methods side by side: what each would set on a curve and what that does to each class.

One optimiser plans them all, within the same limits; they differ in the target alone. Where they agree within
a step the choice of method does not matter; where they lie apart, it is the engineer's real choice.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.explaining.local import Surroundings, Trial, try_out
from cant.explaining.parts import Part, plan_part
from cant.explaining.reasons import METHOD_WORDS
from cant.explaining.wording import Words, listed
from cant.model.settings import METHODS
from cant.planning import Plan
from cant.planning.outcome import Outcome
from cant.quantities.kinematics import equilibrium_cant, unbalanced_acceleration

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

SHORT_LINE = 400
"""A line of so many curves is planned as a whole whatever is asked."""
ROUND_A_CURVE = 8
"""A curve planned apart, with what lies around it, costs as much as so many of a whole line."""
_SAME_MM = 1e-6


class Methods:
    """What the methods would set.

    Parameters
    ----------
    plan : Plan
    surroundings : Surroundings
    words : Words
    """

    def __init__(self, plan: Plan, surroundings: Surroundings, words: Words) -> None:
        self._plan, self._surroundings, self._words = plan, surroundings, words
        self._whole: dict[int, dict[str, _Figures]] = {}
        self._left: dict[int, int] = {}
        self._found: dict[int, list[dict[str, Any]]] = {}

    def prepare(self, indices: Sequence[int], rest_follows: bool = False) -> None:
        """Get ready to answer for some curves: many of them cost little more than one.

        A few of a long line are planned apart; for many, and where the whole list is asked for block by
        block, the parts of the line in which they lie are planned as a whole with each method.
        """
        outcome = self._plan.outcome
        wanted = [i for i in indices if outcome.planned[i] and self._figures_of(i) is None]
        wanted = [i for i in wanted if i not in self._found]
        if not wanted:
            return
        if rest_follows or len(outcome.curves) <= SHORT_LINE + ROUND_A_CURVE * len(wanted):
            for number in sorted({int(self._surroundings.part_of[i]) for i in wanted}):
                part = self._surroundings.parts[number]
                self._whole[number] = {method: self._with(part, method) for method in METHODS}
                self._left[number] = int(np.count_nonzero(outcome.planned[part.own]))
            return
        entries: dict[int, list[dict[str, Any]]] = {index: [] for index in wanted}
        for method in METHODS:
            if method == outcome.settings.method:
                figures, at = _Figures(outcome), dict(zip(wanted, wanted, strict=True))
            else:
                trials = [Trial(index) for index in wanted]
                answers = try_out(outcome, self._surroundings, trials, method=method)
                figures = _Figures(answers[0].outcome)
                at = {index: answer.at[index] for index, answer in zip(wanted, answers, strict=True)}
            for index in wanted:
                entries[index].append(self._entry(method, figures, at[index]))
        self._found |= entries

    def forget(self, indices: Sequence[int]) -> None:
        """Let go of what was worked out for some curves, as far as no others of their part need it."""
        for index in indices:
            self._found.pop(index, None)
            number = int(self._surroundings.part_of[index])
            if number in self._left and self._plan.outcome.planned[index]:
                self._left[number] -= 1
                if not self._left[number]:
                    del self._whole[number], self._left[number]

    def _figures_of(self, index: int) -> dict[str, _Figures] | None:
        return self._whole.get(int(self._surroundings.part_of[index])) if self._whole else None

    def of(self, index: int) -> list[dict[str, Any]]:
        """Give an entry for each method, in the order of METHODS; empty for a curve that is not planned.

        An entry has ``method``, ``words``, ``chosen``, ``target_mm``, ``cant_mm``,
        ``tonnes_in_excess_a_day`` [t], ``seconds_lost_a_day`` [s], ``limits_passed`` (their number, on its
        transitions too), and by class ``unbalance_mm`` [mm] and ``unbalanced_acceleration_ms2`` [m/s2]:
        positive is deficiency, negative excess.
        """
        if not self._plan.outcome.planned[index]:
            return []
        self.prepare([index])
        whole = self._figures_of(index)
        if whole is not None:
            at = int(self._surroundings.place_in_part[index])
            return [self._entry(method, figures, at) for method, figures in whole.items()]
        return self._found[index]

    def verdict(self, entries: Sequence[dict[str, Any]], step_mm: float) -> str:
        """Say whether the choice of method matters on a curve.

        Parameters
        ----------
        entries : sequence of dict
            As :meth:`of` gives them.
        step_mm : float
            Step of the grid of cants.
        """
        if not entries:
            return ""
        words = self._words
        cants = [entry["cant_mm"] for entry in entries]
        low, high = min(cants), max(cants)
        if high - low <= _SAME_MM:
            return f"All methods give {words.cant(low)}."
        if high - low <= step_mm + _SAME_MM:
            return f"All methods agree within a step: {words.cant(low)} to {words.cant(high)}."
        ends = [
            listed(e["method"] for e in entries if abs(e["cant_mm"] - cant) <= _SAME_MM)
            for cant in (low, high)
        ]
        return (
            f"The methods lie {words.cant(high - low)} apart, from {words.cant(low)} ({ends[0]}) to "
            f"{words.cant(high)} ({ends[1]}): a real choice between them."
        )

    def _with(self, part: Part, method: str) -> _Figures:
        outcome = self._plan.outcome
        if method == outcome.settings.method:
            return _Figures(outcome, part.own)
        answer = plan_part(outcome, part, method)
        return _Figures(answer, np.arange(len(part.own)))

    def _entry(self, method: str, figures: _Figures, i: int) -> dict[str, Any]:
        return {
            "method": method,
            "words": METHOD_WORDS[method],
            "chosen": method == self._plan.settings.method,
            **figures.of(i),
        }


class _Figures:
    """What one plan does to each class, as arrays.

    Parameters
    ----------
    outcome : Outcome
    at : ndarray of int, optional
        Curves of it that are kept; all when not told.
    """

    def __init__(self, outcome: Outcome, at: IntArray | None = None) -> None:
        at = np.arange(len(outcome.curves)) if at is None else at
        line = outcome.line.take(at)
        run = np.where(line.runs, outcome.proposed.run_kmh[at], np.nan)
        self._cant = outcome.cant_mm[at]
        cant = self._cant[:, None]
        balance = equilibrium_cant(run, line.radius_m, line.constant)
        self._names = outcome.traffic.class_names
        self._target = outcome.target(line, np.nan_to_num(run))[:, 0]
        self._unbalance: FloatArray = np.round(balance - cant, 2)
        self._acceleration: FloatArray = np.round(unbalanced_acceleration(balance, cant, line.spacing_mm), 4)
        tonnes = line.trains * line.mass_t
        with np.errstate(invalid="ignore"):
            over = line.runs & (run > 0) & (balance - cant < -_SAME_MM)
        self._tonnes = np.where(over, tonnes, 0.0).sum(axis=-1)
        self._lost = outcome.proposed.lost_s[at]
        passed = np.array(np.broadcast_to(outcome.proposed.passed.count, outcome.cant_mm.shape))
        between = np.broadcast_to(outcome.proposed.passed_between.count, outcome.pairs.first.shape)
        for own in (outcome.pairs.first, outcome.pairs.second):
            np.add.at(passed, own, between)
        self._passed = passed[at]
        self._runs: list[list[bool]] = line.runs.tolist()

    def of(self, i: int) -> dict[str, Any]:
        tonnes = float(self._tonnes[i])
        runs = [k for k, there in enumerate(self._runs[i]) if there]
        unbalance, acceleration = self._unbalance[i].tolist(), self._acceleration[i].tolist()
        return {
            "target_mm": float(self._target[i]),
            "cant_mm": float(self._cant[i]),
            "tonnes_in_excess_a_day": tonnes if np.isfinite(tonnes) else None,
            "seconds_lost_a_day": float(self._lost[i]),
            "limits_passed": int(self._passed[i]),
            "unbalance_mm": {self._names[k]: unbalance[k] for k in runs},
            "unbalanced_acceleration_ms2": {self._names[k]: acceleration[k] for k in runs},
        }
