"""The running time that slower speeds cost: what is compared first when cants are chosen."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

STOPPED_KMH = 1e-9
"""A train that may not run at all counts as this fast [km/h] where time is lost."""
NO_TRAINS = 0.001
"""A class of 0 trains a day still counts this many where time is lost."""


@dataclass(frozen=True)
class Services:
    """What running times hang on; arrays (n, k), the lengths that weigh (n,)."""

    moving: BoolArray
    planned_kmh: FloatArray
    trains: FloatArray
    length_m: FloatArray

    @classmethod
    def of(cls, line: Line) -> Services:
        """Look at the trains of a line: where their number is not known one, of none still a few."""
        trains = np.where(np.isnan(line.trains), 1.0, line.trains)
        trains = np.where(trains == 0, NO_TRAINS, trains)
        return cls(line.moving, line.planned_kmh, trains, line.weight_length_m[:, 0])

    def take(self, curves: npt.NDArray[np.int64]) -> Services:
        """Give those of some curves."""
        at = curves
        return Services(self.moving[at], self.planned_kmh[at], self.trains[at], self.length_m[at])

    def stopped(self, run_kmh: FloatArray) -> FloatArray:
        """Give trains a day x length of the classes that may not run at all [m], shape (..., n).

        The time that they lose has no bound; counted as :data:`STOPPED_KMH` it outweighs all other time lost,
        so it is compared first and apart, where it cannot drown the rest in its rounding.
        """
        stopped = self.moving & (run_kmh <= STOPPED_KMH)
        return np.asarray((stopped * self.trains).sum(axis=-1) * self.length_m)

    def lost_s(self, run_kmh: FloatArray) -> FloatArray:
        """Give the running time lost a day [s], shape (..., n): sum of n x length x (1/V_run - 1/V_planned).

        Classes that may not run at all are left out (:meth:`stopped`).
        """
        counts = self.moving & (run_kmh > STOPPED_KMH) & (run_kmh < self.planned_kmh)
        slow = np.where(counts, run_kmh, 1.0)
        fast = np.where(counts, self.planned_kmh, 1.0)
        lost = np.where(counts, self.trains * (1.0 / slow - 1.0 / fast), 0.0)
        return np.asarray(lost.sum(axis=-1) * self.length_m * KMH_PER_MS)


@dataclass(frozen=True)
class TimeLost:
    """Trains stopped [m a day] and time lost [s a day], of any number of curves."""

    stopped: FloatArray
    lost_s: FloatArray
