"""Every cant of the grid on some curves, each curve by itself: what it costs in time, approvals and target.

Made only for the curves that a closed form does not settle.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import (
    LIMIT_OF_NOTHING,
    hard_kept,
    overrun,
    passed_alone,
    time_lost,
    trains_stopped,
)
from cant.planning.grid import Grid
from cant.planning.lexicographic import first_best, slack
from cant.planning.line import Line
from cant.planning.permissible import Permitted, permitted_alone, speed_steps
from cant.planning.rules import AT_LEAST, AT_MOST, Asked, hard_terms, speed_terms
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

BLOCK = 128
"""Curves evaluated together: keeps the arrays of a block within the processor's cache."""


@dataclass
class Nodes:
    """All levels of some curves: arrays (levels, n), those of a class (levels, n, k).

    Attributes
    ----------
    cant_mm : ndarray
        Levels, ascending; nan where a curve has fewer.
    allowed : ndarray of bool
        Keeps what no lower speed can mend; for a curve that is not compliant only the level it must take.
    alone : Permitted
        What the curve by itself permits.
    run_kmh : ndarray
        Speeds run as far as the curve by itself decides.
    stopped, lost_s, count, overrun, square : ndarray
        Measures 1 to 4 at those speeds; a class that may not run at all is measured apart in ``stopped``.
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


def make_nodes(line: Line, grid: Grid, target: Target, exceptional: bool, complete: bool) -> Nodes:
    """Evaluate every level of every curve of a (small) line.

    ``complete``: also what holds below a planned speed that is permissible, for curves in chains.
    """
    line = line.with_bands()
    levels = grid.levels()
    known = ~np.isnan(levels)
    cant = np.where(known, levels, 0.0)[:, :, None]
    allowed = known & hard_kept(line, cant, exceptional)
    not_compliant: BoolArray = np.asarray(~allowed.any(axis=0))
    if not_compliant.any():
        bad = np.flatnonzero(not_compliant)
        allowed[:, bad] = _least_bad(line.take(bad), cant[:, bad], known[:, bad], exceptional)
    alone = _alone(line, cant, allowed, exceptional, complete)
    run = np.where(line.runs, alone.run_speed(line.planned_kmh), np.nan)
    nodes = Nodes(
        cant_mm=levels,
        allowed=allowed,
        alone=alone,
        run_kmh=run,
        stopped=trains_stopped(line, run),
        lost_s=time_lost(line, run),
        count=np.full(levels.shape, np.inf),
        overrun=np.full(levels.shape, np.inf),
        square=squares(line, cant, run, target),
        not_compliant=not_compliant,
    )
    # Approvals count among the levels that lose least time: no others can be chosen for their sake.
    level, curve = np.nonzero(nodes.cheapest)
    passed = passed_alone(line.take(curve), cant[level, curve], run[level, curve])
    nodes.count[level, curve], nodes.overrun[level, curve] = passed.count, passed.total
    return nodes


def _alone(
    line: Line, cant_mm: FloatArray, allowed: BoolArray, exceptional: bool, complete: bool
) -> Permitted:
    """Give what each level permits as far as it is run; searched only where the planned speed fails.

    ``complete``: searched everywhere, for curves whose transitions may forbid the planned speed.
    """
    shape = (*cant_mm.shape[:2], line.classes)
    held: BoolArray = np.ones(shape, dtype=np.bool_)
    for terms in speed_terms(Asked(line, line.planned_kmh, exceptional)):
        held &= terms.kept(cant_mm)
    wanted = line.runs if complete else line.runs & (allowed[:, :, None] & ~held).any(axis=0)
    up_to = np.full(shape, np.inf)
    curve, column = np.nonzero(wanted)
    if len(curve):
        steps = speed_steps(line)[curve, column][:, None]
        found = permitted_alone(
            line.unfold(curve, column), cant_mm[:, curve], steps, exceptional, as_run=True
        )
        up_to[:, curve, column] = found.up_to_kmh[:, :, 0]
    return Permitted(up_to, held)


def node_blocks(
    line: Line, grid: Grid, target: Target, exceptional: bool, complete: bool
) -> Iterator[tuple[IntArray, Nodes]]:
    """Yield the nodes of a long line block by block, each with the positions of its curves."""
    for begin in range(0, len(line), BLOCK):
        at = np.arange(begin, min(begin + BLOCK, len(line)))
        yield at, make_nodes(line.take(at), grid.take(at), target, exceptional, complete)


def _least_bad(line: Line, cant_mm: FloatArray, known: BoolArray, exceptional: bool) -> BoolArray:
    """Mark the level that a curve takes where none keeps what no lower speed can mend, (levels, n).

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
    marked = np.zeros(known.shape, dtype=np.bool_)
    marked[chosen, np.arange(known.shape[1])] = True
    return marked


def best_alone(nodes: Nodes) -> IntArray:
    """Give the best level of each curve that shares no transition, shape (n,)."""
    chosen, _ = first_best((nodes.count, nodes.overrun, nodes.square), nodes.cheapest, axis=0)
    return chosen
