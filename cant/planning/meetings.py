"""Pairs of cants over shared transitions on which trains may have to give way: what each pair permits.

How far a pair keeps everything is the same for classes of one kind, and so is found once for them
(:mod:`cant.planning.multiples`); a class that is in no danger over any pair is left out before.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning.assess import shared_hard_kept
from cant.planning.levels import Levels
from cant.planning.multiples import Kinds, Multiples
from cant.planning.permissible import (
    FASTEST_KMH,
    Permitted,
    first_alike,
    next_multiple,
    speed_steps,
)
from cant.planning.permissible_shared import slower_after, surely_held
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import hard_window

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_SLACK = 1e-9


@dataclass
class PairList:
    """Pairs of levels over the transitions of a line, in order of the level before; arrays (p,), (p, k).

    Attributes
    ----------
    transition, before, after : ndarray of int
        Transition, and the numbers of the two levels.
    broken, overrun : ndarray
        1 where the pair does not keep what no lower speed can mend, and by how much.
    on_before, on_after : Permitted
        What the transition permits on the two curves.
    """

    transition: IntArray
    before: IntArray
    after: IntArray
    broken: FloatArray
    overrun: FloatArray
    on_before: Permitted
    on_after: Permitted

    def __len__(self) -> int:
        return len(self.before)


def make_pair_list(meeting: Meeting, levels: Levels, exceptional: bool, also_broken: bool) -> PairList:
    """List the pairs of levels over the transitions between consecutive curves.

    Parameters
    ----------
    meeting : Meeting
        m transitions.
    levels : Levels
        Of all curves, with the tables of the curves before and after each transition.
    exceptional : bool
        Last tier allowed.
    also_broken : bool
        Also pairs that do not keep what no lower speed can mend.

    Returns
    -------
    PairList
    """
    before, after = levels.table[:, levels.begins], levels.table[:, levels.begins + 1]
    cant_before, cant_after = levels.cants(before), levels.cants(after)
    window = hard_window(SharedAsked(meeting, meeting.planned_kmh, exceptional), cant_before[:, :, None])
    wanted = (before >= 0)[:, None] & (after >= 0)[None]
    if not also_broken:
        wanted &= window.holds(cant_after)
    transition, row, column = np.nonzero(wanted.transpose(2, 0, 1))
    broken, overrun = np.zeros((2, len(transition)))
    if also_broken and len(transition):
        cants = (cant_before[:, None, :, None], cant_after[None, :, :, None])
        kept, over = shared_hard_kept(meeting, cants, exceptional)
        cell = (row, column, transition)
        good = np.broadcast_to(kept, wanted.shape)[cell]
        broken = np.where(good, 0.0, 1.0)
        overrun = np.where(good, 0.0, np.broadcast_to(over, wanted.shape)[cell])
    number = (before[row, transition], after[column, transition])
    shape = (len(transition), levels.run_kmh.shape[1])
    listed = PairList(
        transition,
        *number,
        broken,
        overrun,
        Permitted(np.full(shape, np.inf), np.ones(shape, dtype=np.bool_)),
        Permitted(np.full(shape, np.inf), np.ones(shape, dtype=np.bool_)),
    )
    _permit(listed, meeting, levels, (cant_before, cant_after), row, exceptional)
    return listed


def _in_danger(meeting: Meeting, cants: tuple[FloatArray, FloatArray], exceptional: bool) -> BoolArray:
    """Tell which classes a pair of cants may slow, (m, k); at the ends all rules are worst."""
    with np.errstate(invalid="ignore"):
        ends = [np.stack([np.fmin.reduce(cant), np.fmax.reduce(cant)])[:, :, None] for cant in cants]
    # A planned speed above all multiples that are tried is asked about too.
    lines = (meeting.before, meeting.after)
    fastest = [np.maximum(line.planned_kmh, top) for line, top in zip(lines, _ceilings(meeting), strict=True)]
    sure = surely_held(
        meeting,
        (np.nan_to_num(ends[0][:, None]), np.nan_to_num(ends[1][None])),
        np.nan_to_num(np.minimum(*fastest)),
        exceptional,
    )
    sure = np.broadcast_to(sure, (2, 2, *meeting.both.shape))
    return np.asarray(meeting.both & ~sure.all(axis=(0, 1)))


def _ceilings(meeting: Meeting) -> tuple[FloatArray, FloatArray]:
    """Give the speeds on the two curves above which nothing need be tried [km/h], shape (m, k)."""
    before, after = (
        np.fmin(next_multiple(line.planned_kmh, speed_steps(line)), FASTEST_KMH)
        for line in (meeting.before, meeting.after)
    )
    return before, after


def _permit(
    listed: PairList,
    meeting: Meeting,
    levels: Levels,
    cants: tuple[FloatArray, FloatArray],
    row: IntArray,
    exceptional: bool,
) -> None:
    """Enter what the pairs permit; ``row`` is the row of the level before in its table."""
    danger = _in_danger(meeting, cants, exceptional)
    if not danger.any() or not len(listed):
        return
    first = first_alike(meeting.before, meeting.after)
    cases = _Cases.of(meeting, *np.nonzero(danger & (first == np.arange(first.shape[1]))))
    kinds = cases.kinds
    multiples = Multiples.of(
        meeting.unfold(kinds.entry_at, kinds.entry_column),
        np.nan_to_num(cants[0][:, kinds.entry_at]),
        kinds.fastest(np.maximum(*cases.ceiling)),
        kinds.further(cases.planned, cases.odd),
        exceptional,
    )
    begin = np.searchsorted(listed.transition, np.arange(len(meeting) + 1))
    entry, pair = spread_ranges(begin[kinds.entry_at], begin[kinds.entry_at + 1])
    cell = multiples.cell(row[pair], entry)
    reached = multiples.reached(cell, levels.cant_mm[listed.after[pair]])
    # From pairs and kinds to pairs and classes.
    case, pair = spread_ranges(begin[kinds.at], begin[kinds.at + 1])
    start = np.searchsorted(entry, np.arange(len(kinds.entry_at)))
    known = start[kinds.entry[case]] + pair - begin[kinds.at[case]]
    run = (
        levels.run_kmh[listed.before[pair], kinds.column[case]],
        levels.run_kmh[listed.after[pair], kinds.column[case]],
    )
    on_after = slower_after(cases.shorter_after[case], run)
    asked = _Question(cases, multiples, case, cell[known], levels.cant_mm[listed.after[pair]], on_after, run)
    up_to, held = asked.answer([found[known] for found in reached])
    # What is found for a class holds for those treated alike; the first of them is in danger with them.
    for j in range(first.shape[1]):
        which = np.flatnonzero((danger[kinds.at, j] & (first[kinds.at, j] == kinds.column))[case])
        for mine, permitted in ((~on_after, listed.on_before), (on_after, listed.on_after)):
            chosen = which[mine[which]]
            permitted.up_to_kmh[pair[chosen], j] = up_to[chosen]
            permitted.planned[pair[chosen], j] = held[chosen]


def spread_ranges(begin: IntArray, end: IntArray) -> tuple[IntArray, IntArray]:
    """Give all whole numbers of ranges one after the other, each with the position of its range."""
    count = end - begin
    owner = np.repeat(np.arange(len(count)), count)
    offset = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    return owner, begin[owner] + offset


@dataclass
class _Cases:
    """Classes in danger over transitions; pairs of arrays (c,) for the curves before and after."""

    kinds: Kinds
    planned: tuple[FloatArray, FloatArray]
    ceiling: tuple[FloatArray, FloatArray]
    step: tuple[FloatArray, FloatArray]
    shorter_after: BoolArray

    @classmethod
    def of(cls, meeting: Meeting, at: IntArray, column: IntArray) -> _Cases:
        lines = (meeting.before, meeting.after)
        ceilings = _ceilings(meeting)
        shorter = meeting.after.weight_length_m[:, 0] < meeting.before.weight_length_m[:, 0]
        return cls(
            kinds=Kinds.of(meeting, at, column),
            planned=(lines[0].planned_kmh[at, column], lines[1].planned_kmh[at, column]),
            ceiling=(ceilings[0][at, column], ceilings[1][at, column]),
            step=(speed_steps(lines[0])[at, column], speed_steps(lines[1])[at, column]),
            shorter_after=shorter[at],
        )

    @property
    def odd(self) -> tuple[BoolArray, BoolArray]:
        """Whether the planned speeds are no multiples of the speed step, (c,) each."""
        before, after = (
            speed != np.rint(speed / step) * step for speed, step in zip(self.planned, self.step, strict=True)
        )
        return before, after


@dataclass
class _Question:
    """How fast the slower curve may be run over g pairs of cants, one class each; arrays (g,).

    The rule is that of :func:`cant.planning.permissible_shared.permitted_shared`.
    """

    cases: _Cases
    multiples: Multiples
    case: IntArray
    cell: IntArray
    cant_after: FloatArray
    on_after: BoolArray
    run: tuple[FloatArray, FloatArray]

    def answer(self, held_up_to: Sequence[IntArray]) -> tuple[FloatArray, BoolArray]:
        """Give the highest multiple permitted (inf: as far as asked) and whether the planned speed is.

        ``held_up_to``: the multiples of the step before and of that after up to which all the rules hold.
        """
        cases, multiples, on_after = self.cases, self.multiples, self.on_after
        planned_place = [self._planned_place(end) for end in (0, 1)]
        place = [
            np.where(run == planned[self.case], at[self.case], multiples.place(end, run, step[self.case]))
            for end, (run, planned, step, at) in enumerate(
                zip(self.run, cases.planned, cases.step, planned_place, strict=True)
            )
        ]
        other, other_place = np.where(on_after, self.run[0], self.run[1]), np.where(on_after, *place)
        planned, ceiling, step = (self._of_slower(x) for x in (cases.planned, cases.ceiling, cases.step))
        asked = np.where(planned <= other, self._of_slower(planned_place), other_place)
        held = multiples.holds(asked, self.cell, self.cant_after)
        beyond = np.ceil(other / step - _SLACK)
        tried = np.minimum(beyond - 1, np.floor(ceiling / step + _SLACK))
        tried = np.maximum(tried, 0).astype(np.int64)
        reached = np.minimum(np.where(on_after, held_up_to[1], held_up_to[0]), tried)
        up_to = np.where(reached < tried, reached * step, np.inf)
        last = np.flatnonzero((reached >= tried) & (beyond * step <= ceiling + _SLACK))
        stops = ~multiples.holds(other_place[last], self.cell[last], self.cant_after[last])
        stops |= multiples.gap(on_after[last], other_place[last], cases.kinds.entry[self.case[last]])
        last = last[stops]
        up_to[last] = (beyond[last] - 1) * step[last]
        return np.where((other > 0) & (ceiling > 0), up_to, np.inf), held

    def _of_slower(self, both: Sequence[npt.NDArray[Any]]) -> npt.NDArray[Any]:
        """Give what belongs to the curve that slows."""
        return np.where(self.on_after, both[1][self.case], both[0][self.case])

    def _planned_place(self, end: int) -> IntArray:
        """Give the places of the planned speeds on one curve (0 before, 1 after), shape (c,)."""
        cases = self.cases
        place = self.multiples.place(end, cases.planned[end], cases.step[end])
        return np.where(cases.odd[end], self.multiples.further + 2 * cases.kinds.rank + end, place)
