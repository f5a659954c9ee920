"""Many chains at once whose curves all have cants within normal limits: a shortest path through intervals.

Nothing is lost and nothing passed on such a path, so only the distance from the targets counts, then the sum
of the cants.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from cant.planning.chain_choice import Stage, best_paths, by_length
from cant.planning.grid import Grid
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import allowed_after

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

TOGETHER = 500
"""Chains that step together: keeps the arrays of a step within the processor's cache."""


def settle_within_normal(
    line: Line,
    grid: Grid,
    pairs: Pairs,
    chains: Sequence[IntArray],
    bounds_mm: tuple[FloatArray, FloatArray],
    target_mm: FloatArray,
) -> tuple[FloatArray, list[IntArray]]:
    """Find the best cants within normal limits of as many chains as have any.

    Parameters
    ----------
    line : Line
        n curves.
    grid : Grid
    pairs : Pairs
    chains : sequence of ndarray of int
        Each in order of chainage.
    bounds_mm : pair of ndarray, shape (n,)
        Normal bounds of each curve by itself, tolerance included [mm].
    target_mm : ndarray, shape (n,)

    Returns
    -------
    cant_mm : ndarray, shape (n,)
        nan where not settled here.
    left : list of ndarray of int
        Chains that have no such path.
    """
    cant = np.full(len(line), np.nan)
    after = pairs.after(len(line))
    left: list[IntArray] = []
    for curves in by_length(chains, TOGETHER):
        stages, levels = [], []
        for column in curves.T:
            cants = grid.take(column).between(*(b[column] for b in bounds_mm))
            known = ~np.isnan(cants)
            cants = np.where(known, cants, 0.0)
            square = line.weight_length_m[column, 0] * (cants - target_mm[column]) ** 2
            stages.append(Stage([square, cants], known))
            levels.append(cants)
        for i, column in enumerate(curves.T[:-1]):
            meeting = Meeting.of(line, pairs.take(after[column]))
            window = allowed_after(SharedAsked(meeting, meeting.planned_kmh, False), levels[i][:, :, None])
            stages[i].pair_allowed = window.holds(levels[i + 1])
            stages[i].pair_measures = [None, None]
        level, found = best_paths(stages)
        every = np.arange(len(curves))
        best = np.stack([cants[at, every] for cants, at in zip(levels, level.T, strict=True)], axis=1)
        cant[curves[found]] = best[found]
        left += list(curves[~found])
    return cant, left
