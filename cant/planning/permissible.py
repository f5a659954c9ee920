"""The speeds that cants permit: the search over multiples of the speed step, and the lowest speed.

Within one band of speeds the limits of a curve are fixed numbers, and every rule of the curve by itself
holds up to some speed: that speed has a closed form, so a band is one step and not a search. Over a shared
transition a rule may fail and hold again, so there the multiples are tried one by one, but only where a
simple bound does not already say that all is well.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE
from cant.planning.rules import SPEED_QUANTITIES, Asked, speed_terms
from cant.planning.shared import Meeting, SharedAsked, speed_values
from cant.units import GRAVITY_MS2, KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

FASTEST_KMH = 400.0
DEFAULT_SPEED_STEP_KMH = 5.0
_SLACK = 1e-9
_NEWTON_STEPS = 60
TRIALS = 200_000
"""Values tried together: bounds the memory of the search."""


@dataclass(frozen=True)
class Permitted:
    """What a set of rules permits, shape (..., n, k).

    Attributes
    ----------
    up_to_kmh : ndarray
        Highest multiple of the speed step at which, and at every lower multiple, all the rules hold; inf
        where they hold wherever asked (shared transitions alone).
    planned : ndarray of bool
        Whether they hold at the planned speed.
    """

    up_to_kmh: FloatArray
    planned: BoolArray

    def take(self, curves: npt.NDArray[np.int64] | BoolArray) -> Permitted:
        """Give some of the curves, from arrays (n, k)."""
        return Permitted(self.up_to_kmh[curves], self.planned[curves])

    def speed(self, planned_kmh: FloatArray) -> FloatArray:
        """Give the permissible speed [km/h]: the planned one is permissible where all holds at it."""
        return np.where(self.planned, np.fmax(self.up_to_kmh, planned_kmh), self.up_to_kmh)

    def run_speed(self, planned_kmh: FloatArray) -> FloatArray:
        """Give the speed run [km/h]: the lower of planned and permissible."""
        return np.where(self.planned, planned_kmh, np.minimum(planned_kmh, self.up_to_kmh))


def speed_steps(line: Line) -> FloatArray:
    """Give the speed step of each class on each curve [km/h], shape (n, k): 5 km/h unless the limits say."""
    step = line.table.at(
        "speed step",
        exceptional=False,
        category=line.category,
        situation=line.situation,
        speed=line.planned_kmh,
        radius=line.radius_m,
    ).value
    return np.where(np.isfinite(step) & (step > 0), step, DEFAULT_SPEED_STEP_KMH)


def first_alike(*lines: Line) -> IntArray:
    """Give for each class the first one that the speed rules treat alike on a curve, shape (n, k).

    On several lines of n curves each: alike on all of them. Such classes have the same permissible speeds at
    the same cants, so these are searched once.
    """
    n, k = lines[0].runs.shape
    first = np.tile(np.arange(k), (n, 1))
    for c in range(k):
        for d in range(c - 1, -1, -1):
            alike: BoolArray = np.ones(n, dtype=np.bool_)
            for line in lines:
                for part in (line.planned_kmh, line.category):
                    alike &= part[:, c] == part[:, d]
                roll = line.roll[:, [c, d]]
                alike &= (roll[:, 0] == roll[:, 1]) | np.isnan(roll).all(axis=1)
            first[alike, c] = d
    return first


def next_multiple(speed_kmh: FloatArray, step_kmh: FloatArray) -> FloatArray:
    """Give the multiple of a step at or next above a speed [km/h].

    A speed that is itself no multiple may be run where the rules hold up to this one.
    """
    return np.asarray(np.ceil(speed_kmh / step_kmh - _SLACK) * step_kmh)


def gap_at(asked: Asked) -> BoolArray:
    """Tell where the limits have a gap that a permissible speed must not pass, shape (..., n, k)."""
    line = asked.line
    gap = np.zeros(np.broadcast_shapes(asked.speed_kmh.shape, line.runs.shape), dtype=np.bool_)
    for quantity in ("cant deficiency", "felt acceleration"):
        if line.table.has(quantity):
            gap |= asked.limit(quantity).gap
    for end in (BEFORE, AFTER):
        if (~np.isnan(line.ramp_m[end])).any():
            gap |= asked.limit("rate of change of cant").gap & ~np.isnan(line.ramp_m[end])
        if (line.transition_m[end] > 0).any():
            gap |= asked.limit("rate of change of cant deficiency").gap & (line.transition_m[end] > 0)
        if (line.transition_m[end] == 0).any():
            gap |= asked.limit("abrupt change of cant deficiency").gap & (line.transition_m[end] == 0)
    return gap & line.runs


def _bands(line: Line) -> list[tuple[float, float]]:
    edges = [e for e in line.table.speed_edges(SPEED_QUANTITIES) if e < FASTEST_KMH]
    return list(zip([0.0, *edges], [*edges, FASTEST_KMH], strict=True))


def _root_of_rate(cant_mm: FloatArray, line: Line, ceiling: FloatArray) -> FloatArray:
    """Solve (C v^2 / R - D) v = ceiling for v > 0 [km/h], ceiling in mm km/h; Newton from above."""
    p = -cant_mm * line.radius_m / line.constant
    q = ceiling * line.radius_m / line.constant
    shape = np.broadcast_shapes(p.shape, q.shape)
    p, q = np.broadcast_to(p, shape), np.broadcast_to(q, shape)
    usable = np.isfinite(q) & (q >= 0)
    root = np.where(usable, 0.0, np.where(q < 0, 0.0, np.inf))
    p, q = p[usable], q[usable]
    # Above both sqrt(-p) and the root without p the cubic is positive, increasing and convex.
    v = np.sqrt(np.maximum(-p, 0.0)) + np.cbrt(np.maximum(q, 0.0))
    for _ in range(_NEWTON_STEPS):
        with np.errstate(divide="ignore", invalid="ignore"):
            move = (v**3 + p * v - q) / (3 * v**2 + p)
        move = np.where(np.isfinite(move), move, 0.0)
        v = np.maximum(v - move, 0.0)
        if not (move > 1e-12 * v).any():
            break
    root[usable] = v
    return root


class _Roots:
    """Roots of the rate of deficiency at some cants: bands and ends of one limit and length share theirs."""

    def __init__(self, line: Line, cant_mm: FloatArray) -> None:
        self._line, self._cant_mm = line, cant_mm
        self._found: list[tuple[FloatArray, FloatArray]] = []

    def under(self, ceiling: FloatArray) -> FloatArray:
        """Give the speed [km/h] at which the rate, times what makes it mm km/h, reaches a ceiling."""
        for known, root in self._found:
            if np.array_equal(known, ceiling):
                return root
        root = _root_of_rate(self._cant_mm, self._line, ceiling)
        self._found.append((ceiling, root))
        return root


def _fastest_in_band(line: Line, cant_mm: FloatArray, asked: Asked, roots: _Roots) -> FloatArray:
    """Give the highest speed at which the rules of the curve hold with a band's limits [km/h]."""
    deficiency = asked.limit("cant deficiency")
    allowed = deficiency.value + deficiency.tolerance
    if line.table.has("felt acceleration"):
        felt = asked.limit("felt acceleration")
        with np.errstate(invalid="ignore"):
            in_mm = (felt.value + felt.tolerance) * line.spacing_mm / (GRAVITY_MS2 * (1.0 + line.roll))
        allowed = np.fmin(allowed, np.where(np.isfinite(felt.value), in_mm, np.inf))
    unbalanced = cant_mm + allowed
    for end in (BEFORE, AFTER):
        none = line.transition_m[end] == 0
        if none.any():
            jump = asked.limit("abrupt change of cant deficiency")
            unbalanced = np.where(none, np.minimum(unbalanced, jump.value + jump.tolerance), unbalanced)
    fastest = np.sqrt(np.maximum(unbalanced, 0.0) * line.radius_m / line.constant)
    fastest = np.where(unbalanced < 0, -1.0, fastest)
    for end in (BEFORE, AFTER):
        fastest = np.minimum(fastest, _fastest_over_end(line, cant_mm, asked, end, roots))
    return fastest


def _fastest_over_end(line: Line, cant_mm: FloatArray, asked: Asked, end: int, roots: _Roots) -> FloatArray:
    fastest: FloatArray = np.full((1, 1), np.inf)
    ramp, length = line.ramp_m[end], line.transition_m[end]
    known, long = ~np.isnan(ramp), length > 0
    with np.errstate(divide="ignore", invalid="ignore"):
        if known.any():
            rate = asked.limit("rate of change of cant")
            v = KMH_PER_MS * ramp * (rate.value + rate.tolerance) / (line.factor * np.abs(cant_mm))
            fastest = np.where(known & (cant_mm != 0), v, np.inf)
        if long.any():
            rate = asked.limit("rate of change of cant deficiency")
            ceiling = (rate.value + rate.tolerance) * KMH_PER_MS * length / line.factor
            fastest = np.minimum(fastest, roots.under(np.where(long, ceiling, np.inf)))
    return fastest


def permitted_alone(
    line: Line, cant_mm: FloatArray, steps: FloatArray, exceptional: bool, as_run: bool = False
) -> Permitted:
    """Give what the rules of the curves by themselves permit.

    Parameters
    ----------
    line : Line
        n curves, k classes.
    cant_mm : ndarray, shape (..., n, 1)
        Cants as set [mm].
    steps : ndarray, shape (n, k)
        Speed steps [km/h].
    exceptional : bool
        Tier.
    as_run : bool
        Only what is run is asked for: the search ends with the band of the multiple at or next above the
        fastest planned speed.

    Returns
    -------
    Permitted
        Shape (..., n, k), shared transitions left out.
    """
    shape = np.broadcast_shapes(cant_mm.shape, line.runs.shape)
    up_to = np.zeros(shape)
    alive = np.ones(shape, dtype=np.bool_)
    roots = _Roots(line, cant_mm)
    planned = np.nan_to_num(line.planned_kmh)
    enough = next_multiple(planned, steps).max(initial=0.0) if as_run else FASTEST_KMH
    for low, high in _bands(line):
        if low >= enough:
            break
        asked = Asked(line, np.full((1, 1), high), exceptional)
        fastest = _fastest_in_band(line, cant_mm, asked, roots)
        gap = gap_at(asked)
        fastest = np.where(gap & (planned < high), np.minimum(fastest, planned), fastest)
        last = np.floor(high / steps + _SLACK)
        reached = np.floor(np.minimum(np.maximum(fastest, -1.0), high) / steps + _SLACK)
        begin = np.floor(low / steps + _SLACK)
        up_to = np.where(alive & (reached > begin), reached * steps, up_to)
        alive &= (reached >= last) | (last <= begin)
    held = np.ones(shape, dtype=np.bool_)
    for terms in speed_terms(Asked(line, line.planned_kmh, exceptional)):
        held &= terms.kept(cant_mm)
    return Permitted(up_to, held)


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
    ceiling_kmh: tuple[FloatArray, FloatArray] | None = None,
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
    ceiling_kmh : pair of ndarray, optional
        Speeds above these need not be searched, shape (..., m, k); what ``own`` permits where not given.

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
    ceiling = ceiling_kmh or (own[0].up_to_kmh, own[1].up_to_kmh)
    search = _Search(
        other=other,
        planned=planned,
        step=np.where(on_after, steps[1], steps[0]),
        on_after=on_after,
        ceiling=np.where(on_after, ceiling[1], ceiling[0]),
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


def lowest_speeds(line: Line, cant_mm: FloatArray, exceptional: bool) -> FloatArray:
    """Give the speed below which excess goes over its limit [km/h], shape (..., n, k); 0 where never."""
    edges = line.table.speed_edges(("cant excess",))
    lowest: FloatArray = np.zeros(np.broadcast_shapes(cant_mm.shape, line.runs.shape))
    for low, high in zip([0.0, *edges], [*edges, np.inf], strict=True):
        limit = Asked(line, np.full((1, 1), high), exceptional).limit("cant excess").value
        with np.errstate(invalid="ignore"):
            square = np.maximum(cant_mm - limit, 0.0) * line.radius_m / line.constant
        here = np.minimum(np.sqrt(square), high)
        lowest = np.where(here > low, np.maximum(lowest, here), lowest)
    return lowest
