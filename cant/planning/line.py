"""A line as arrays: curves by classes of train, every number the rules need, in one place.

Shapes: n curves, k classes, m shared transitions. Arrays of a curve are (n, 1), of a class on a curve (n, k),
so that they broadcast with trial axes put in front. The axis order is always trial, curve, class.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning.banded import BandedLimit, BandedLimits
from cant.planning.branches import Branches
from cant.planning.limit_table import LimitAt, LimitTable
from cant.planning.neighbours import Neighbourhood

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


_OF_CLASS = (
    "runs",
    "regular",
    "planned_kmh",
    "trains",
    "mass_t",
    "roll",
    "gravity_height_m",
    "category",
    "kind",
)


@dataclass
class Line:
    """Curves and classes as arrays.

    Attributes
    ----------
    table : LimitTable
        The limits over this line's categories and situations.
    constant, spacing_mm : float
        C [mm, km/h, m] and e [mm].
    radius_m, cant_today_mm, at_most_mm, at_least_mm, weight_length_m, factor : ndarray, shape (n, 1)
        Radius, today's cant, bounds of the site (inf and -inf where none), length that weighs, and peak over
        mean gradient of the transitions.
    hand : ndarray, shape (n, 1)
        1 left, -1 right, 0 not known.
    situation : ndarray of int, shape (n, 1)
        Code of the set of situation words.
    transition_m, ramp_m : tuple of two ndarrays, shape (n, 1)
        At each end, to a straight; nan where not known or shared.
    fixed : ndarray of bool, shape (n, 1)
        The cant is not chosen: today's may not be changed, or one is held by hand.
    only_mm : ndarray, shape (n, 1)
        The one cant of such a curve; nan elsewhere.
    runs, regular : ndarray of bool, shape (n, k)
        Whether the class runs there, and whether its excess binds.
    planned_kmh, trains, mass_t, roll, gravity_height_m : ndarray, shape (n, k)
        nan where not known or the class does not run.
    category : ndarray of int, shape (n, k)
        Code of the class's category, NO_CATEGORY where it does not run.
    kind : ndarray of int, shape (n, k)
        Code of category and roll coefficient together: classes of one kind have the same limits at the same
        speed. NO_CATEGORY where the class does not run.
    branches : Branches or None
        Branches of turnouts that lie in the curves; None where there is none at all.
    banded : BandedLimits or None
        Limits looked up by band of speed: only on a line small enough, see :meth:`with_bands`.
    """

    table: LimitTable
    constant: float
    spacing_mm: float
    radius_m: FloatArray
    hand: FloatArray
    situation: IntArray
    cant_today_mm: FloatArray
    at_most_mm: FloatArray
    at_least_mm: FloatArray
    weight_length_m: FloatArray
    factor: FloatArray
    transition_m: tuple[FloatArray, FloatArray]
    ramp_m: tuple[FloatArray, FloatArray]
    fixed: BoolArray
    only_mm: FloatArray
    runs: BoolArray
    regular: BoolArray
    planned_kmh: FloatArray
    trains: FloatArray
    mass_t: FloatArray
    roll: FloatArray
    gravity_height_m: FloatArray
    category: IntArray
    kind: IntArray
    branches: Branches | None = None
    banded: BandedLimits | None = None

    def __len__(self) -> int:
        return len(self.radius_m)

    @property
    def classes(self) -> int:
        """Number of classes k."""
        return int(self.runs.shape[1])

    def take(self, indices: npt.ArrayLike) -> Line:
        """Give some of the curves, in that order (arrays copied)."""
        at = np.asarray(indices)
        chosen: dict[str, Any] = {}
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                chosen[item.name] = take_curves(value, at)
            elif isinstance(value, tuple):
                chosen[item.name] = tuple(array[at] for array in value)
            elif isinstance(value, (Branches, BandedLimits)):
                chosen[item.name] = value.take(at)
            else:
                chosen[item.name] = value
        return Line(**chosen)

    def limit(self, quantity: str, speed_kmh: FloatArray, exceptional: bool) -> LimitAt:
        """Ask a quantity's limit for each class at speeds (..., n, k) [km/h], in a shape that broadcasts."""
        if self.banded is not None:
            return self.banded[quantity, exceptional].at(speed_kmh)
        return self.table.compact(
            quantity,
            exceptional=exceptional,
            category=self.category,
            situation=self.situation,
            speed=speed_kmh,
            radius=self.radius_m,
        )

    def with_bands(self) -> Line:
        """Give the same curves with their limits in every band: worth it where a few are asked often."""
        if self.banded is not None:
            return self

        def find(key: tuple[str, bool]) -> BandedLimit:
            quantity, exceptional = key
            upper = self.table.bands(quantity)
            # Any speed of a band will do; above the last edge one more km/h.
            asked = np.where(np.isfinite(upper), upper, np.append(upper, 0.0)[len(upper) - 2] + 1.0)
            return BandedLimit(upper, self.limit(quantity, asked[:, None, None], exceptional))

        return replace(self, banded=BandedLimits(find))

    def unfold(self, curves: IntArray, columns: IntArray) -> Line:
        """Give some classes on some curves, each as a curve of its own with one class."""
        chosen = self.take(curves)
        at = np.arange(len(curves))
        for name in _OF_CLASS:
            setattr(chosen, name, getattr(chosen, name)[at, columns][:, None])
        if chosen.banded is not None:
            chosen.banded = chosen.banded.unfold(columns)
        return chosen

    def take_classes(self, columns: IntArray) -> Line:
        """Give the same curves with some of the classes only."""
        chosen: dict[str, Any] = {item.name: getattr(self, item.name) for item in fields(self)}
        for name in _OF_CLASS:
            chosen[name] = chosen[name][:, columns]
        if self.banded is not None:
            chosen["banded"] = self.banded.take_classes(columns)
        return Line(**chosen)

    def set_ends(self, neighbourhood: Neighbourhood) -> None:
        """Take over how the curves meet."""
        transition, ramp = neighbourhood.transition_m, neighbourhood.ramp_m
        self.transition_m = (column(transition[0]), column(transition[1]))
        self.ramp_m = (column(ramp[0]), column(ramp[1]))

    @property
    def without_trains(self) -> BoolArray:
        """Whether no class at all runs on the curve, shape (n, 1)."""
        return np.asarray(np.logical_not(self.runs.any(axis=-1, keepdims=True)))

    @property
    def moving(self) -> BoolArray:
        """Whether the class runs there at more than 0 km/h, shape (n, k)."""
        return self.runs & (self.planned_kmh > 0)


def take_curves(array: npt.NDArray[Any], at: IntArray | BoolArray) -> npt.NDArray[Any]:
    """Take rows of an array (n, k), each class contiguous in memory: what runs over curves is then fast."""
    return np.asarray(array.T.take(at, axis=1).T)


def column(values: npt.ArrayLike) -> FloatArray:
    """Give one number a curve as an array (n, 1)."""
    return np.asarray(values, dtype=np.float64)[:, None]
