"""The speeds that cants permit over shared transitions: the multiples of the speed step, tried one by one.

There a rule may fail and hold again, so no closed form tells how far all is well; the multiples are tried,
but only where a simple bound does not already say so. A transition binds one of its two curves.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.permissible import FASTEST_KMH, Permitted
from cant.planning.rules import SPEED_QUANTITIES, Asked
from cant.planning.shared import Meeting, SharedAsked, speed_values
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

TRIALS = 200_000
"""Values tried together: bounds the memory of the search."""
_SLACK = 1e-9


def slows_after(meeting: Meeting, own_kmh: tuple[FloatArray, FloatArray]) -> BoolArray:
    """Tell where a transition binds the curve after it, shape (..., m, k); elsewhere it binds the one before.

    It binds where the class is slower by itself; where alike, the shorter curve; then the one before.
    """
    return slower_after(meeting.after.weight_length_m < meeting.before.weight_length_m, own_kmh)


def slower_after(shorter_after: BoolArray, own_kmh: tuple[FloatArray, FloatArray]) -> BoolArray:
    """Tell where a class is slower after a transition than before, the shorter curve deciding equal ones."""
    alike = np.abs(own_kmh[1] - own_kmh[0]) <= _SLACK
    return np.asarray((own_kmh[1] < own_kmh[0] - _SLACK) | (alike & shorter_after))


def permitted_shared(
    meeting: Meeting,
    cant_mm: tuple[FloatArray, FloatArray],
    own: tuple[Permitted, Permitted],
    steps: tuple[FloatArray, FloatArray],
    exceptional: bool,
) -> tuple[Permitted, Permitted]:
    """Give what shared transitions permit on the curve before and on the curve after each.

    Parameters
    ----------
    meeting : Meeting
        m transitions.
    cant_mm : pair of ndarray, shape (..., m, 1)
        Cants of the curve before and after [mm].
    own : pair of Permitted, shape (..., m, k)
        What each curve by itself permits.
    steps : pair of ndarray, shape (m, k)
    exceptional : bool

    Returns
    -------
    pair of Permitted
        Shape (..., m, k), to be combined with ``own``: no further than that is searched. One curve slows for
        a transition, not both: on the other one it permits anything.
    """
    lines = (meeting.before, meeting.after)
    run = [part.run_speed(line.planned_kmh) for part, line in zip(own, lines, strict=True)]
    on_after = slows_after(meeting, (run[0], run[1]))
    other = np.where(on_after, run[0], run[1])
    planned = np.where(on_after, lines[1].planned_kmh, lines[0].planned_kmh)
    held = shared_held(meeting, cant_mm, np.minimum(planned, other), exceptional)
    search = _Search(
        other=other,
        planned=planned,
        step=np.where(on_after, steps[1], steps[0]),
        on_after=on_after,
        ceiling=np.where(on_after, own[1].up_to_kmh, own[0].up_to_kmh),
        exceptional=exceptional,
    )
    up_to = search.run(meeting, cant_mm)
    free = np.full(on_after.shape, np.inf)
    return (
        Permitted(np.where(on_after, free, up_to), on_after | held),
        Permitted(np.where(on_after, up_to, free), ~on_after | held),
    )


def shared_held(
    meeting: Meeting, cant_mm: tuple[FloatArray, FloatArray], speed_kmh: FloatArray, exceptional: bool
) -> BoolArray:
    """Tell where shared transitions keep what a lower speed could mend, at some speeds: (..., m, k)."""
    held: BoolArray = np.ones(np.broadcast_shapes(speed_kmh.shape, cant_mm[0].shape), dtype=np.bool_)
    for found in speed_values(SharedAsked(meeting, speed_kmh, exceptional), *cant_mm):
        held = held & found.kept()
    return held


def shared_gap(meeting: Meeting, speed_kmh: FloatArray, on_after: BoolArray, exceptional: bool) -> BoolArray:
    """Tell where the limits of the curve that slows have a gap over the transition."""
    ramped, long = ~meeting.equal_cants, meeting.length_m > 0
    gaps = []
    for line in (meeting.before, meeting.after):
        asked = Asked(line, speed_kmh, exceptional)
        gap = np.zeros(np.broadcast_shapes(speed_kmh.shape, line.runs.shape), dtype=np.bool_)
        if ramped.any():
            gap |= asked.limit("rate of change of cant").gap & ramped
        if long.any():
            gap |= asked.limit("rate of change of cant deficiency").gap & long
        if not long.all():
            gap |= asked.limit("abrupt change of cant deficiency").gap & ~long
        gaps.append(gap)
    if not (gaps[0].any() or gaps[1].any()):
        return gaps[0]
    return np.where(on_after, gaps[1], gaps[0]) & meeting.both


@dataclass
class _Search:
    """The search over one transition or many, multiple by multiple: arrays (..., m, k).

    Attributes
    ----------
    other : ndarray
        Speed of the class on the curve that does not slow: no more is run over the transition.
    planned, step : ndarray
        Of the curve that slows.
    on_after : ndarray of bool
        The curve after slows.
    ceiling : ndarray
        No further than this need be searched.
    exceptional : bool
    """

    other: FloatArray
    planned: FloatArray
    step: FloatArray
    on_after: BoolArray
    ceiling: FloatArray
    exceptional: bool

    def run(self, meeting: Meeting, cant_mm: tuple[FloatArray, FloatArray]) -> FloatArray:
        """Give the highest multiple up to which all hold; inf where they hold as far as asked."""
        shape = self.on_after.shape
        up_to = np.full(shape, np.inf)
        cap = np.where(meeting.both, np.fmin(self.other, np.fmin(self.ceiling, FASTEST_KMH)), 0.0)
        cap = np.nan_to_num(cap)
        doubtful = np.broadcast_to(meeting.both & (cap > 0), shape) & ~surely_held(
            meeting, cant_mm, cap, self.exceptional
        )
        flat = doubtful.reshape(-1, *shape[-2:])
        work, columns = np.flatnonzero(flat.any(axis=(0, 2))), np.flatnonzero(flat.any(axis=(0, 1)))
        if not len(work):
            return up_to
        pick = np.ix_(work, columns)
        part = meeting.take(work).take_classes(columns)
        cants = (cant_mm[0][..., work, :], cant_mm[1][..., work, :])
        inner = _Search(
            other=self.other[..., pick[0], pick[1]],
            planned=self.planned[..., pick[0], pick[1]],
            step=self.step[..., pick[0], pick[1]],
            on_after=self.on_after[..., pick[0], pick[1]],
            ceiling=self.ceiling[..., pick[0], pick[1]],
            exceptional=self.exceptional,
        )
        found = inner._first_failing(part, cants)
        target = up_to[..., pick[0], pick[1]]
        up_to[..., pick[0], pick[1]] = np.where(doubtful[..., pick[0], pick[1]], found, target)
        return up_to

    def _first_failing(self, meeting: Meeting, cants: tuple[FloatArray, FloatArray]) -> FloatArray:
        """Try the multiples below the other curve's speed, then that speed itself."""
        shape = self.on_after.shape
        pace = np.nanmin(self.step)
        cap = np.fmin(np.fmin(self.other, self.ceiling), FASTEST_KMH)
        most = int(np.floor(np.nanmax(np.where(meeting.both, cap, 0.0)) / pace + _SLACK))
        up_to = np.full(shape, np.inf)
        alive = np.broadcast_to(meeting.both, shape).copy()
        at_once = max(1, TRIALS // max(1, int(np.prod(shape))))
        # Mostly the step is the same along the axes of levels: one row of trials then serves them all.
        step = self.step.reshape(-1, *shape[-2:])
        step = (
            step[0].reshape((1,) * (len(shape) - 2) + step[0].shape) if (step == step[0]).all() else self.step
        )
        for begin in range(1, most + 1, at_once):
            count = np.arange(begin, min(begin + at_once, most + 1))
            trial = count.reshape((-1,) + (1,) * len(shape)) * step
            asked_for = (trial < self.other - _SLACK) & (trial <= self.ceiling + _SLACK)
            held = shared_held(meeting, cants, trial, self.exceptional)
            gap = shared_gap(meeting, trial, self.on_after, self.exceptional)
            failing = asked_for & (~held | (gap & (trial > self.planned + _SLACK)))
            fails = failing.any(axis=0)
            first = count[failing.argmax(axis=0)]
            up_to = np.where(alive & fails, (first - 1) * self.step, up_to)
            alive &= ~fails
            if not alive.any():
                return up_to
        beyond = np.ceil(self.other / self.step - _SLACK)
        held = shared_held(meeting, cants, self.other, self.exceptional)
        gap = shared_gap(meeting, self.other, self.on_after, self.exceptional)
        failing = ~held | (gap & (self.other > self.planned + _SLACK))
        reached = (beyond * self.step <= np.fmin(self.ceiling, FASTEST_KMH) + _SLACK) & alive
        return np.where(reached & failing, (beyond - 1) * self.step, up_to)


def surely_held(
    meeting: Meeting, cant_mm: tuple[FloatArray, FloatArray], fastest_kmh: FloatArray, exceptional: bool
) -> BoolArray:
    """Tell where the rules hold at every speed up to one, by their largest values and smallest limits."""
    edges = meeting.before.table.speed_edges(SPEED_QUANTITIES)
    above = max([FASTEST_KMH, *edges]) + 1.0
    bands = [SharedAsked(meeting, np.full((1, 1), band), exceptional) for band in [*edges, above]]
    held: BoolArray = np.ones(fastest_kmh.shape, dtype=np.bool_)
    for found in speed_values(SharedAsked(meeting, fastest_kmh, exceptional), *cant_mm):
        limits = [asked.limit(found.rule.quantity) for asked in bands]
        least = np.minimum.reduce([limit.value + limit.tolerance for limit in limits])
        gap = np.logical_or.reduce([limit.gap for limit in limits])
        value = found.value
        if found.rule.quantity == "rate of change of cant deficiency":
            value = _largest_deficiency_rate(meeting, cant_mm, fastest_kmh)
        held = held & (~found.active | ((value <= least) & ~gap))
    return held


def _largest_deficiency_rate(
    meeting: Meeting, cant_mm: tuple[FloatArray, FloatArray], fastest_kmh: FloatArray
) -> FloatArray:
    """Give a value [mm/s] that the rate of deficiency does not pass at any speed up to one."""
    parts = [
        np.maximum(line.constant * fastest_kmh**2 / line.radius_m - cant, 0.0)
        for line, cant in zip((meeting.before, meeting.after), cant_mm, strict=True)
    ]
    same = meeting.before.hand == meeting.after.hand
    change = np.where(same, np.maximum(parts[0], parts[1]), parts[0] + parts[1])
    with np.errstate(divide="ignore", invalid="ignore"):
        return meeting.factor * change * fastest_kmh / (KMH_PER_MS * meeting.length_m)
