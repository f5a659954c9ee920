"""The cants of the grid that some curves may take, each by itself: the cost in time, approvals and target.

Made only for the curves that a closed form does not settle.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.planning.assess import (
    LIMIT_OF_NOTHING,
    hard_kept,
    overrun,
    passed_alone,
)
from cant.planning.bounds import bounds_at, hard_bounds
from cant.planning.grid import Grid
from cant.planning.lexicographic import first_best, slack
from cant.planning.line import Line
from cant.planning.permissible import Permitted, first_of_kind, next_multiple, permitted_alone, speed_steps
from cant.planning.rules import AT_LEAST, AT_MOST, Asked, hard_terms, speed_terms
from cant.planning.running_time import Services
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


@dataclass
class Nodes:
    """The levels of some curves: arrays (levels, n), those of a class (levels, n, k).

    Attributes
    ----------
    cant_mm : ndarray
        Levels, ascending, that keep what no lower speed can mend, for a curve that is not compliant the one
        that it must take; nan where there is none.
    allowed : ndarray of bool
        Where there is a level.
    alone : Permitted
        What the curve by itself permits; not searched below a planned speed that all levels permit.
    run_kmh : ndarray
        Speeds run as far as the curve by itself decides.
    stopped, lost_s, count, overrun, square : ndarray
        Measures 1 to 4 at those speeds; a class that may not run at all is measured apart in ``stopped``. The
        last three only where a level loses as little time as any, elsewhere inf.
    not_compliant : ndarray of bool, shape (n,)
        No level keeps what no lower speed can mend.
    """

    cant_mm: FloatArray
    allowed: BoolArray
    alone: Permitted
    run_kmh: FloatArray
    stopped: FloatArray
    lost_s: FloatArray
    count: FloatArray
    overrun: FloatArray
    square: FloatArray
    not_compliant: BoolArray

    def take(self, curves: IntArray) -> Nodes:
        """Give the nodes of some of the curves."""
        chosen: dict[str, Any] = {
            item.name: getattr(self, item.name)[:, curves]
            for item in fields(self)
            if item.name not in ("alone", "not_compliant")
        }
        alone = Permitted(self.alone.up_to_kmh[:, curves], self.alone.planned[:, curves])
        return Nodes(**chosen, alone=alone, not_compliant=self.not_compliant[curves])

    @property
    def cheapest(self) -> BoolArray:
        """Allowed levels that lose as little time as any, by the curve alone, (levels, n)."""
        left = self.allowed
        for measure in (self.stopped, self.lost_s):
            value = np.where(left, measure, np.inf)
            least = value.min(axis=0)
            left = left & (value <= least + slack(np.where(np.isfinite(least), least, 0.0)))
        return left


def squares(line: Line, cant_mm: FloatArray, run_kmh: FloatArray, target: Target) -> FloatArray:
    """Give length x (D - target)^2 with the target taken at the run speeds, shape (..., n) [m mm2]."""
    distance = cant_mm - target(line, run_kmh)
    return np.asarray((distance**2 * line.weight_length_m)[..., 0])


def make_nodes(line: Line, grid: Grid, target: Target, exceptional: bool) -> Nodes:
    """Evaluate the levels of every curve of a (small) line."""
    line = line.with_bands()
    levels, not_compliant = _levels(line, grid, exceptional)
    allowed = ~np.isnan(levels)
    cant = np.where(allowed, levels, 0.0)[:, :, None]
    alone = _alone(line, cant, allowed, exceptional)
    run = np.where(line.runs, alone.run_speed(line.planned_kmh), np.nan)
    services = Services.of(line)
    nodes = Nodes(
        cant_mm=levels,
        allowed=allowed,
        alone=alone,
        run_kmh=run,
        stopped=services.stopped(run),
        lost_s=services.lost_s(run),
        count=np.full(levels.shape, np.inf),
        overrun=np.full(levels.shape, np.inf),
        square=np.full(levels.shape, np.inf),
        not_compliant=not_compliant,
    )
    _weigh_cheapest(line, nodes, target)
    return nodes


def _weigh_cheapest(line: Line, nodes: Nodes, target: Target) -> None:
    """Enter what is passed and the squares at the levels that lose least time: no others can be chosen."""
    cheapest = nodes.cheapest
    run = nodes.run_kmh[cheapest.argmax(axis=0), np.arange(len(line))]
    alike = cheapest & ((nodes.run_kmh == run) | ~line.runs).all(axis=-1)
    # Where the speeds run are the same, so is the target, and bounds tell which levels pass nothing.
    np.copyto(nodes.square, squares(line, np.nan_to_num(nodes.cant_mm)[:, :, None], run, target), where=alike)
    bounds = bounds_at(line, run)
    with np.errstate(invalid="ignore"):
        clean = (nodes.cant_mm >= bounds.low_mm) & (nodes.cant_mm <= bounds.high_mm) & bounds.kept & alike
    nodes.count[clean], nodes.overrun[clean] = 0.0, 0.0
    level, curve = np.nonzero(cheapest & ~clean)
    part, cant, run = line.take(curve), nodes.cant_mm[level, curve][:, None], nodes.run_kmh[level, curve]
    passed = passed_alone(part, cant, run)
    nodes.count[level, curve], nodes.overrun[level, curve] = passed.count, passed.total
    nodes.square[level, curve] = squares(part, cant, run, target)


def _levels(line: Line, grid: Grid, exceptional: bool) -> tuple[FloatArray, BoolArray]:
    """Give the levels that may be taken, (levels, n) [mm], and which curves are not compliant.

    They keep what no lower speed can mend; where none does, the curve has one level: the least bad.
    """
    bounds = hard_bounds(line, exceptional)
    levels = grid.between(bounds.low_mm, bounds.high_mm)
    allowed = ~np.isnan(levels)
    allowed &= hard_kept(line, np.where(allowed, levels, 0.0)[:, :, None], exceptional)
    levels = np.where(allowed, levels, np.nan)
    not_compliant: BoolArray = np.asarray(~allowed.any(axis=0))
    if not_compliant.any():
        bad = np.flatnonzero(not_compliant)
        every = grid.take(bad).levels()
        known = ~np.isnan(every)
        cants = np.where(known, every, 0.0)
        chosen = _least_bad(line.take(bad), cants[:, :, None], known, exceptional)
        levels[0, bad] = cants[chosen, np.arange(len(bad))]
    return levels, not_compliant


def _alone(line: Line, cant_mm: FloatArray, allowed: BoolArray, exceptional: bool) -> Permitted:
    """Give what each level permits as far as it is run; searched only where the planned speed fails."""
    shape = (*cant_mm.shape[:2], line.classes)
    held: BoolArray = np.ones(shape, dtype=np.bool_)
    for terms in speed_terms(Asked(line, line.planned_kmh, exceptional)):
        held &= terms.kept(cant_mm)
    wanted = line.runs & (allowed[:, :, None] & ~held).any(axis=0)
    return Permitted(_searched(line, cant_mm, wanted, exceptional), held)


def _searched(line: Line, cant_mm: FloatArray, wanted: BoolArray, exceptional: bool) -> FloatArray:
    """Search how fast some classes on some curves may run at all levels [km/h]: inf elsewhere."""
    up_to = np.full((*cant_mm.shape[:2], line.classes), np.inf)
    if not wanted.any():
        return up_to
    first, steps = first_of_kind(line), speed_steps(line)
    enough = next_multiple(np.nan_to_num(line.planned_kmh), steps)[wanted].max()
    asked = np.zeros_like(wanted)
    curve, column = np.nonzero(wanted)
    asked[curve, first[curve, column]] = True
    curve, column = np.nonzero(asked)
    found = permitted_alone(
        line.unfold(curve, column), cant_mm[:, curve], steps[curve, column][:, None], exceptional, enough
    )
    up_to[:, curve, column] = found.up_to_kmh[:, :, 0]
    curve, column = np.nonzero(wanted)
    up_to[:, curve, column] = up_to[:, curve, first[curve, column]]
    return up_to


def searched_below_planned(line: Line, nodes: Nodes, exceptional: bool) -> Permitted:
    """Give what the nodes permit also below a planned speed that is permissible.

    For curves in chains: a transition may forbid the planned speed, and what the curve permits then counts.
    """
    cant = np.where(nodes.allowed, nodes.cant_mm, 0.0)[:, :, None]
    return Permitted(_searched(line.with_bands(), cant, line.runs, exceptional), nodes.alone.planned)


def _least_bad(line: Line, cant_mm: FloatArray, known: BoolArray, exceptional: bool) -> IntArray:
    """Give the level that a curve takes where none keeps what no lower speed can mend, shape (n,).

    Smallest overrun of ``at most``, then of ``at least``, then the smallest sum of overruns of the others,
    then the lower cant.
    """
    most, least, others = (np.zeros(known.shape) for _ in range(3))
    for terms in hard_terms(Asked(line, line.planned_kmh, exceptional)):
        if terms.rule is AT_LEAST:
            value, limit = -terms.value(cant_mm), -terms.limit.value
            with np.errstate(invalid="ignore"):
                short = limit - value
            over = np.where(limit > 0, short / np.where(limit > 0, limit, 1.0), LIMIT_OF_NOTHING + short)
        else:
            over = overrun(terms.value(cant_mm), terms.limit.value)
        worst = np.where(terms.kept(cant_mm), 0.0, over).max(axis=-1)
        if terms.rule is AT_MOST:
            most = most + worst
        elif terms.rule is AT_LEAST:
            least = least + worst
        else:
            others = others + worst
    chosen, _ = first_best((most, least, others), known, axis=0)
    return chosen


def best_alone(nodes: Nodes) -> IntArray:
    """Give the best level of each curve that shares no transition, shape (n,)."""
    chosen, _ = first_best((nodes.count, nodes.overrun, nodes.square), nodes.cheapest, axis=0)
    return chosen
