"""Many chains at once whose curves all have cants within normal limits: a shortest path through intervals.

Nothing is lost and nothing passed on such a path, so only the distance from the targets counts, then the sum
of the cants. Chains of one length step together, from the far end back.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from cant.planning.grid import Grid
from cant.planning.lexicographic import first_best
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import allowed_after

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

TOGETHER = 1500
"""Chains that step together: bounds the memory of a step."""


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
    pair_after = np.full(len(line), -1, dtype=np.int64)
    pair_after[pairs.first] = np.arange(len(pairs))
    left: list[IntArray] = []
    by_length: dict[int, list[IntArray]] = {}
    for chain in chains:
        by_length.setdefault(len(chain), []).append(chain)
    for alike in by_length.values():
        for begin in range(0, len(alike), TOGETHER):
            curves = np.stack(alike[begin : begin + TOGETHER])
            levels = [grid.take(column).between(*(b[column] for b in bounds_mm)) for column in curves.T]
            meetings = [Meeting.of(line, pairs.take(pair_after[column])) for column in curves.T[:-1]]
            weights = [line.weight_length_m[column, 0] for column in curves.T]
            best = _step_together(levels, meetings, weights, [target_mm[column] for column in curves.T])
            settled = np.asarray(~np.isnan(best).any(axis=1))
            cant[curves[settled]] = best[settled]
            left += [chain for chain, good in zip(curves, settled, strict=True) if not good]
    return cant, left


def _step_together(
    levels: Sequence[FloatArray],
    meetings: Sequence[Meeting],
    weights: Sequence[FloatArray],
    targets: Sequence[FloatArray],
) -> FloatArray:
    """Find the best path of q chains of c curves: (q, c) [mm], nan where there is none.

    ``levels`` has c tables (a, q) [mm], nan where a curve has fewer.
    """

    def cost(position: int) -> list[FloatArray]:
        cants = np.nan_to_num(levels[position])
        return [weights[position] * (cants - targets[position]) ** 2, cants]

    to_go = cost(len(levels) - 1)
    reachable = ~np.isnan(levels[-1])
    choices: list[IntArray] = []
    for position in range(len(meetings) - 1, -1, -1):
        here, ahead = levels[position], levels[position + 1]
        meeting = meetings[position]
        asked = SharedAsked(meeting, meeting.planned_kmh, False)
        low, high = allowed_after(asked, np.nan_to_num(here)[:, :, None])
        with np.errstate(invalid="ignore"):
            allowed = (ahead >= low[:, None, :]) & (ahead <= high[:, None, :])
        allowed &= reachable[None, :, :]
        spread = [np.broadcast_to(measure[None, :, :], allowed.shape) for measure in to_go]
        chosen, any_allowed = first_best(spread, allowed, axis=1)
        reachable = any_allowed & ~np.isnan(here)
        picked = [np.take_along_axis(measure, chosen, axis=0) for measure in to_go]
        to_go = [own + further for own, further in zip(cost(position), picked, strict=True)]
        choices.append(chosen)
    at, found = first_best(to_go, reachable, axis=0)
    chains = np.arange(len(at))
    path = [levels[0][at, chains]]
    for position, chosen in enumerate(reversed(choices), start=1):
        at = chosen[at, chains]
        path.append(levels[position][at, chains])
    return np.where(found[:, None], np.stack(path, axis=1), np.nan)
