"""The records of a planned line: what was read, what was decided and how it is put into words.

Every output takes its curves from here, one record at a time, so that page, JSON, workbook and data frame
cannot tell different stories, and a register of 100,000 curves is never held as records.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from cant.model.display import Display
from cant.model.reading import Reading

_BATCH = 256
"""Curves whose records are made together: whole arrays for the figures, little memory."""

_BLOCK = 4096
"""Curves whose options and methods are worked out together."""

_KEPT = 16_384
"""Lists up to this many curves keep what was worked out for them, so that the next output is made faster."""

if TYPE_CHECKING:
    from cant.explaining import Explanation
    from cant.planning import Plan


@dataclass(frozen=True)
class PlannedRecords:
    """A plan with the reading it came from and the words that go with it, curve by curve.

    Attributes
    ----------
    reading : Reading
        The file as it was understood.
    plan : Plan
        The decisions.
    explanation : Explanation
        Reasons, findings and options.
    """

    reading: Reading
    plan: Plan
    explanation: Explanation

    @property
    def display(self) -> Display:
        """Units in which people are shown the plan."""
        return Display(self.plan.settings.units)

    def record(self, index: int) -> dict[str, Any]:
        """Give everything the plan knows of one curve, as the JSON has it.

        Parameters
        ----------
        index : int
            Index of the curve in the list that was read, one of ``plan.assessed``.
        """
        return self._finished([index], [self.plan.record(index)])[0]

    def records(self) -> Iterator[dict[str, Any]]:
        """Give the records of all curves that were not rejected, in input order, one at a time.

        What goes into the words of a long list is let go of behind them.
        """
        chosen = self.plan.assessed.tolist()
        for first in range(0, len(chosen), _BLOCK):
            block = chosen[first : first + _BLOCK]
            self.explanation.prepare(block, rest_follows=True)
            for start in range(0, len(block), _BATCH):
                batch = block[start : start + _BATCH]
                yield from self._finished(batch, list(self.plan.records(batch)))
            if len(chosen) > _KEPT:
                self.explanation.forget(block)

    def records_of(self, indices: Sequence[int]) -> list[dict[str, Any]]:
        """Give the records of some curves, made together: a page of them costs little more than one.

        Parameters
        ----------
        indices : sequence of int
            Of ``plan.assessed``, in any order.
        """
        chosen = [int(index) for index in indices]
        self.explanation.prepare(chosen)
        return self._finished(chosen, list(self.plan.records(chosen)))

    def _finished(self, indices: list[int], records: list[dict[str, Any]]) -> list[dict[str, Any]]:
        """Add words and further figures to records of the planner."""
        self.explanation.add_to(indices, records)
        return records
