"""The levels of the curves of several chains, numbered through: what a search over whole chains steps on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.lexicographic import least_of_groups
from cant.planning.line import Line
from cant.planning.nodes import Nodes, searched_below_planned
from cant.planning.permissible import Permitted

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

ONE_IN = 6
"""Levels among which a good path is looked for first are one in so many."""


@dataclass
class Levels:
    """Levels of c curves, chain after chain; arrays (l,) in order of curve and cant.

    Attributes
    ----------
    curve : ndarray of int
    cant_mm : ndarray
    alone : Permitted
        What the curve by itself permits, shape (l, k).
    run_kmh : ndarray, shape (l, k)
        Speeds run as far as the curve by itself decides; nan where the class does not run.
    own : ndarray, shape (l, 2)
        Trains stopped and time lost at those speeds.
    table : ndarray of int, shape (rows, c)
        Numbers of the levels of each curve, -1 where there is none.
    chain : ndarray of int, shape (c,)
        Chain of each curve, 0, 1, 2 ...
    begins : ndarray of int, shape (m,)
        Curves that share a transition with the next.
    """

    curve: IntArray
    cant_mm: FloatArray
    alone: Permitted
    run_kmh: FloatArray
    own: FloatArray
    table: IntArray
    chain: IntArray
    begins: IntArray

    @classmethod
    def of(cls, line: Line, nodes: Nodes, chain: IntArray, exceptional: bool) -> Levels:
        """Give numbers to the levels of a line that consists of whole chains."""
        alone = searched_below_planned(line, nodes, exceptional)
        curve, row = np.nonzero(nodes.allowed.T)
        return cls(
            curve=curve,
            cant_mm=nodes.cant_mm[row, curve],
            # Row by row in memory: the search picks whole rows.
            alone=Permitted(
                np.ascontiguousarray(alone.up_to_kmh[row, curve]),
                np.ascontiguousarray(alone.planned[row, curve]),
            ),
            run_kmh=np.ascontiguousarray(nodes.run_kmh[row, curve]),
            own=np.stack([nodes.stopped[row, curve], nodes.lost_s[row, curve]], axis=-1),
            table=_table(curve, len(chain)),
            chain=chain,
            begins=np.flatnonzero(chain[:-1] == chain[1:]),
        )

    def take(self, wanted: BoolArray) -> Levels:
        """Give some of the levels, numbered anew."""
        at = np.flatnonzero(wanted)
        curve = self.curve[at]
        return Levels(
            curve=curve,
            cant_mm=self.cant_mm[at],
            alone=self.alone.take(at),
            run_kmh=self.run_kmh[at],
            own=self.own[at],
            table=_table(curve, len(self.chain)),
            chain=self.chain,
            begins=self.begins,
        )

    def few(self) -> BoolArray:
        """Mark one level in so many of each curve and the first of those that lose least time, (l,)."""
        few = np.asarray(_place(self.curve) % ONE_IN == 0)
        few[least_of_groups(self.own, self.curve)[2]] = True
        return few

    def bound(self) -> FloatArray:
        """Give the least (stopped, lost) of a path over each level, by the curves by themselves, (l, 2)."""
        least = np.zeros((len(self.chain), 2))
        for j in range(2):
            curves, values, _ = least_of_groups(self.own[:, j : j + 1], self.curve)
            least[curves, j] = values[:, 0]
        chain = self.chain[self.curve]
        whole = np.stack([np.bincount(self.chain, weights=column) for column in least.T], axis=-1)
        return np.asarray(whole[chain] - least[self.curve] + self.own)

    def cants(self, numbers: IntArray) -> FloatArray:
        """Give the cants of levels by number [mm]; nan where the number is -1."""
        return np.where(numbers < 0, np.nan, self.cant_mm[numbers])


def _place(curve: IntArray) -> IntArray:
    """Give the place of each level among those of its curve, 0, 1, 2 ..."""
    return np.asarray(np.arange(len(curve)) - np.searchsorted(curve, curve))


def _table(curve: IntArray, curves: int) -> IntArray:
    """Give the numbers of the levels of each curve, shape (rows, c), -1 where there is none."""
    place = _place(curve)
    table = np.full((int(place.max(initial=-1)) + 1, curves), -1, dtype=np.int64)
    table[place, curve] = np.arange(len(curve))
    return table
