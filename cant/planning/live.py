"""One curve of a plan at any cant, what it shares transitions with left as it is: what a slider shows.

No evaluation of its own: the curve is copied once for each cant, with the neighbours that share its
transitions beside every copy, and the copies are a small line whose records the plan's own arrays and rules
make.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from cant.planning.assess import assess, hard_kept, shared_hard_kept
from cant.planning.grid import LARGEST_CANT_MM
from cant.planning.line import Line
from cant.planning.neighbours import Neighbourhood, Pairs
from cant.planning.plan import Plan
from cant.planning.shared import Meeting

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_SAME_MM = 1e-6


def plan_at(plan: Plan, index: int, cants_mm: npt.ArrayLike) -> tuple[Plan, IntArray]:
    """Give a curve of a plan at other cants, with the neighbours held.

    Parameters
    ----------
    plan : Plan
        The plan as it is.
    index : int
        A curve that is planned.
    cants_mm : array_like, shape (c,)
        Cants [mm].

    Returns
    -------
    plan : Plan
        Of the copies: their records are those of the curve at each cant.
    at : ndarray of int, shape (c,)
        Where in it the curve stands at each cant.

    Raises
    ------
    KeyError
        The curve has no plan.
    """
    outcome = plan.outcome
    if not outcome.planned[index]:
        message = f"curve {index} is not planned"
        raise KeyError(message)
    cants = np.asarray(cants_mm, dtype=np.float64)
    every = outcome.pairs.beside(np.array([index], dtype=np.int64))
    size = len(every)
    at = np.arange(len(cants)) * size
    tiled = np.tile(every, len(cants))
    pairs = _copied(outcome.pairs.among(every), len(cants), size)
    line = outcome.line.take(tiled)
    cant = outcome.cant_mm[tiled]
    cant[at] = cants
    exceptional = outcome.settings.allows_exceptional
    broken = _broken(line, pairs, cant, exceptional)
    as_planned = np.abs(cants - outcome.cant_mm[index]) <= _SAME_MM
    broken[at[as_planned]] = outcome.not_compliant[index]
    copies = replace(
        outcome,
        curves=outcome.curves.take(tiled),
        line=line,
        neighbourhood=_neighbourhood(outcome.neighbourhood, tiled, pairs),
        grid=outcome.grid.take(tiled),
        planned=outcome.planned[tiled],
        cant_mm=cant,
        not_compliant=broken,
        proposed=assess(line, pairs, cant, exceptional),
        remarks=[],
    )
    return Plan(copies), at


def levels_of(plan: Plan, index: int) -> FloatArray:
    """Give the cants of the grid of a curve [mm], ascending, also where one is fixed or held."""
    grid = plan.outcome.grid
    step = float(grid.step_mm[index])
    multiples = np.arange(int(grid.smallest[index]), int(grid.largest[index]) + 1)
    levels = np.concatenate([[0.0], multiples * step])
    return np.asarray(levels[levels <= LARGEST_CANT_MM + _SAME_MM])


def _copied(pairs: Pairs, copies: int, size: int) -> Pairs:
    m = len(pairs)
    copied = pairs.take(np.tile(np.arange(m), copies))
    shift = np.repeat(np.arange(copies) * size, m)
    return replace(copied, first=copied.first + shift, second=copied.second + shift)


def _broken(line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool) -> BoolArray:
    """Tell where a curve, or a transition of it, does not keep what no lower speed can mend."""
    broken = ~hard_kept(line, cant_mm[:, None], exceptional)
    if len(pairs):
        cants = (cant_mm[pairs.first][:, None], cant_mm[pairs.second][:, None])
        kept, _ = shared_hard_kept(Meeting.of(line, pairs), cants, exceptional)
        broken[pairs.first[~kept]] = True
        broken[pairs.second[~kept]] = True
    return broken


def _neighbourhood(whole: Neighbourhood, tiled: IntArray, pairs: Pairs) -> Neighbourhood:
    """Give how the copies lie: each like the curve that it is a copy of, and beside no other copy."""
    return Neighbourhood(
        transition_m=whole.transition_m[:, tiled],
        ramp_m=whole.ramp_m[:, tiled],
        stated_ramp_m=whole.stated_ramp_m[:, tiled],
        ramp_room_m=whole.ramp_room_m[:, tiled],
        on_straight=whole.on_straight[:, tiled],
        shared=whole.shared[:, tiled],
        order=np.zeros(0, dtype=np.int64),
        pairs=pairs,
        descending=whole.descending[tiled],
        contradictory=whole.contradictory[tiled],
        weight_length_m=whole.weight_length_m[tiled],
        track=whole.track[tiled],
    )
