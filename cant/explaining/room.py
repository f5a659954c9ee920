"""What room a curve would have if something about it were otherwise: bounds with some rules left out.

Closed forms over arrays of curves by themselves, at normal values and planned speeds. They point at changes
worth trying; whether a change really fits, the planner says (:mod:`cant.explaining.local`).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from cant.planning.grid import Grid
from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE, Pairs
from cant.planning.permissible import lowest_speeds, speed_steps
from cant.planning.rules import AT_LEAST, AT_MOST, CURVE, EXCESS, FELT_INWARDS, Asked, Rule, curve_terms
from cant.planning.shared import Meeting, SharedAsked, change_of_cant, change_of_deficiency
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

_FLATTER = np.geomspace(1.01, 2.0, 60)
"""Radii tried, over today's."""


@dataclass(frozen=True)
class Room:
    """Bounds on the cant, arrays (n,), and whether what no cant can mend is kept."""

    low_mm: FloatArray
    high_mm: FloatArray
    kept: BoolArray

    def nearest(self, grid: Grid, target_mm: FloatArray) -> FloatArray:
        """Give the cant of a grid within the bounds that lies nearest to a target; nan where none does."""
        cant = grid.nearest(target_mm, self.low_mm, self.high_mm)
        return np.where(self.kept, cant, np.nan)


def room(line: Line, without: Callable[[Rule], bool] = lambda rule: False) -> Room:
    """Give the bounds of curves by themselves, tolerance included, some rules left out."""
    n = len(line)
    low, high, kept = np.full(n, -np.inf), np.full(n, np.inf), np.ones(n, dtype=np.bool_)
    for terms in curve_terms(Asked(line, line.planned_kmh, False)):
        if without(terms.rule):
            continue
        if terms.rule.sense == 0:
            kept &= terms.kept(np.zeros((n, 1))).all(axis=-1)
        elif terms.rule.sense < 0:
            low = np.maximum(low, terms.bound(with_tolerance=True).max(axis=-1))
        else:
            high = np.minimum(high, terms.bound(with_tolerance=True).min(axis=-1))
    return Room(low, high, kept)


def free_of(grid: Grid) -> Grid:
    """Give the grid of curves whose cant may be changed."""
    return replace(grid, fixed_mm=np.full(grid.fixed_mm.shape, np.nan))


def without_excess(line: Line, grid: Grid) -> FloatArray:
    """Give the least cant [mm] that keeps all but excess, shape (n,); nan where there is none."""
    found = room(line, lambda rule: rule in (EXCESS, FELT_INWARDS))
    return found.nearest(grid, np.zeros(len(line)))


def speeds_for_excess(line: Line, cant_mm: FloatArray) -> FloatArray:
    """Give the least speeds at which no regular class has too much excess at a cant [km/h], shape (n, k).

    Multiples of the speed step; nan where the class keeps its limit as it is.
    """
    lowest = lowest_speeds(line, cant_mm[:, None], False)
    step = speed_steps(line)
    wanted = np.ceil(lowest / step - 1e-9) * step
    with np.errstate(invalid="ignore"):
        slow = line.regular & (line.planned_kmh < lowest - 1e-6)
    return np.where(slow, wanted, np.nan)


def without_site(line: Line, grid: Grid, target_mm: FloatArray) -> FloatArray:
    """Give the cant [mm] that the curve would have if its site demanded nothing, shape (n,)."""
    found = room(line, lambda rule: rule in (AT_MOST, AT_LEAST))
    return found.nearest(free_of(grid), target_mm)


def lengths_needed(
    line: Line, grid: Grid, target_mm: FloatArray, rounding_m: float
) -> tuple[FloatArray, FloatArray]:
    """Give the transition lengths [m] that the curve needs at its two ends, shapes (n,).

    At the cant for which they are shortest together, of the ends to a straight; rounded up. nan where no
    transition helps, or the end needs no more than it has.
    """
    found = room(line, lambda rule: rule.place != CURVE)
    low = grid.nearest(np.full(len(line), -1.0), found.low_mm, found.high_mm)
    cants = np.stack(
        [found.nearest(grid, target_mm), low, grid.nearest(low + 1e6, found.low_mm, found.high_mm)]
    )
    ends = np.stack([_length_at(line, cants, end, rounding_m) for end in (BEFORE, AFTER)])
    has = np.stack([np.nan_to_num(line.transition_m[end][:, 0]) for end in (BEFORE, AFTER)])
    added = np.maximum(ends - has[:, None, :], 0.0).sum(axis=0)
    best = np.where(np.isnan(added), np.inf, added).argmin(axis=0)
    chosen = np.take_along_axis(ends, best[None, None, :], axis=1)[:, 0, :]
    known = np.isfinite(chosen).all(axis=0)
    with np.errstate(invalid="ignore"):
        longer = known & (chosen > has + 1e-6)
    wanted = np.where(longer, chosen, np.nan)
    return wanted[BEFORE], wanted[AFTER]


def without_ends(line: Line, grid: Grid, target_mm: FloatArray) -> FloatArray:
    """Give the cant [mm] that the curve would have if its transitions were long enough, shape (n,)."""
    return room(line, lambda rule: rule.place != CURVE).nearest(grid, target_mm)


def shared_lengths_needed(line: Line, pairs: Pairs, cant_mm: FloatArray, rounding_m: float) -> FloatArray:
    """Give the lengths [m] that shared transitions need at given cants (n,), shape (m,), rounded up.

    nan where a cant is not known, or no more is needed than there is.
    """
    meeting = Meeting.of(line, pairs)
    planned = np.where(meeting.both, meeting.planned_kmh, np.nan)
    asked = SharedAsked(meeting, planned, False)
    cants = (cant_mm[pairs.first][:, None], cant_mm[pairs.second][:, None])
    speed = planned / KMH_PER_MS
    change = change_of_cant(meeting, *cants)
    lacking = change_of_deficiency(meeting, planned, *cants)
    with np.errstate(divide="ignore", invalid="ignore"):
        lengths = [
            meeting.factor * part / asked.limit(quantity).value
            for quantity, part in (
                ("cant gradient", change * np.ones_like(speed)),
                ("rate of change of cant", change * speed),
                ("rate of change of cant deficiency", lacking * speed),
            )
        ]
    needed = np.fmax.reduce([np.fmax.reduce(part, axis=-1, initial=0.0) for part in lengths])
    needed = np.ceil(needed / rounding_m - 1e-9) * rounding_m
    known = ~np.isnan(cants[0][:, 0] + cants[1][:, 0]) & np.isfinite(needed)
    return np.where(known & (needed > pairs.length_m + 1e-6), needed, np.nan)


def _length_at(line: Line, cants_mm: FloatArray, end: int, rounding_m: float) -> FloatArray:
    """Give the length needed at one end for trial cants (t, n) [m]; 0 at an end that is not to a straight."""
    cant = cants_mm[..., None]
    asked = Asked(line, line.planned_kmh, False)
    speed = line.planned_kmh / KMH_PER_MS
    lacking = np.maximum(equilibrium_cant(line.planned_kmh, line.radius_m, line.constant) - cant, 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        lengths = np.stack(
            [
                np.broadcast_to(
                    line.factor * part / asked.limit(quantity).value, cant.shape[:-1] + speed.shape[-1:]
                )
                for quantity, part in (
                    ("cant gradient", cant * np.ones_like(speed)),
                    ("rate of change of cant", cant * speed),
                    ("rate of change of cant deficiency", lacking * speed),
                )
            ]
        )
    needed = np.where(line.runs, lengths, 0.0).max(axis=(0, -1), initial=0.0)
    needed = np.ceil(needed / rounding_m - 1e-9) * rounding_m
    known = line.transition_m[end][:, 0] >= 0
    return np.where(np.isnan(cants_mm), np.nan, np.where(known, needed, 0.0))


def radius_needed(
    line: Line, grid: Grid, target_mm: FloatArray, rounding_m: float, arc_alone: bool = False
) -> FloatArray:
    """Give the smallest radius [m] at which the curve by itself fits, up to twice today's; else nan: (n,).

    ``arc_alone``: whatever its transitions.
    """
    n = len(line)
    wide = line.take(np.tile(np.arange(n), len(_FLATTER)))
    today = np.tile(line.radius_m, (len(_FLATTER), 1))
    tried = np.ceil(today * np.repeat(_FLATTER, n)[:, None] / rounding_m) * rounding_m
    wide.radius_m = tried
    cant = room(wide, lambda rule: arc_alone and rule.place != CURVE).nearest(
        grid.take(np.tile(np.arange(n), len(_FLATTER))), np.tile(target_mm, len(_FLATTER))
    )
    fits = ~np.isnan(cant.reshape(len(_FLATTER), n))
    first = fits.argmax(axis=0)
    return np.where(fits.any(axis=0), tried[:, 0].reshape(len(_FLATTER), n)[first, np.arange(n)], np.nan)
