"""How much time a path may lose beyond what is sure: pairs of cants that must cost more are left out early.

Where a good path of a chain is known, no better one loses more than it does. On the fastest speeds that the
levels of its curves permit, each class by itself, every path loses the rest of it: its room.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.levels import Levels
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.permissible_shared import slower_after
from cant.planning.reach import Cases, Reach
from cant.planning.running_time import Services
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_SLACKS = 10


@dataclass
class Room:
    """The time that paths may lose over each of m transitions.

    Attributes
    ----------
    room_s : ndarray, shape (m,)
        inf where nothing is known, or trains stop in any case.
    weight_s_kmh : tuple of ndarray, shape (m, k)
        On the curves before and after: time lost is weight x (1 / V_run - 1 / V_planned).
    fastest_kmh : tuple of ndarray, shape (m, k)
        The fastest that any level of the curve lets a class run.
    may_slow : tuple of ndarray of bool, shape (m, k)
        Whether there are levels between which it is this curve that the transition slows.
    """

    room_s: FloatArray
    weight_s_kmh: tuple[FloatArray, FloatArray]
    fastest_kmh: tuple[FloatArray, FloatArray]
    may_slow: tuple[BoolArray, BoolArray]

    @classmethod
    def under(cls, ceiling: FloatArray, line: Line, levels: Levels) -> Room:
        """Find what is left under the leading measures of a path of each chain, (q, 4)."""
        services = Services.of(line)
        weight = services.moving * services.trains * services.length_m[:, None] * KMH_PER_MS
        start = np.flatnonzero(np.diff(levels.curve, prepend=-1))
        fastest, slowest = np.zeros((2, *line.runs.shape))
        for speed, extreme in ((fastest, np.fmax), (slowest, np.fmin)):
            speed[levels.curve[start]] = extreme.reduceat(levels.run_kmh, start)
        with np.errstate(divide="ignore", invalid="ignore"):
            lost = np.where(services.moving, weight * (1.0 / fastest - 1.0 / line.planned_kmh), 0.0)
        sure = np.bincount(levels.chain, weights=lost.sum(axis=-1))
        known = np.isfinite(ceiling).all(axis=1) & (ceiling[:, :3] <= 0).all(axis=1) & np.isfinite(sure)
        lost_s, spare = ceiling[known, 3], np.full(len(sure), np.inf)
        spare[known] = lost_s - sure[known] + _SLACKS * slack(lost_s)
        before, after = levels.begins, levels.begins + 1
        shorter_after = line.weight_length_m[after] < line.weight_length_m[before]
        return cls(
            spare[levels.chain[before]],
            (weight[before], weight[after]),
            (fastest[before], fastest[after]),
            (
                ~slower_after(shorter_after, (slowest[before], fastest[after])),
                slower_after(shorter_after, (fastest[before], slowest[after])),
            ),
        )

    def suffices(self, cases: Cases, reach: Reach, transition: IntArray) -> BoolArray:
        """Tell for which of p pairs over some transitions it suffices, as far as can be told by kinds."""
        loss = reach.least(self._losses(cases, reach.multiples.most))
        lost = np.bincount(reach.pair, weights=loss, minlength=len(transition))
        return np.asarray(lost <= self.room_s[transition])

    def _losses(self, cases: Cases, most: int) -> FloatArray:
        """Give the least that each kind loses where all holds up to a multiple and no further, (e, most + 1).

        A class runs no faster than that multiple on one of the two curves.
        """
        kinds, weights, fastest = cases.kinds, self.weight_s_kmh, self.fastest_kmh
        multiple = np.arange(most + 1)
        loss = np.zeros((len(kinds.entry_at), most + 1))
        for j in range(cases.first.shape[1]):
            which = np.flatnonzero(cases.stands_for(j) & cases.even)
            at, entry = kinds.at[which], kinds.entry[which]
            slowest = cases.step[0][which, None] * multiple
            ends = [_slower(weights[end][at, j], fastest[end][at, j], slowest) for end in (0, 1)]
            for end in (0, 1):
                ends[end][~self.may_slow[end][at, j]] = np.inf
            least = np.minimum(*ends)
            loss[entry] += np.where(np.isinf(least), 0.0, least)
        return loss


def _slower(weight_s_kmh: FloatArray, fastest_kmh: FloatArray, speed_kmh: FloatArray) -> FloatArray:
    """Give the time lost by running at speeds (c, v) and not at the fastest (c,); 0 where not slower."""
    fastest = fastest_kmh[:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        lost = weight_s_kmh[:, None] * (1.0 / speed_kmh - 1.0 / fastest)
    return np.where((speed_kmh < fastest) & (weight_s_kmh[:, None] > 0), lost, 0.0)
