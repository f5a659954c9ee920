"""Limits found in every band of speed beforehand: worth it where a few curves are asked often.

Apart from :mod:`cant.planning.limit_table`, which weighs the rows: here a speed only picks a band.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning.limit_table import EDGE_KMH, LimitAt

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True)
class BandedLimit:
    """A quantity's limit in every band of speed, asked once and looked up often.

    Attributes
    ----------
    upper_kmh : ndarray, shape (bands,)
        Upper edges, included; the last is inf.
    limit : LimitAt
        Shape (bands, n, k), or 1 in the place of each that makes no difference.
    """

    upper_kmh: FloatArray
    limit: LimitAt

    def at(self, speed_kmh: FloatArray) -> LimitAt:
        """Look up the limit at speeds (..., n, k) or (1, 1); any row may be given for nan."""
        if len(self.limit.value) == 1:
            return self.limit.each(lambda part: part[0])
        band = np.searchsorted(self.upper_kmh[:-1] + EDGE_KMH, speed_kmh, side="left")
        if band.size == 1:
            only = int(band.flat[0])
            return self.limit.each(lambda part: part[only])
        n, k = self.limit.value.shape[1:]
        # An axis of length 1 is asked at 0 whatever the curve or class.
        at = (band, np.arange(n)[:, None], np.arange(k))
        return self.limit.each(lambda part: part[at])


class BandedLimits:
    """Banded limits of some curves: those of a part are cut out when they are asked for, not before."""

    def __init__(self, find: Callable[[tuple[str, bool]], BandedLimit]) -> None:
        self._find = find
        self._found: dict[tuple[str, bool], BandedLimit] = {}

    def __getitem__(self, key: tuple[str, bool]) -> BandedLimit:
        if key not in self._found:
            self._found[key] = self._find(key)
        return self._found[key]

    def _part(self, cut: Callable[[Any], Any]) -> BandedLimits:
        def find(key: tuple[str, bool]) -> BandedLimit:
            every = self[key]
            return BandedLimit(every.upper_kmh, every.limit.each(cut))

        return BandedLimits(find)

    # An axis of length 1 stands for every curve or class and is left as it is.

    def take(self, curves: npt.ArrayLike) -> BandedLimits:
        """Give those of some curves."""
        at = np.asarray(curves)
        return self._part(lambda part: part if part.shape[1] == 1 else part[:, at])

    def take_classes(self, columns: IntArray) -> BandedLimits:
        """Give those of some classes."""
        return self._part(lambda part: part if part.shape[2] == 1 else part[:, :, columns])

    def unfold(self, columns: IntArray) -> BandedLimits:
        """Give one class of each curve, (bands, n, 1)."""

        def cut(part: Any) -> Any:
            if part.shape[2] == 1:
                return part
            at = np.arange(len(columns)) if part.shape[1] > 1 else 0
            return part[:, at, columns][:, :, None]

        return self._part(cut)
