"""Paths through the levels of chains, as far as they have come: what a search carries from curve to curve."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.permissible import Permitted

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


@dataclass
class Paths:
    """Paths of several chains that end at the curve of one position; s of them, chain after chain.

    Attributes
    ----------
    node : ndarray of int, shape (s,)
        Where the path stands in the trail of this position.
    rank : ndarray of int, shape (s,)
        Ascending with the cants of a chain, the smaller chainages first.
    last_but_one, last : ndarray of int, shape (s,)
        Numbers of the last two levels; the first of them -1 on the first curve.
    before : ndarray, shape (s, k)
        Speeds run on the last curve but one.
    left : Permitted
        What the last transition permits on the last curve.
    sure : ndarray, shape (s, 2)
        Time that this alone is sure to cost there.
    measures : ndarray, shape (s, 8)
        The leading four, approvals, overrun, square, sum of cants: the leading ones and those of transitions
        up to the last curve but one, those of curves by themselves up to the one before.
    """

    node: IntArray
    rank: IntArray
    last_but_one: IntArray
    last: IntArray
    before: FloatArray
    left: Permitted
    sure: FloatArray
    measures: FloatArray

    @classmethod
    def begin(cls, level: IntArray, k: int) -> Paths:
        """Begin a path at each of some levels."""
        s = len(level)
        return cls(
            node=np.arange(s),
            rank=level,
            last_but_one=np.full(s, -1, dtype=np.int64),
            last=level,
            before=np.full((s, k), np.nan),
            left=Permitted.everything(s, k),
            sure=np.zeros((s, 2)),
            measures=np.zeros((s, 8)),
        )

    def take(self, at: IntArray | BoolArray) -> Paths:
        """Give some of the paths."""
        return Paths(
            self.node[at],
            self.rank[at],
            self.last_but_one[at],
            self.last[at],
            self.before[at],
            self.left.take(at),
            self.sure[at],
            self.measures[at],
        )


@dataclass
class Free:
    """Paths of which no further transition slows the last curve; arrays (s, ...).

    Attributes
    ----------
    run_kmh : ndarray, shape (s, k)
        Speeds then run on the last curve.
    time : ndarray, shape (s, 2)
        Trains stopped and time lost there.
    rest : ndarray, shape (s, 4)
        Approvals, overrun, square and cant on the last curve but one.
    approvals : ndarray, shape (s, 2)
        Number and overrun of limits passed on the last transition.
    leads : ndarray of bool, shape (s,)
        The best of those that then need the same from here on.
    """

    run_kmh: FloatArray
    time: FloatArray
    rest: FloatArray
    approvals: FloatArray
    leads: BoolArray
