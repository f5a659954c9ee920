"""Many small changes of a line planned at once: each on a copy of the few curves that it can touch.

A change on a curve reaches no further than its chain of shared transitions, and looks no further than the
next curve on either side. So the part of the line around it is copied, changed, and moved along the chainage
out of sight of all other copies; one run of the planner then answers for hundreds of changes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from cant.explaining.decisions import Change, CurveKey, make_changes, open_exceptional
from cant.explaining.parts import Part, parts_of, placed_on
from cant.model.plan import STATUSES
from cant.planning.neighbours import chains_of
from cant.planning.outcome import Outcome, plan_arrays

IntArray = npt.NDArray[np.int64]

APART_KM = 20.0
"""Copies lie this far apart: further than any transition reaches."""
_RANK = {status: rank for rank, status in enumerate((*STATUSES, ""))}


@dataclass(frozen=True)
class Trial:
    """A change to be planned.

    Attributes
    ----------
    curve : int
        The curve that it is for.
    changes : sequence of (int, Change)
        Each with the curve that it changes, all of one chain.
    exceptional : bool or None
        Whether exceptional values may be used on the whole chain; None: as the plan has it.
    moves : bool
        The ends of the curve move: the room of the chains on either side changes, so they are planned too.
    """

    curve: int
    changes: Sequence[tuple[int, Change]] = ()
    exceptional: bool | None = None
    moves: bool = False


@dataclass(frozen=True)
class Answer:
    """Where a trial stands in the outcome of all of them.

    Attributes
    ----------
    outcome : Outcome
        Of all the copies together.
    at : dict of int to int
        Position in it of each curve that was planned as in the whole line.
    """

    outcome: Outcome
    at: dict[int, int]

    def status(self, curve: int) -> str:
        """Give the status of a curve of the chain."""
        return self.outcome.status[self.at[curve]]


class Surroundings:
    """Which curves belong together.

    Parameters
    ----------
    outcome : Outcome
        The plan.
    """

    def __init__(self, outcome: Outcome) -> None:
        self._outcome = outcome

    @cached_property
    def _chain_of(self) -> dict[int, IntArray]:
        chains = chains_of(self._outcome.pairs)
        return {int(i): chain for chain in chains for i in chain}

    @cached_property
    def _beside(self) -> tuple[dict[int, int], dict[int, int]]:
        order, curves = self._outcome.neighbourhood.order, self._outcome.curves
        before, after = {}, {}
        for a, b in zip(order[:-1].tolist(), order[1:].tolist(), strict=True):
            if curves.line[a] == curves.line[b] and curves.track[a] == curves.track[b]:
                after[a], before[b] = b, a
        return before, after

    @cached_property
    def parts(self) -> list[Part]:
        """The line in parts that can be planned one after the other, each as in the whole line."""
        return parts_of(self._outcome)

    @cached_property
    def part_of(self) -> IntArray:
        """Number of the part of each curve, shape (n,)."""
        found = np.zeros(len(self._outcome.curves), dtype=np.int64)
        for number, part in enumerate(self.parts):
            found[part.own] = number
        return found

    @cached_property
    def place_in_part(self) -> IntArray:
        """Place of each curve among those of its part, shape (n,)."""
        found = np.zeros(len(self._outcome.curves), dtype=np.int64)
        for part in self.parts:
            found[part.own] = np.arange(len(part.own))
        return found

    def chain(self, curve: int) -> list[int]:
        """Give the curves that are planned together with one, itself among them."""
        found = self._chain_of.get(curve)
        return [curve] if found is None else [int(i) for i in found]

    def planned_with(self, curve: int, moves: bool) -> list[int]:
        """Give the curves that a change can touch: the chain; where its ends move, those beside it too."""
        chain = self.chain(curve)
        if not moves:
            return chain
        before, after = self._beside
        return [
            *(self.chain(before[chain[0]]) if chain[0] in before else []),
            *chain,
            *(self.chain(after[chain[-1]]) if chain[-1] in after else []),
        ]

    def around(self, curves: list[int]) -> list[int]:
        """Give consecutive curves and what lies next to them on either side."""
        before, after = self._beside
        return [
            *([before[curves[0]]] if curves[0] in before else []),
            *curves,
            *([after[curves[-1]]] if curves[-1] in after else []),
        ]


def try_out(
    outcome: Outcome, surroundings: Surroundings, trials: Sequence[Trial], method: str | None = None
) -> list[Answer]:
    """Plan trials, each as if it were the only change of the line.

    Parameters
    ----------
    outcome : Outcome
        The plan as it is.
    surroundings : Surroundings
        Of the same plan.
    trials : sequence of Trial
    method : str, optional
        Method to plan them with, where it is another than the plan's.

    Returns
    -------
    list of Answer
        One for each trial.
    """
    if not trials:
        return []
    cores = [surroundings.planned_with(trial.curve, trial.moves) for trial in trials]
    parts = [surroundings.around(core) for core in cores]
    begins = np.cumsum([0, *(len(part) for part in parts[:-1])])
    every = np.concatenate([np.array(part, dtype=np.int64) for part in parts])
    curves = outcome.curves.take(every)
    settings = open_exceptional(curves, outcome.settings)
    if method is not None:
        settings = settings.model_copy(update={"method": method})
    answers = []
    offset = 0.0
    for trial, core, part, begin in zip(trials, cores, parts, begins.tolist(), strict=True):
        own = slice(begin, begin + len(part))
        ends = np.stack([curves.start_km[own], curves.end_km[own]])
        if not np.isnan(ends).all():
            low, high = np.nanmin(ends), np.nanmax(ends)
            curves.start_km[own] += offset - low
            curves.end_km[own] += offset - low
            offset += high - low + APART_KM
        at = {curve: begin + j for j, curve in enumerate(part)}
        if trial.exceptional is not None and curves.exceptional_allowed is not None:
            curves.exceptional_allowed[[at[curve] for curve in core]] = trial.exceptional
        rows = {CurveKey.of(curves, p): p for p in at.values()} if trial.changes else {}
        make_changes(curves, [(at[curve], change) for curve, change in trial.changes], rows)
        answers.append({curve: at[curve] for curve in core})
    planned = plan_arrays(
        curves,
        outcome.traffic,
        outcome.limits,
        settings,
        turnouts=outcome.turnouts,
        placed=placed_on(outcome, every),
    )
    return [Answer(planned, at) for at in answers]


def no_worse(outcome: Outcome, answer: Answer, curve: int) -> bool:
    """Tell whether no other curve that the change can touch has a graver status than in the plan."""
    return all(
        _RANK[answer.status(other)] >= _RANK[outcome.status[other]] for other in answer.at if other != curve
    )
