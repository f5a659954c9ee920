"""The best cants of a chain whose speeds its transitions do not touch: a shortest path from curve to curve.

Measures add up along the chain and compare in their order (:mod:`cant.planning.lexicographic`). The path is
built from the far end back, so that among equals the lower cant at the smaller chainage is met first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.lexicographic import first_best

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


@dataclass
class Stage:
    """One curve of a chain with its levels, and the transition to the next.

    Attributes
    ----------
    measures : sequence of ndarray, shape (a,)
        What each level costs, the most important first.
    pair_allowed : ndarray of bool, shape (a, b), or None at the end
    pair_measures : sequence of ndarray, shape (a, b)
        What each pair with a level of the next curve costs.
    """

    measures: Sequence[FloatArray]
    pair_allowed: BoolArray | None = None
    pair_measures: Sequence[FloatArray] = ()


def shortest_path(stages: Sequence[Stage]) -> list[int] | None:
    """Find the best level of each curve; None where no path is allowed."""
    if any(len(stage.measures[0]) == 0 for stage in stages):
        return None
    to_go = list(stages[-1].measures)
    reachable: BoolArray = np.ones(len(to_go[0]), dtype=np.bool_)
    choices: list[IntArray] = []
    for stage in reversed(stages[:-1]):
        if stage.pair_allowed is None:
            message = "only the last stage has no next"
            raise ValueError(message)
        allowed = stage.pair_allowed & reachable
        totals = [pair + ahead for pair, ahead in zip(stage.pair_measures, to_go, strict=True)]
        chosen, reachable = first_best(totals, allowed, axis=1)
        at = np.arange(len(chosen))
        to_go = [own + total[at, chosen] for own, total in zip(stage.measures, totals, strict=True)]
        choices.append(chosen)
    start, found = first_best(to_go, reachable, axis=0)
    if not found:
        return None
    path = [int(start)]
    for chosen in reversed(choices):
        path.append(int(chosen[path[-1]]))
    return path
