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
"""Transitions looked at together: keeps their arrays within the processor's cache."""


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
        # Position by position, so that a transition leads from a curve to the one q further on.
        q, members = len(curves), curves.T.ravel()
        cants = grid.take(members).between(*(b[members] for b in bounds_mm))
        known = ~np.isnan(cants)
        cants = np.where(known, cants, 0.0)
        square = line.weight_length_m[members, 0] * (cants - target_mm[members]) ** 2
        meeting = Meeting.of(line, pairs.take(after[members[:-q]]))
        window = allowed_after(SharedAsked(meeting, meeting.planned_kmh, False), cants[:, :-q, None])
        allowed = window.holds(cants[:, q:])
        stages = []
        for begin in range(0, len(members), q):
            here = slice(begin, begin + q)
            stages.append(Stage([square[:, here], cants[:, here]], known[:, here]))
            if begin + q < len(members):
                stages[-1].pair_allowed, stages[-1].pair_measures = allowed[:, :, here], [None, None]
        level, found = best_paths(stages)
        best = cants[level.T.ravel(), np.arange(len(members))].reshape(-1, q).T
        cant[curves[found]] = best[found]
        left += list(curves[~found])
    return cant, left
