"""Pairs of cants over shared transitions on which trains may have to give way: what each pair permits.

All pairs are compared with windows (:mod:`cant.planning.windows`) at the few speeds that can occur: the
planned ones and the multiples of the speed steps. The windows of all multiples up to one, met, tell how far a
pair keeps everything; a class that is in no danger over any pair is left out before.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import shared_hard_kept
from cant.planning.levels import Levels
from cant.planning.permissible import FASTEST_KMH, Permitted, first_alike, next_multiple, speed_steps
from cant.planning.permissible_shared import shared_gap, slower_after, surely_held
from cant.planning.shared import Meeting, SharedAsked
from cant.planning.windows import Window, hard_window, speed_windows

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


@dataclass
class _Asked:
    """The windows of e transitions with one class each at every speed that can occur.

    ``window`` (v, a, e): at the planned speed before, after, and the multiples 0, 1, 2 ... of the steps
    before and after; ``gap`` (v, e) for each end where the limits of its curve have one above the planned
    speed; ``up_to`` for each end the windows of all multiples up to one, met.
    """

    planned: tuple[FloatArray, FloatArray]
    ceiling: tuple[FloatArray, FloatArray]
    step: tuple[FloatArray, FloatArray]
    first: tuple[int, int]
    window: Window
    gap: tuple[BoolArray, BoolArray]
    up_to: tuple[Window, Window]

    @classmethod
    def of(cls, part: Meeting, cant_before: FloatArray, exceptional: bool) -> _Asked:
        planned, ceiling = (part.before.planned_kmh, part.after.planned_kmh), _ceilings(part)
        step = (speed_steps(part.before), speed_steps(part.after))
        most = int(np.floor((np.maximum(*ceiling) / np.minimum(*step)).max() + _SLACK))
        count = np.arange(most + 1)[:, None, None, None]
        multiples = [count * step[0]]
        if (step[0] != step[1]).any():
            multiples.append(count * step[1])
        speeds = np.concatenate([planned[0][None, None], planned[1][None, None], *multiples])
        asked = SharedAsked(part, speeds, exceptional)
        window = speed_windows(asked, cant_before[:, :, None]).over_classes()
        gaps = [
            (shared_gap(part, speeds, np.full((1, 1), end == 1), exceptional))
            & (speeds > planned[end] + _SLACK)
            for end in (0, 1)
        ]
        gap = [np.broadcast_to(there, speeds.shape)[:, 0, :, 0] for there in gaps]
        first = (2, 2 + (len(multiples) - 1) * (most + 1))
        up_to = [_met(window, gap[0], slice(first[0], first[0] + most + 1))]
        alike = first[0] == first[1] and not (gap[0].any() or gap[1].any())
        up_to.append(up_to[0] if alike else _met(window, gap[1], slice(first[1], first[1] + most + 1)))
        return cls(
            planned=(planned[0][:, 0], planned[1][:, 0]),
            ceiling=(ceiling[0][:, 0], ceiling[1][:, 0]),
            step=(step[0][:, 0], step[1][:, 0]),
            first=first,
            window=window,
            gap=(gap[0], gap[1]),
            up_to=(up_to[0], up_to[1]),
        )

    def at(self, end: int, run: FloatArray, entry: IntArray) -> IntArray:
        """Give the positions of speeds run on one of the curves (0 before, 1 after)."""
        multiple = np.rint(run / self.step[end][entry]).astype(np.int64)
        return np.where(run == self.planned[end][entry], end, self.first[end] + multiple)


def _met(window: Window, gap: BoolArray, multiples: slice) -> Window:
    """Give what all multiples of a step up to one allow; that of 0 km/h is not asked."""
    low = np.where(gap[multiples, None], np.inf, window.low[multiples])
    high = window.high[multiples].copy()
    low[0], high[0] = -np.inf, np.inf
    return Window(np.maximum.accumulate(low), np.minimum.accumulate(high))


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
    # What is found for a class holds for those treated alike; the first of them is in danger with them.
    first = first_alike(meeting.before, meeting.after)
    at, column = np.nonzero(danger & (first == np.arange(first.shape[1])))
    asked = _Asked.of(meeting.unfold(at, column), np.nan_to_num(cants[0][:, at]), exceptional)
    begin = np.searchsorted(listed.transition, np.arange(len(meeting) + 1))
    entry, pair = spread_ranges(begin[at], begin[at + 1])
    run = (
        levels.run_kmh[listed.before[pair], column[entry]],
        levels.run_kmh[listed.after[pair], column[entry]],
    )
    shorter = meeting.after.weight_length_m[:, 0] < meeting.before.weight_length_m[:, 0]
    on_after = slower_after(shorter[at][entry], run)
    cant_after = levels.cant_mm[listed.after[pair]]
    up_to, held = _Question(asked, entry, row[pair], cant_after, on_after, run).answer()
    for j in range(first.shape[1]):
        which = np.flatnonzero(danger[at, j][entry] & (first[at, j] == column)[entry])
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
class _Question:
    """How fast the slower curve may be run over f pairs of cants with one class each.

    The rule is that of :func:`cant.planning.permissible_shared.permitted_shared`.
    """

    asked: _Asked
    entry: IntArray
    row: IntArray
    cant_after: FloatArray
    on_after: BoolArray
    run: tuple[FloatArray, FloatArray]

    def answer(self) -> tuple[FloatArray, BoolArray]:
        """Give the highest multiple permitted (inf: as far as asked) and whether the planned speed is."""
        asked, on_after = self.asked, self.on_after
        place = [asked.at(end, self.run[end], self.entry) for end in (0, 1)]
        other, other_place = np.where(on_after, self.run[0], self.run[1]), np.where(on_after, *place)
        planned, ceiling, step = (
            np.where(on_after, x[1][self.entry], x[0][self.entry])
            for x in (asked.planned, asked.ceiling, asked.step)
        )
        every = np.arange(len(self.entry))
        at_other = self._inside(asked.window, other_place, every)
        at_planned = self._inside(asked.window, on_after.astype(np.int64), every)
        held = np.where(planned <= other, at_planned, at_other)
        gap = np.where(on_after, *(asked.gap[end][other_place, self.entry] for end in (1, 0)))
        beyond = np.ceil(other / step - _SLACK)
        tried = np.minimum(beyond - 1, np.floor(ceiling / step + _SLACK))
        tried = np.maximum(tried, 0).astype(np.int64)
        reached = self._reached(tried)
        up_to = np.where(reached < tried, reached * step, np.inf)
        last = (reached >= tried) & (beyond * step <= ceiling + _SLACK)
        up_to = np.where(last & (~at_other | gap), (beyond - 1) * step, up_to)
        return np.where(other > 0, np.where(ceiling > 0, up_to, np.inf), np.inf), held

    def _inside(self, window: Window, place: IntArray, which: IntArray) -> BoolArray:
        at = (place, self.row[which], self.entry[which])
        cant = self.cant_after[which]
        return np.asarray((cant >= window.low[at]) & (cant <= window.high[at]))

    def _reached(self, tried: IntArray) -> IntArray:
        """Give up to which multiple everything holds, of those to try."""
        reached = np.zeros(len(tried), dtype=np.int64)
        for end in (0, 1):
            which = np.flatnonzero(self.on_after == bool(end))
            window = self.asked.up_to[end]
            good = self._inside(window, tried[which], which)
            reached[which[good]] = tried[which[good]]
            which = which[~good]
            # What holds up to a multiple holds up to every lower one: halving finds the last.
            jump = 1 << int(tried.max(initial=0)).bit_length()
            while jump > 1:
                jump //= 2
                trial = reached[which] + jump
                further = trial < tried[which]
                further &= self._inside(window, np.minimum(trial, tried[which]), which)
                reached[which] = np.where(further, trial, reached[which])
        return reached
