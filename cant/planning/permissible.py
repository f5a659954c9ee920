"""The speeds that cants permit on curves by themselves: the search over multiples of the speed step.

Within one band of speeds the limits of a curve are fixed numbers, and every rule of the curve by itself
holds up to some speed: that speed has a closed form, so a band is one step and not a search. What shared
transitions permit stands in :mod:`cant.planning.permissible_shared`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE
from cant.planning.rules import SPEED_QUANTITIES, Asked, speed_terms
from cant.units import GRAVITY_MS2, KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

FASTEST_KMH = 400.0
DEFAULT_SPEED_STEP_KMH = 5.0
_SLACK = 1e-9
_NEWTON_STEPS = 60


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

    @classmethod
    def everything(cls, n: int, k: int) -> Permitted:
        """Give what permits everything to k classes on n curves."""
        return cls(np.full((n, k), np.inf), np.ones((n, k), dtype=np.bool_))

    def take(self, curves: npt.NDArray[np.int64] | BoolArray) -> Permitted:
        """Give some of the curves, from arrays (n, k)."""
        return Permitted(self.up_to_kmh[curves], self.planned[curves])

    @property
    def slows(self) -> BoolArray:
        """Where not everything is permitted to every class, shape (..., n)."""
        return np.asarray((~self.planned | np.isfinite(self.up_to_kmh)).any(axis=-1))

    def speed(self, planned_kmh: FloatArray) -> FloatArray:
        """Give the permissible speed [km/h]: the planned one is permissible where all holds at it."""
        return np.where(self.planned, np.fmax(self.up_to_kmh, planned_kmh), self.up_to_kmh)

    def run_speed(self, planned_kmh: FloatArray) -> FloatArray:
        """Give the speed run [km/h]: the lower of planned and permissible."""
        return np.where(self.planned, planned_kmh, np.minimum(planned_kmh, self.up_to_kmh))


def speed_steps(line: Line) -> FloatArray:
    """Give the speed step of each class on each curve [km/h], shape (n, k): 5 km/h unless the limits say."""
    if not line.table.has("speed step"):
        return np.full(line.runs.shape, DEFAULT_SPEED_STEP_KMH)
    step = line.table.at(
        "speed step",
        exceptional=False,
        category=line.category,
        situation=line.situation,
        speed=line.planned_kmh,
        radius=line.radius_m,
    ).value
    return np.where(np.isfinite(step) & (step > 0), step, DEFAULT_SPEED_STEP_KMH)


def first_of_kind(*lines: Line) -> IntArray:
    """Give for each class the first one of which the same speeds are permissible, shape (n, k).

    On several lines of n curves each: on all of them. How far the rules hold does not depend on how fast a
    class is planned, unless the limits have gaps (they end the search above the planned speed) or the speed
    step hangs on it.
    """
    table = lines[0].table
    gaps = any(table.may_have_gap(quantity) for quantity in SPEED_QUANTITIES)
    if gaps or table.changes_with_speed("speed step"):
        return first_alike(*lines)
    return _first_equal([line.kind for line in lines])


def first_alike(*lines: Line) -> IntArray:
    """Give for each class the first one of the same kind and planned speed, shape (n, k).

    On several lines of n curves each: alike on all of them.
    """
    return _first_equal([part for line in lines for part in (line.kind, line.planned_kmh)])


def _first_equal(parts: Sequence[npt.NDArray[Any]]) -> IntArray:
    n, k = parts[0].shape
    first = np.empty((n, k), dtype=np.int64, order="F")
    first[:] = np.arange(k)
    for c in range(k):
        for d in range(c - 1, -1, -1):
            alike = np.logical_and.reduce([part[:, c] == part[:, d] for part in parts])
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
            square = v * v
            move = (v * (square + p) - q) / (3 * square + p)
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
    line: Line, cant_mm: FloatArray, steps: FloatArray, exceptional: bool, enough_kmh: float = FASTEST_KMH
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
    enough_kmh : float
        The search ends with the band of this speed: for what is run, the multiple at or next above the
        fastest planned speed is enough.

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
    for low, high in _bands(line):
        if low >= enough_kmh:
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
