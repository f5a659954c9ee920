"""The cants between which curves by themselves keep their limits, tolerance included: a closed form for each.

Apart from the choice because both the curves that normal limits settle and the levels worth weighing on the
others are found from it.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.rules import Asked, Terms, curve_terms, hard_terms

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

BLOCK = 8192
"""Curves bounded together: keeps their arrays within the processor's cache."""


@dataclass
class Bounds:
    """Bounds on each curve's cant by itself, arrays of shape (n,).

    Attributes
    ----------
    low_mm, high_mm : ndarray
        Infinite where nothing binds.
    kept : ndarray of bool
        The rules in which cant has no part are kept.
    """

    low_mm: FloatArray
    high_mm: FloatArray
    kept: BoolArray

    @classmethod
    def of(cls, terms: Iterable[Terms], n: int) -> Bounds:
        """Find the bounds that rules set to n curves."""
        found = cls(np.full(n, -np.inf), np.full(n, np.inf), np.ones(n, dtype=np.bool_))
        for term in terms:
            if term.rule.sense == 0:
                found.kept &= term.kept(np.zeros((n, 1))).all(axis=-1)
            elif term.rule.sense < 0:
                found.low_mm = np.maximum(found.low_mm, term.bound(with_tolerance=True).max(axis=-1))
            else:
                found.high_mm = np.minimum(found.high_mm, term.bound(with_tolerance=True).min(axis=-1))
        return found


def normal_bounds(line: Line) -> Bounds:
    """Give the bounds of every rule at planned speeds and normal values."""
    parts = []
    for begin in range(0, max(len(line), 1), BLOCK):
        part = line.take(np.arange(begin, min(begin + BLOCK, len(line))))
        parts.append(bounds_at(part, part.planned_kmh))
    return Bounds(
        np.concatenate([part.low_mm for part in parts]),
        np.concatenate([part.high_mm for part in parts]),
        np.concatenate([part.kept for part in parts]),
    )


def bounds_at(line: Line, speed_kmh: FloatArray) -> Bounds:
    """Give the bounds of every rule at some speeds (n, k) and normal values."""
    return Bounds.of(curve_terms(Asked(line, speed_kmh, False)), len(line))


def hard_bounds(line: Line, exceptional: bool) -> Bounds:
    """Give the bounds of what no lower speed can mend, at planned speeds, in one tier."""
    return Bounds.of(hard_terms(Asked(line, line.planned_kmh, exceptional)), len(line))
