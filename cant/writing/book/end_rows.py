"""The rows of the sheet "Calculation of ends": one a class over one end of a curve.

Apart from the columns because finding them needs the plan's neighbours and nothing of formulas.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.neighbours import AFTER, BEFORE
from cant.writing.book.frame import FloatArray
from cant.writing.book.ledger import BoolArray
from cant.writing.book.selection import IntArray, Selection


@dataclass
class EndRows:
    """The rows: one a class over one end of a curve.

    Attributes
    ----------
    entry, other : ndarray of int
        Entry of the selection, and that of the same class on the curve at the other end of a shared
        transition, -1 to a straight.
    end : ndarray of int
        BEFORE or AFTER.
    length_m, ramp_m, factor : ndarray
        Transition, cant ramp (nan: none known), and peak over mean of the shape.
    """

    entry: IntArray
    other: IntArray
    end: IntArray
    length_m: FloatArray
    ramp_m: FloatArray
    factor: FloatArray

    @classmethod
    def of(cls, chosen: Selection) -> EndRows:
        """Find them."""
        line, pairs = chosen.line, chosen.plan.outcome.pairs
        parts: list[tuple[npt.ArrayLike, ...]] = []
        entries = np.arange(len(chosen.pos))
        for end in (BEFORE, AFTER):
            length, ramp = (array[end][chosen.pos, 0] for array in (line.transition_m, line.ramp_m))
            at = np.flatnonzero(~np.isnan(length) | ~np.isnan(ramp))
            factor = line.factor[chosen.pos[at], 0]
            none = np.full(len(at), -1)
            parts.append((entries[at], none, np.full(len(at), end), length[at], ramp[at], factor))
        where = {(int(p), int(k)): j for j, (p, k) in enumerate(zip(chosen.pos, chosen.column, strict=True))}
        for m in range(len(pairs)):
            first, second = (chosen.place.get(int(i), -1) for i in (pairs.first[m], pairs.second[m]))
            if first < 0 or second < 0:
                continue
            for j in range(int(chosen.start[first]), int(chosen.start[first + 1])):
                other = where.get((second, int(chosen.column[j])))
                if other is not None:
                    row = (j, other, AFTER, pairs.length_m[m], pairs.ramp_m[m], pairs.factor[m])
                    parts.append(tuple([value] for value in row))
        columns = [np.concatenate([np.asarray(part[i]) for part in parts]) for i in range(6)]
        order = np.lexsort((columns[2], columns[0]))
        numbers = [column[order].astype(np.int64) for column in columns[:3]]
        length, ramp, peak = (column[order] for column in columns[3:])
        return cls(numbers[0], numbers[1], numbers[2], length, ramp, peak)

    @property
    def shared(self) -> BoolArray:
        """Which rows are shared transitions."""
        return np.asarray(self.other >= 0)

    def __len__(self) -> int:
        return len(self.entry)
