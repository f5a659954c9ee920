"""The best cants of chains whose speeds are known beforehand: a shortest path from curve to curve.

Measures add up along a chain and compare in their order (:mod:`cant.planning.lexicographic`). Chains of one
length step together, each path built from the far end back, so that among equals the lower cant at the
smaller chainage is met first.
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
    """The curves at one position of q chains with their levels, and the transitions to the next.

    Attributes
    ----------
    measures : sequence of ndarray, shape (a, q)
        What each level costs, the most important first.
    possible : ndarray of bool, shape (a, q)
        Levels that may be taken.
    pair_allowed : ndarray of bool, shape (a, b, q), or None at the end
        Pairs with the levels of the next curve that may be taken.
    pair_measures : sequence of ndarray, shape (a, b, q), or of None
        What each pair costs; None for nothing.
    """

    measures: Sequence[FloatArray]
    possible: BoolArray
    pair_allowed: BoolArray | None = None
    pair_measures: Sequence[FloatArray | None] = ()


def best_paths(stages: Sequence[Stage]) -> tuple[IntArray, BoolArray]:
    """Find the best levels of q chains of c curves.

    Returns
    -------
    levels : ndarray of int, shape (q, c)
        Without meaning where there is no path.
    found : ndarray of bool, shape (q,)
        Whether any path is allowed.
    """
    to_go, reachable = list(stages[-1].measures), stages[-1].possible
    choices: list[IntArray] = []
    for stage in reversed(stages[:-1]):
        if stage.pair_allowed is None:
            message = "only the last stage has no next"
            raise ValueError(message)
        allowed = stage.pair_allowed & reachable
        totals = [
            np.broadcast_to(ahead, allowed.shape) if pair is None else pair + ahead
            for pair, ahead in zip(stage.pair_measures, to_go, strict=True)
        ]
        chosen, any_allowed = first_best(totals, allowed, axis=1)
        reachable = any_allowed & stage.possible
        picked = [np.take_along_axis(total, chosen[:, None], axis=1)[:, 0] for total in totals]
        to_go = [own + further for own, further in zip(stage.measures, picked, strict=True)]
        choices.append(chosen)
    at, found = first_best(to_go, reachable, axis=0)
    every = np.arange(len(at))
    path = [at]
    for chosen in reversed(choices):
        path.append(chosen[path[-1], every])
    return np.stack(path, axis=1), found


def by_length(chains: Sequence[IntArray], transitions: int) -> list[IntArray]:
    """Stack chains of one length, of about so many transitions together: tables (q, c) of curves."""
    alike: dict[int, list[IntArray]] = {}
    for chain in chains:
        alike.setdefault(len(chain), []).append(chain)
    stacked = []
    for length, some in alike.items():
        together = max(transitions // (length - 1), 1)
        stacked += [np.stack(some[begin : begin + together]) for begin in range(0, len(some), together)]
    return stacked
