"""What transitions allow at every multiple of the speed step, by itself and with all lower ones.

There a rule may fail and hold again as a train goes faster, so what counts is all multiples up to one: the
meeting of their windows (:mod:`cant.planning.windows`), which grows narrower from multiple to multiple.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.permissible import first_of_kind, speed_steps
from cant.planning.permissible_shared import shared_gap
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import Window, speed_windows

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_SLACK = 1e-9


@dataclass
class Kinds:
    """Classes of train over transitions, the c cases, and the e kinds over transitions that they make.

    Attributes
    ----------
    at, column : ndarray of int, shape (c,)
        Transition and class of each case.
    entry : ndarray of int, shape (c,)
        Its kind over its transition.
    rank : ndarray of int, shape (c,)
        0, 1 ... among the cases of one entry.
    entry_at, entry_column : ndarray of int, shape (e,)
        Transition, and the first class of the kind.
    """

    at: IntArray
    column: IntArray
    entry: IntArray
    rank: IntArray
    entry_at: IntArray
    entry_column: IntArray

    @classmethod
    def of(cls, meeting: Meeting, at: IntArray, column: IntArray) -> Kinds:
        """Find the kinds of some classes over some transitions."""
        k = meeting.before.classes
        kind = first_of_kind(meeting.before, meeting.after)[at, column]
        found, entry = np.unique(at * k + kind, return_inverse=True)
        order = np.argsort(entry, kind="stable")
        rank = np.empty(len(at), dtype=np.int64)
        rank[order] = np.arange(len(at)) - np.searchsorted(entry[order], entry[order])
        return cls(at, column, entry, rank, found // k, found % k)

    def fastest(self, speed_kmh: FloatArray) -> FloatArray:
        """Give the fastest of the cases' speeds (c,) for each entry, shape (e,)."""
        fastest = np.zeros(len(self.entry_at))
        np.maximum.at(fastest, self.entry, speed_kmh)
        return fastest

    def further(self, speeds_kmh: Sequence[FloatArray], wanted: Sequence[BoolArray]) -> FloatArray:
        """Put speeds of the cases (c,) that are no multiples into a table (f, e) for :meth:`Multiples.of`."""
        if not any(where.any() for where in wanted):
            return np.zeros((0, len(self.entry_at)))
        table = np.zeros(((int(self.rank.max()) + 1) * len(speeds_kmh), len(self.entry_at)))
        for j, (speed, where) in enumerate(zip(speeds_kmh, wanted, strict=True)):
            table[self.rank[where] * len(speeds_kmh) + j, self.entry[where]] = speed[where]
        return table


@dataclass
class Multiples:
    """The windows of e transitions, one class each, from each of a cants before at v speeds.

    The speeds are the multiples 0, 1, 2 ... of the step before, those of the step after where it is another,
    and then further ones. Windows lie flat, (v x a x e,), and are found by a place among the speeds and a
    cell of cant and transition.

    Attributes
    ----------
    window : Window
        At each speed by itself.
    up_to : tuple of Window
        For the step before and the one after: at all multiples up to one.
    first : tuple of int
        Places of the multiple 0 of the two steps.
    further : int
        Place of the first of the further speeds.
    most : int
        Highest multiple.
    """

    window: Window
    up_to: tuple[Window, Window]
    first: tuple[int, int]
    further: int
    most: int
    _entries: int
    _cells: int
    _gap: tuple[BoolArray, BoolArray] | None

    @classmethod
    def of(
        cls,
        part: Meeting,
        cant_before_mm: FloatArray,
        fastest_kmh: FloatArray,
        further_kmh: FloatArray,
        exceptional: bool,
    ) -> Multiples:
        """Find the windows of cants (a, e) up to the fastest speeds (e,) and at further ones (f, e)."""
        steps = (speed_steps(part.before), speed_steps(part.after))
        most = int(np.floor((fastest_kmh / np.minimum(*steps)[:, 0]).max() + _SLACK))
        count = np.arange(most + 1)[:, None, None, None]
        speeds, first = [count * steps[0]], (0, 0)
        if (steps[0] != steps[1]).any():
            speeds.append(count * steps[1])
            first = (0, most + 1)
        speed = np.concatenate([*speeds, further_kmh[:, None, :, None]])
        window = speed_windows(SharedAsked(part, speed, exceptional), cant_before_mm[:, :, None])
        window = Window(window.low[..., 0], window.high[..., 0])
        gap = _gaps(part, speed, exceptional)
        gaps = (None, None) if gap is None else gap
        before = _flat(_met(window, gaps[0], most))
        alike = first == (0, 0) and gap is None
        after = before if alike else _flat(_met(window, gaps[1], most, first[1]))
        return cls(
            window=_flat(window),
            up_to=(before, after),
            first=first,
            further=len(speed) - len(further_kmh),
            most=most,
            _entries=len(part),
            _cells=cant_before_mm.size,
            _gap=gap,
        )

    def cell(self, row: IntArray, entry: IntArray) -> IntArray:
        """Give the cells of rows of cants and transitions."""
        return row * self._entries + entry

    def place(self, end: int, speed_kmh: FloatArray, step_kmh: FloatArray) -> IntArray:
        """Give the places of multiples of the step on one of the curves (0 before, 1 after)."""
        return self.first[end] + np.rint(speed_kmh / step_kmh).astype(np.int64)

    def within(self, end: int, multiple: IntArray, entry: IntArray) -> Window:
        """Give the windows (a, c) of all multiples up to some (c,) of the step on one of the curves."""
        return self._window(self.up_to[end], multiple, entry)

    def at(self, place: IntArray, entry: IntArray) -> Window:
        """Give the windows (a, c) at the speeds of some places (c,)."""
        return self._window(self.window, place, entry)

    def _window(self, window: Window, place: IntArray, entry: IntArray) -> Window:
        rows = np.arange(self._cells // self._entries)[:, None]
        at = place * self._cells + self.cell(rows, entry)
        return Window(window.low.take(at), window.high.take(at))

    def holds(self, place: IntArray, cell: IntArray, cant_after_mm: FloatArray) -> BoolArray:
        """Tell whether all holds at one speed beside cants of the curve after."""
        return _inside(self.window, place * self._cells + cell, cant_after_mm)

    @property
    def narrowing(self) -> BoolArray:
        """Whether a multiple of the step before allows nothing that a lower one does not, for each cell."""
        asked = slice(self._cells, (self.most + 1) * self._cells)
        own, met = (Window(*(side[asked] for side in some)) for some in (self.window, self.up_to[0]))
        same = ((own.low == met.low) & (own.high == met.high)) | (own.low > own.high)
        return np.asarray(same.reshape(self.most, self._cells).all(axis=0))

    @property
    def has_gaps(self) -> bool:
        """Whether the limits have a gap at any of the speeds above a planned one."""
        return self._gap is not None

    def gap(self, on_after: BoolArray, place: IntArray, entry: IntArray) -> BoolArray:
        """Tell where the limits of the curve that slows have a gap at a speed above the planned one."""
        if self._gap is None:
            return np.zeros(len(place), dtype=np.bool_)
        before, after = (gap[place, entry] for gap in self._gap)
        return np.where(on_after, after, before)

    def reached(self, cell: IntArray, cant_after_mm: FloatArray) -> tuple[IntArray, IntArray]:
        """Give the multiple of either step up to which everything holds."""
        before = self._reached(self.up_to[0], cell, cant_after_mm)
        if self.up_to[1] is self.up_to[0]:
            return before, before
        return before, self._reached(self.up_to[1], cell, cant_after_mm)

    def _reached(self, up_to: Window, cell: IntArray, cant_after_mm: FloatArray) -> IntArray:
        reached = np.full(len(cell), self.most)
        which = np.flatnonzero(~_inside(up_to, self.most * self._cells + cell, cant_after_mm))
        # What holds up to a multiple holds up to every lower one: halving finds the last.
        cell, cant, found = cell[which], cant_after_mm[which], np.zeros(len(which), dtype=np.int64)
        jump = 1 << self.most.bit_length()
        while jump > 1:
            jump //= 2
            trial = found + jump
            further = trial < self.most
            further &= _inside(up_to, np.minimum(trial, self.most) * self._cells + cell, cant)
            found = np.where(further, trial, found)
        reached[which] = found
        return reached


def _flat(window: Window) -> Window:
    return Window(window.low.ravel(), window.high.ravel())


def _inside(window: Window, at: IntArray, cant_mm: FloatArray) -> BoolArray:
    return np.asarray((cant_mm >= window.low.take(at)) & (cant_mm <= window.high.take(at)))


def _gaps(part: Meeting, speed_kmh: FloatArray, exceptional: bool) -> tuple[BoolArray, BoolArray] | None:
    """Tell where the limits of the curves before and after have gaps above the planned speed, (v, e)."""
    gaps = []
    for line, on_after in ((part.before, False), (part.after, True)):
        there = shared_gap(part, speed_kmh, np.full((1, 1), on_after), exceptional)
        there = there & (speed_kmh > line.planned_kmh + _SLACK)
        gaps.append(np.broadcast_to(there, speed_kmh.shape)[:, 0, :, 0])
    return (gaps[0], gaps[1]) if gaps[0].any() or gaps[1].any() else None


def _met(window: Window, gap: BoolArray | None, most: int, first: int = 0) -> Window:
    """Give what all multiples of a step up to one allow; that of 0 km/h is not asked."""
    multiples = slice(first, first + most + 1)
    low, high = window.low[multiples].copy(), window.high[multiples].copy()
    if gap is not None:
        np.copyto(low, np.inf, where=gap[multiples, None])
    low[0], high[0] = -np.inf, np.inf
    for here in range(1, most + 1):
        np.maximum(low[here], low[here - 1], out=low[here])
        np.minimum(high[here], high[here - 1], out=high[here])
    return Window(low, high)
