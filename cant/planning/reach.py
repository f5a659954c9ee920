"""Which classes of train a transition may slow, and how far pairs of cants keep everything for each kind.

Apart from :mod:`cant.planning.meetings`, which tells from it what a pair permits to each class: what is found
here is the same for all classes of a kind, and settles most pairs without looking at classes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from cant.planning.multiples import Kinds, Multiples
from cant.planning.permissible import FASTEST_KMH, first_alike, next_multiple, speed_steps
from cant.planning.permissible_shared import surely_held
from cant.planning.shared import Meeting

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_SLACK = 1e-9


def in_danger(meeting: Meeting, cants: tuple[FloatArray, FloatArray], exceptional: bool) -> BoolArray:
    """Tell which classes a pair of cants may slow, (m, k); at the ends all rules are worst."""
    with np.errstate(invalid="ignore"):
        ends = [np.stack([np.fmin.reduce(cant), np.fmax.reduce(cant)])[:, :, None] for cant in cants]
    # A planned speed above all multiples that are tried is asked about too.
    lines = (meeting.before, meeting.after)
    fastest = [
        np.maximum(line.planned_kmh, top) for line, top in zip(lines, fastest_asked(meeting), strict=True)
    ]
    sure = surely_held(
        meeting,
        (np.nan_to_num(ends[0][:, None]), np.nan_to_num(ends[1][None])),
        np.nan_to_num(np.minimum(*fastest)),
        exceptional,
    )
    sure = np.broadcast_to(sure, (2, 2, *meeting.both.shape))
    return np.asarray(meeting.both & ~sure.all(axis=(0, 1)))


def fastest_asked(meeting: Meeting) -> tuple[FloatArray, FloatArray]:
    """Give the speeds on the two curves above which nothing need be tried [km/h], shape (m, k)."""
    before, after = (
        np.fmin(next_multiple(line.planned_kmh, speed_steps(line)), FASTEST_KMH)
        for line in (meeting.before, meeting.after)
    )
    return before, after


def spread_ranges(begin: IntArray, end: IntArray) -> tuple[IntArray, IntArray]:
    """Give all even numbers of ranges one after the other, each with the position of its range."""
    count = end - begin
    owner = np.repeat(np.arange(len(count)), count)
    offset = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    return owner, begin[owner] + offset


@dataclass
class Cases:
    """Classes in danger over transitions; pairs of arrays (c,) for the curves before and after."""

    kinds: Kinds
    danger: BoolArray
    first: IntArray
    planned: tuple[FloatArray, FloatArray]
    ceiling: tuple[FloatArray, FloatArray]
    step: tuple[FloatArray, FloatArray]
    shorter_after: BoolArray

    @classmethod
    def of(cls, meeting: Meeting, danger: BoolArray) -> Cases:
        """Take of the classes in danger (m, k) those that stand for all that are treated alike."""
        first = first_alike(meeting.before, meeting.after)
        at, column = np.nonzero(danger & (first == np.arange(first.shape[1])))
        lines = (meeting.before, meeting.after)
        ceilings = fastest_asked(meeting)
        shorter = meeting.after.weight_length_m[:, 0] < meeting.before.weight_length_m[:, 0]
        return cls(
            kinds=Kinds.of(meeting, at, column),
            danger=danger,
            first=first,
            planned=(lines[0].planned_kmh[at, column], lines[1].planned_kmh[at, column]),
            ceiling=(ceilings[0][at, column], ceilings[1][at, column]),
            step=(speed_steps(lines[0])[at, column], speed_steps(lines[1])[at, column]),
            shorter_after=shorter[at],
        )

    def stands_for(self, j: int) -> BoolArray:
        """Tell which cases stand for a class, shape (c,)."""
        kinds = self.kinds
        return np.asarray(self.danger[kinds.at, j] & (self.first[kinds.at, j] == kinds.column))

    @property
    def top(self) -> FloatArray:
        """The fastest that a case is asked about: no faster than it runs on either curve, (c,)."""
        return np.asarray(np.where(self.even, np.minimum(*self.planned), np.maximum(*self.ceiling)))

    @property
    def even(self) -> BoolArray:
        """Whether a case runs at multiples of one step and no others, (c,)."""
        return np.asarray((self.step[0] == self.step[1]) & ~np.logical_or(*self.odd))

    @property
    def odd(self) -> tuple[BoolArray, BoolArray]:
        """Whether the planned speeds are none of the multiples that are tried, (c,) each."""
        before, after = (
            (speed != np.rint(speed / step) * step) | (speed > top)
            for speed, step, top in zip(self.planned, self.step, self.ceiling, strict=True)
        )
        return before, after


@dataclass
class Reach:
    """How far all rules hold over pairs of cants, for each kind of train in danger; arrays (g,).

    Attributes
    ----------
    multiples : Multiples
    entry, pair : ndarray of int
        Kind over a transition, ascending, and the pair.
    cell : ndarray of int
        The cell of the kind and the cant before in ``multiples``.
    reached : tuple of ndarray of int
        The multiples of the step before and of that after up to which all the rules hold.
    """

    multiples: Multiples
    entry: IntArray
    pair: IntArray
    cell: IntArray
    reached: tuple[IntArray, IntArray]

    @classmethod
    def of(
        cls,
        meeting: Meeting,
        cases: Cases,
        cant_before_mm: FloatArray,
        pairs: tuple[IntArray, IntArray, FloatArray],
        exceptional: bool,
    ) -> Reach:
        """Find it.

        Parameters
        ----------
        meeting : Meeting
            m transitions.
        cases : Cases
        cant_before_mm : ndarray, shape (a, m)
        pairs : tuple of ndarray, shape (p,)
            Transition of each pair, ascending, row of its cant before, and its cant after [mm].
        exceptional : bool
            Last tier allowed.
        """
        kinds, (transition, row, cant_after) = cases.kinds, pairs
        multiples = Multiples.of(
            meeting.unfold(kinds.entry_at, kinds.entry_column),
            np.nan_to_num(cant_before_mm[:, kinds.entry_at]),
            kinds.fastest(cases.top),
            kinds.further(cases.planned, cases.odd),
            exceptional,
        )
        begin = np.searchsorted(transition, np.arange(len(meeting) + 1))
        entry, pair = spread_ranges(begin[kinds.entry_at], begin[kinds.entry_at + 1])
        cell = multiples.cell(row[pair], entry)
        return cls(multiples, entry, pair, cell, multiples.reached(cell, cant_after[pair]))

    def keep(self, pairs: BoolArray) -> Reach:
        """Give it for some of the pairs (p,), numbered anew."""
        at = np.flatnonzero(pairs[self.pair])
        number = np.cumsum(pairs) - 1
        return replace(
            self,
            entry=self.entry[at],
            pair=number[self.pair[at]],
            cell=self.cell[at],
            reached=(self.reached[0][at], self.reached[1][at]),
        )

    def least(self, loss: FloatArray) -> FloatArray:
        """Give what running no faster than is reached costs, of a table (e, multiples): shape (g,).

        0 where, from that cant before, a higher multiple may be in order while a lower one is not.
        """
        if self.multiples.has_gaps:
            return np.zeros(len(self.pair))
        return np.where(self.multiples.narrowing[self.cell], loss[self.entry, self.reached[0]], 0.0)

    def short(self, cases: Cases) -> IntArray:
        """Give those over which a class of the kind may have to slow, ascending."""
        if self.multiples.has_gaps:
            return np.arange(len(self.pair))
        kinds = cases.kinds
        even = cases.even
        tops = []
        for step in cases.step:
            top = np.zeros(len(kinds.entry_at))
            np.maximum.at(top, kinds.entry, np.where(even, cases.top / step, np.inf))
            tops.append(top - _SLACK)
        free = self.reached[0] >= tops[0][self.entry]
        return np.flatnonzero(~(free & (self.reached[1] >= tops[1][self.entry])))
