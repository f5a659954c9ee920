"""The cants among which the choice is made: 0, step, 2 step ... up to 300 mm; one where fixed or held."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.rules import Asked

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

LARGEST_CANT_MM = 300.0
DEFAULT_STEP_MM = 5.0
_SLACK = 1e-9


@dataclass
class Grid:
    """The grid of each curve, arrays of shape (n,).

    Attributes
    ----------
    step_mm : ndarray
        Cants are multiples of this.
    smallest : ndarray of int
        Smallest multiple other than 0.
    largest : ndarray of int
        Largest multiple.
    fixed_mm : ndarray
        The only cant of a curve whose cant is fixed; nan elsewhere.
    """

    step_mm: FloatArray
    smallest: IntArray
    largest: IntArray
    fixed_mm: FloatArray

    def take(self, indices: npt.ArrayLike) -> Grid:
        """Give the grids of some curves."""
        at = np.asarray(indices)
        return Grid(self.step_mm[at], self.smallest[at], self.largest[at], self.fixed_mm[at])

    def levels(self) -> FloatArray:
        """Give all cants as a table, shape (levels, n) [mm], ascending; nan where a curve has fewer."""
        count = int(self.largest.max(initial=0)) + 1
        multiple = np.arange(count)[:, None]
        allowed = (multiple == 0) | ((multiple >= self.smallest) & (multiple <= self.largest))
        table = np.where(allowed, multiple * self.step_mm, np.nan)
        fixed = ~np.isnan(self.fixed_mm)
        table[:, fixed] = np.nan
        table[0, fixed] = self.fixed_mm[fixed]
        return table

    def between(self, low_mm: FloatArray, high_mm: FloatArray) -> FloatArray:
        """Give the cants within bounds as a table, shape (levels, n) [mm], ascending; nan where fewer."""
        low = np.maximum(np.ceil(low_mm / self.step_mm - _SLACK), self.smallest)
        high = np.minimum(np.floor(high_mm / self.step_mm + _SLACK), self.largest)
        count = int(np.maximum(high - low + 1, 0).max(initial=0))
        multiple = low + np.arange(count)[:, None]
        table = np.where(multiple <= high, multiple * self.step_mm, np.nan)
        none = np.where((low_mm <= _SLACK) & (high_mm >= -_SLACK), 0.0, np.nan)
        table = np.concatenate([none[None, :], table])
        fixed = ~np.isnan(self.fixed_mm)
        keeps = (self.fixed_mm >= low_mm) & (self.fixed_mm <= high_mm)
        table[:, fixed] = np.nan
        table[0, fixed & keeps] = self.fixed_mm[fixed & keeps]
        return table

    def nearest(self, target_mm: FloatArray, low_mm: FloatArray, high_mm: FloatArray) -> FloatArray:
        """Give the cant within bounds that lies nearest to a target, the lower of two; nan where none does.

        Parameters
        ----------
        target_mm, low_mm, high_mm : ndarray, shape (n,)
            Target and bounds [mm], the bounds included.
        """
        low = np.maximum(np.ceil(low_mm / self.step_mm - _SLACK), self.smallest)
        high = np.minimum(np.floor(high_mm / self.step_mm + _SLACK), self.largest)
        wanted = np.ceil(target_mm / self.step_mm - 0.5 - _SLACK)
        best = np.where(low <= high, np.clip(wanted, low, np.maximum(low, high)) * self.step_mm, np.nan)
        none = (low_mm <= _SLACK) & (high_mm >= -_SLACK)
        with np.errstate(invalid="ignore"):
            nearer = np.isnan(best) | (np.abs(target_mm) <= np.abs(best - target_mm) + _SLACK)
        best = np.where(none & nearer, 0.0, best)
        keeps = (self.fixed_mm >= low_mm) & (self.fixed_mm <= high_mm)
        return np.where(np.isnan(self.fixed_mm), best, np.where(keeps, self.fixed_mm, np.nan))


def _of_curve(line: Line, quantity: str, default: float, largest: bool) -> FloatArray:
    """Give the strictest value over the classes that run on each curve, shape (n,)."""
    if not line.table.has(quantity):
        return np.full(len(line), default)
    asked = Asked(line, line.planned_kmh, False)
    free = 0.0 if largest else np.inf
    by_class = np.where(line.runs, asked.limit(quantity).value, free)
    alone = asked.curve_limit(quantity).value
    strictest = np.maximum if largest else np.minimum
    value = strictest(strictest.reduce(by_class, axis=-1, initial=free), alone[:, 0])
    return np.where(np.isfinite(value), value, default)


def make_grid(line: Line) -> Grid:
    """Make the grid of each curve of a line from the limits ``cant step`` and ``minimum cant``."""
    step = _of_curve(line, "cant step", DEFAULT_STEP_MM, largest=False)
    step = np.where(step > 0, step, DEFAULT_STEP_MM)
    minimum = _of_curve(line, "minimum cant", 0.0, largest=True)
    return Grid(
        step_mm=step,
        smallest=np.maximum(np.ceil(minimum / step - _SLACK), 1).astype(np.int64),
        largest=np.floor(LARGEST_CANT_MM / step + _SLACK).astype(np.int64),
        fixed_mm=line.only_mm[:, 0].copy(),
    )
