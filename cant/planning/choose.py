"""The choice of cants for a whole line, from what is cheap to settle to what is not.

1. Where a cant within all normal limits at planned speeds exists, the nearest to the target is best: no
   time lost, no approval. That is a closed form for all curves at once, and for each chain whose members'
   best cants agree over its transitions.
2. Chains whose members have such cants, but others than their nearest: a shortest path through those
   (:mod:`cant.planning.normal_chains`).
3. Curves by themselves that are left: every level that they may take is weighed
   (:mod:`cant.planning.nodes`).
4. Chains that are left, their levels weighed alike: a shortest path over the cants that cost each curve as
   little time as it can have, where the transitions allow one (:mod:`cant.planning.unslowed`); else the
   search over all levels (:mod:`cant.planning.give_way`), which alone would settle every chain.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby, pairwise

import numpy as np
import numpy.typing as npt

from cant.planning.assess import shared_hard_kept
from cant.planning.bounds import normal_bounds
from cant.planning.give_way import search_chains
from cant.planning.grid import Grid
from cant.planning.line import Line
from cant.planning.neighbours import Chains, Pairs
from cant.planning.nodes import best_alone, make_nodes
from cant.planning.normal_chains import settle_within_normal
from cant.planning.shared import Meeting, SharedAsked, shared_values
from cant.planning.targets import Target
from cant.planning.unslowed import settle_unslowed

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

WEIGHED_TOGETHER = 2000
"""Curves whose levels are weighed together, about: few enough for the processor's cache, many enough that
the work on the arrays outweighs that of starting it."""
SEARCHED_TOGETHER = 200
"""Transitions of chains searched together, about, for the same reason."""


@dataclass
class Choice:
    """The cants chosen; arrays of shape (n,).

    Attributes
    ----------
    cant_mm : ndarray
        nan where the curve is not planned.
    not_compliant : ndarray of bool
        The curve, or a transition of it, does not keep what no lower speed can mend.
    within_normal : ndarray of bool
        The curve and its transitions keep every normal limit at planned speeds: no time lost, nothing passed.
    """

    cant_mm: FloatArray
    not_compliant: BoolArray
    within_normal: BoolArray


def choose(
    line: Line, grid: Grid, pairs: Pairs, planned: BoolArray, target: Target, exceptional: bool
) -> Choice:
    """Choose the cants of a line.

    Parameters
    ----------
    line : Line
        n curves.
    grid : Grid
    pairs : Pairs
        Shared transitions between planned curves.
    planned : ndarray of bool, shape (n,)
        Curves to plan.
    target : Target
        The method.
    exceptional : bool
        Last tier allowed.

    Returns
    -------
    Choice
    """
    cant, chains = _within_normal(line, grid, pairs, planned, target)
    unsettled = planned & np.isnan(cant)
    alone = unsettled.copy()
    for chain in chains:
        alone[chain] = False
    not_compliant = np.zeros(len(line), dtype=np.bool_)

    def weigh(part: _Part) -> tuple[FloatArray, BoolArray]:
        some = line.take(part.curves).with_bands(), grid.take(part.curves)
        if not part.chains:
            return _weigh_alone(*some, target, exceptional)
        among = pairs.among(part.curves)
        return _plan_chains(*some, among, part.chains, target, exceptional, part.also_broken)

    def settle(parts: list[_Part]) -> None:
        for part in parts:
            cant[part.curves], not_compliant[part.curves] = weigh(part)

    settle(_parts(chains) + _parts(list(np.flatnonzero(alone)[:, None])))
    settle(_parts([chain for chain in chains if np.isnan(cant[chain]).any()], also_broken=True))
    return Choice(cant, not_compliant, ~unsettled)


def _within_normal(
    line: Line, grid: Grid, pairs: Pairs, planned: BoolArray, target: Target
) -> tuple[FloatArray, list[IntArray]]:
    """Settle what has cants within all normal limits at planned speeds.

    Returns
    -------
    cant_mm : ndarray, shape (n,)
        nan where not settled.
    left : list of ndarray of int
        The chains of which it is so.
    """
    bounds = normal_bounds(line)
    wanted = target(line, line.planned_kmh)[:, 0]
    cant = grid.nearest(wanted, bounds.low_mm, bounds.high_mm)
    cant[~bounds.kept | (grid.fixed_mm < 0) | ~planned] = np.nan
    chains = Chains.of(pairs)
    clashing, hopeless = chains.any(_clashes(line, pairs, cant)), chains.any(np.isnan(cant))
    possible = chains.take(clashing & ~hopeless)
    settled, left = settle_within_normal(line, grid, pairs, possible, (bounds.low_mm, bounds.high_mm), wanted)
    left = chains.take(clashing & hopeless) + left
    cant = np.where(np.isnan(settled), cant, settled)
    for chain in left:
        cant[chain] = np.nan
    return cant, left


@dataclass
class _Part:
    """Curves to be weighed together: whole chains one after the other, or curves by themselves.

    ``chains`` are numbered by the place of their curves among these; none for curves by themselves.
    """

    curves: IntArray
    chains: list[IntArray]
    also_broken: bool


def _parts(chains: Sequence[IntArray], also_broken: bool = False) -> list[_Part]:
    """Cut chains, or curves by themselves as chains of one, into parts; those of one length side by side."""
    parts = []
    ordered = sorted(chains, key=len)
    ends = np.cumsum([len(chain) for chain in ordered])
    numbers = ends // WEIGHED_TOGETHER
    for begin, end in pairwise([0, *(np.flatnonzero(np.diff(numbers)) + 1).tolist(), len(ordered)]):
        some = ordered[begin:end]
        if some:
            parts.append(
                _Part(np.concatenate(some), _numbered(some) if len(some[-1]) > 1 else [], also_broken)
            )
    return parts


def _numbered(chains: Sequence[IntArray]) -> list[IntArray]:
    """Give the chains with their curves numbered by the place when all are put in a row."""
    ends = np.cumsum([len(chain) for chain in chains]).tolist()
    return [np.arange(end - len(chain), end) for chain, end in zip(chains, ends, strict=True)]


def _weigh_alone(line: Line, grid: Grid, target: Target, exceptional: bool) -> tuple[FloatArray, BoolArray]:
    """Choose the cants of curves that share no transition; which curves are not compliant."""
    nodes = make_nodes(line, grid, target, exceptional)
    return nodes.cant_mm[best_alone(nodes), np.arange(len(line))], nodes.not_compliant


def _plan_chains(
    line: Line,
    grid: Grid,
    pairs: Pairs,
    chains: list[IntArray],
    target: Target,
    exceptional: bool,
    also_broken: bool,
) -> tuple[FloatArray, BoolArray]:
    """Plan chains that no closed form settles.

    Returns
    -------
    cant_mm : ndarray, shape (n,)
        nan on a chain that cannot keep what no lower speed can mend, unless such ways are wanted.
    not_compliant : ndarray of bool, shape (n,)
        By the curve alone, or because of a transition that cannot be kept.
    """
    nodes = make_nodes(line, grid, target, exceptional)
    cant, left = np.full(len(line), np.nan), list(chains)
    if not also_broken:
        cant, left = settle_unslowed(line, pairs, nodes, chains, exceptional)
    for some in _batches(left):
        curves, best = search_chains(line, pairs, nodes, some, target, exceptional, also_broken)
        cant[curves] = best
    not_compliant = nodes.not_compliant
    if also_broken:
        not_compliant = not_compliant | _beside_broken(line, pairs, cant, chains, exceptional)
    return cant, not_compliant


def _batches(chains: Sequence[IntArray]) -> Iterator[Sequence[IntArray]]:
    """Yield batches of chains of one length, of much the same size: a small one costs nearly as much."""
    for length, some in groupby(sorted(chains, key=len), key=len):
        alike = list(some)
        count = min(max(round(len(alike) * (length - 1) / SEARCHED_TOGETHER), 1), len(alike))
        for i in range(count):
            yield alike[len(alike) * i // count : len(alike) * (i + 1) // count]


def _beside_broken(
    line: Line, pairs: Pairs, cant_mm: FloatArray, chains: Sequence[IntArray], exceptional: bool
) -> BoolArray:
    """Mark the bound curves at transitions that are not kept; both where neither is bound."""
    marked = np.zeros(len(line), dtype=np.bool_)
    if not chains:
        return marked
    bound = (np.isfinite(line.at_most_mm) | np.isfinite(line.at_least_mm) | line.fixed)[:, 0]
    begins = np.concatenate([chain[:-1] for chain in chains])
    meeting = Meeting.of(line, pairs.take(pairs.after(len(line))[begins]))
    kept, _ = shared_hard_kept(meeting, (cant_mm[begins, None], cant_mm[begins + 1, None]), exceptional)
    for i in begins[~kept]:
        both = bound[i : i + 2]
        marked[i : i + 2] |= both if both.any() else True
    return marked


def _clashes(line: Line, pairs: Pairs, cant_mm: FloatArray) -> BoolArray:
    """Mark curves whose best cant by itself does not stand beside that of the next curve, shape (n,)."""
    clashes = np.zeros(len(line), dtype=np.bool_)
    if len(pairs):
        meeting = Meeting.of(line, pairs)
        cants = (cant_mm[pairs.first], cant_mm[pairs.second])
        good = ~np.isnan(cants[0] + cants[1])
        filled = (np.nan_to_num(cants[0])[:, None], np.nan_to_num(cants[1])[:, None])
        for found in shared_values(SharedAsked(meeting, meeting.planned_kmh, False), *filled):
            good &= found.kept().all(axis=-1)
        clashes[pairs.first] = ~good
    return clashes
