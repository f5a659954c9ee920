"""The levels of the curves of several chains, numbered through: what a search over whole chains steps on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.nodes import Nodes, searched_below_planned
from cant.planning.permissible import Permitted

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


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
    table: IntArray
    chain: IntArray
    begins: IntArray

    @classmethod
    def of(cls, line: Line, nodes: Nodes, chain: IntArray, exceptional: bool) -> Levels:
        """Give numbers to the levels of a line that consists of whole chains."""
        alone = searched_below_planned(line, nodes, exceptional)
        curve, row = np.nonzero(nodes.allowed.T)
        table = np.full(nodes.allowed.shape, -1, dtype=np.int64)
        table[row, curve] = np.arange(len(curve))
        return cls(
            curve=curve,
            cant_mm=nodes.cant_mm[row, curve],
            alone=Permitted(alone.up_to_kmh[row, curve], alone.planned[row, curve]),
            run_kmh=nodes.run_kmh[row, curve],
            table=table,
            chain=chain,
            begins=np.flatnonzero(chain[:-1] == chain[1:]),
        )

    def cants(self, numbers: IntArray) -> FloatArray:
        """Give the cants of levels by number [mm]; nan where the number is -1."""
        return np.where(numbers < 0, np.nan, self.cant_mm[numbers])
