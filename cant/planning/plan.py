"""A plan as everybody above sees it: the tables that went in, the cants, and a record a curve on demand."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.model.curves import CurveList
from cant.model.limits import LimitSet
from cant.model.plan import STATUSES, Finding
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from cant.model.turnouts import Turnout
from cant.planning.outcome import Outcome, plan_arrays
from cant.planning.records import RecordBlock

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

RECORDS_AT_ONCE = 1024


class Plan:
    """A finished plan.

    Attributes
    ----------
    outcome : Outcome
        Its arrays.
    assessed : ndarray of int
        Indices of the curves that have a record, in input order: those that were not rejected.
    """

    def __init__(self, outcome: Outcome) -> None:
        self.outcome = outcome
        self.assessed: IntArray = np.flatnonzero(~outcome.curves.rejected)
        self._held: tuple[dict[int, int], RecordBlock] | None = None

    @property
    def curves(self) -> CurveList:
        """The curve list planned."""
        return self.outcome.curves

    @property
    def traffic(self) -> Traffic:
        """The traffic planned."""
        return self.outcome.traffic

    @property
    def limits(self) -> LimitSet:
        """The limits used."""
        return self.outcome.limits

    @property
    def settings(self) -> Settings:
        """The settings used, with what the limit set lays down."""
        return self.outcome.settings

    @property
    def status(self) -> list[str]:
        """Status of each curve by index, "" for a rejected row."""
        return self.outcome.status

    @property
    def proposed_mm(self) -> FloatArray:
        """Proposed cants [mm], shape (n,); nan where there is none."""
        return self.outcome.cant_mm

    @property
    def findings(self) -> list[Finding]:
        """Findings on data and limits, of the whole plan and of curves."""
        return self.outcome.findings

    def counts(self) -> dict[str, int]:
        """Count the curves of each status, the gravest first; statuses that do not occur count 0."""
        counted = Counter(word for word in self.status if word)
        return {word: counted[word] for word in STATUSES}

    def record(self, index: int) -> dict[str, Any]:
        """Give the record of one curve, as the JSON of a plan has it (metric).

        Parameters
        ----------
        index : int
            Index in the curve list; KeyError for a rejected row.
        """
        if self.curves.rejected[index]:
            message = f"row {index} was rejected"
            raise KeyError(message)
        held = self._held
        if held is None or index not in held[0]:
            held = self.hold([index])
        return held[1].record(held[0][index])

    def hold(self, indices: npt.ArrayLike) -> tuple[dict[int, int], RecordBlock]:
        """Make the records of some curves ready at once, so that asking for each of them costs little.

        What is held is swapped as a whole: several threads may ask one plan for different curves.
        """
        at = np.asarray(indices, dtype=np.int64)
        self._held = held = ({int(i): j for j, i in enumerate(at)}, RecordBlock(self.outcome, at))
        return held

    def records(self, indices: npt.ArrayLike | None = None) -> Iterator[dict[str, Any]]:
        """Yield the records of some curves, of all that have one when not told; made block by block."""
        wanted = self.assessed if indices is None else np.asarray(indices, dtype=np.int64)
        for begin in range(0, len(wanted), RECORDS_AT_ONCE):
            at = wanted[begin : begin + RECORDS_AT_ONCE]
            block = RecordBlock(self.outcome, at)
            for j in range(len(at)):
                yield block.record(j)


def plan_line(
    curves: CurveList,
    traffic: Traffic,
    limits: LimitSet,
    settings: Settings,
    *,
    turnouts: Sequence[Turnout] = (),
    progress: Callable[[float, str], None] | None = None,
) -> Plan:
    """Plan the cants of a line; see :func:`cant.planning.outcome.plan_arrays`.

    Parameters
    ----------
    curves : CurveList
    traffic : Traffic
    limits : LimitSet
        What it lays down of rail spacing or constant holds where the settings say nothing.
    settings : Settings
    turnouts : sequence of Turnout
        Those that lie in curves: their branches bound the cant.
    progress : callable, optional
        Told the share done and what is being done.

    Returns
    -------
    Plan

    Raises
    ------
    InputError
        Where the tables do not suffice for any plan.
    """
    settings = settings.with_standard(limits.rail_spacing_mm, limits.equilibrium_constant)
    return Plan(plan_arrays(curves, traffic, limits, settings, progress, turnouts))
