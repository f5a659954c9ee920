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
from cant.planning.multiples import Multiples
from cant.planning.permissible import Permitted
from cant.planning.permissible_shared import slower_after
from cant.planning.reach import Cases, Reach, in_danger, spread_ranges
from cant.planning.room import Room
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

    @classmethod
    def free(
        cls,
        transition: IntArray,
        number: tuple[IntArray, IntArray],
        broken: tuple[FloatArray, FloatArray],
        classes: int,
    ) -> PairList:
        """List pairs that permit everything."""
        shape = (len(transition), classes)
        return cls(transition, *number, *broken, Permitted.everything(*shape), Permitted.everything(*shape))


def make_pair_list(
    meeting: Meeting, levels: Levels, exceptional: bool, also_broken: bool, room: Room | None = None
) -> PairList:
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
    room : Room, optional
        Without pairs that cost more time than it has.

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
    danger = in_danger(meeting, (cant_before, cant_after), exceptional)
    if not danger.any() or not len(transition):
        return PairList.free(transition, number, (broken, overrun), levels.run_kmh.shape[1])
    cases = Cases.of(meeting, danger)
    pairs = (transition, row, levels.cant_mm[number[1]])
    reach = Reach.of(meeting, cases, cant_before, pairs, exceptional)
    if room is not None:
        keep = room.suffices(cases, reach, transition)
        transition, broken, overrun = transition[keep], broken[keep], overrun[keep]
        number, reach = (number[0][keep], number[1][keep]), reach.keep(keep)
    listed = PairList.free(transition, number, (broken, overrun), levels.run_kmh.shape[1])
    _permit(listed, levels, cases, reach)
    return listed


def _permit(listed: PairList, levels: Levels, cases: Cases, reach: Reach) -> None:
    """Enter what the pairs permit, where that is not everything."""
    kinds, at = cases.kinds, reach.short(cases)
    begin = np.searchsorted(reach.entry[at], np.arange(len(kinds.entry_at) + 1))
    # From pairs and kinds to pairs and classes.
    case, place = spread_ranges(begin[kinds.entry], begin[kinds.entry + 1])
    at = at[place]
    pair = reach.pair[at]
    run = (
        levels.run_kmh[listed.before[pair], kinds.column[case]],
        levels.run_kmh[listed.after[pair], kinds.column[case]],
    )
    on_after = slower_after(cases.shorter_after[case], run)
    asked = _Question(
        cases, reach.multiples, case, reach.cell[at], levels.cant_mm[listed.after[pair]], on_after, run
    )
    up_to, held = asked.answer([found[at] for found in reach.reached])
    # What is found for a class holds for those treated alike; the first of them is in danger with them.
    for j in range(cases.first.shape[1]):
        which = np.flatnonzero(cases.stands_for(j)[case])
        for mine, permitted in ((~on_after, listed.on_before), (on_after, listed.on_after)):
            chosen = which[mine[which]]
            permitted.up_to_kmh[pair[chosen], j] = up_to[chosen]
            permitted.planned[pair[chosen], j] = held[chosen]


@dataclass
class _Question:
    """How fast the slower curve may be run over g pairs of cants, one class each; arrays (g,).

    The rule is that of :func:`cant.planning.permissible_shared.permitted_shared`.
    """

    cases: Cases
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
