"""A change that might help, with the numbers that speak for and against it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from cant.explaining.decisions import Change, ExceptionalValues, Flatter, TransitionLength
from cant.explaining.local import Answer


@dataclass(frozen=True)
class Candidate:
    """A change worth trying.

    Attributes
    ----------
    kind : str
        What is changed.
    curve : int
    changes : sequence of (int, Change)
        Each with the index of the curve that it changes.
    departure : float
        By what share of it the thing changed departs from what is there; the rank of options.
    facts : dict
        Numbers and names for the words of the option.
    """

    kind: str
    curve: int
    changes: tuple[tuple[int, Change], ...]
    departure: float
    facts: dict[str, Any] = field(default_factory=dict)

    @property
    def exceptional(self) -> bool:
        """Whether exceptional values are part of it."""
        return any(isinstance(change, ExceptionalValues) for _, change in self.changes)

    @property
    def moves(self) -> bool:
        """Whether the ends of the curve move towards its neighbours."""
        return any(isinstance(change, Flatter | TransitionLength) for _, change in self.changes)


def best_of_each_kind(found: Sequence[tuple[Candidate, Answer]]) -> list[tuple[Candidate, Answer]]:
    """Give one candidate of each kind with its answer, the smallest departure first."""
    chosen: dict[str, tuple[Candidate, Answer]] = {}
    for pair in sorted(found, key=lambda one: (one[0].departure, one[0].kind)):
        chosen.setdefault(pair[0].kind, pair)
    return list(chosen.values())
