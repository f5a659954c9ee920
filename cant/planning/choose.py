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

import numpy as np
import numpy.typing as npt

from cant.planning.assess import shared_hard_kept
from cant.planning.bounds import normal_bounds
from cant.planning.give_way import search_chains
from cant.planning.grid import Grid
from cant.planning.line import Line
from cant.planning.neighbours import Chains, Pairs
from cant.planning.nodes import Nodes, best_alone, node_blocks
from cant.planning.normal_chains import settle_within_normal
from cant.planning.shared import Meeting, SharedAsked, shared_values
from cant.planning.targets import Target
from cant.planning.unslowed import settle_unslowed

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

SEARCHED_TOGETHER = 80
"""Chains searched together: keeps the arrays of a search within the processor's cache."""


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
    bounds = normal_bounds(line)
    wanted = target(line, line.planned_kmh)[:, 0]
    cant = grid.nearest(wanted, bounds.low_mm, bounds.high_mm)
    cant[~bounds.kept | (grid.fixed_mm < 0) | ~planned] = np.nan
    chains = Chains.of(pairs)
    stands = ~np.isnan(cant)
    unsettled = chains.any(_clashes(line, pairs, cant))
    hopeless = chains.any(~stands)
    possible = chains.take(unsettled & ~hopeless)
    settled, left = settle_within_normal(line, grid, pairs, possible, (bounds.low_mm, bounds.high_mm), wanted)
    cant = np.where(np.isnan(settled), cant, settled)
    left = chains.take(unsettled & hopeless) + left
    not_compliant = np.zeros(len(line), dtype=np.bool_)
    by_itself = planned & ~stands
    by_itself[chains.members] = False
    lone = np.flatnonzero(by_itself)
    for at, nodes in node_blocks(line.take(lone), grid.take(lone), target, exceptional):
        cant[lone[at]] = nodes.cant_mm[best_alone(nodes), np.arange(len(at))]
        not_compliant[lone[at]] = nodes.not_compliant
    members = np.concatenate(left) if left else np.zeros(0, dtype=np.int64)
    if left:
        part = line.take(members).with_bands()
        cant[members], not_compliant[members] = _plan_chains(
            part, grid.take(members), pairs.among(members), _renumbered(left), target, exceptional
        )
    settled_at_once = np.ones(len(line), dtype=np.bool_)
    settled_at_once[lone] = False
    settled_at_once[members] = False
    return Choice(cant, not_compliant, settled_at_once)


def _plan_chains(
    line: Line, grid: Grid, pairs: Pairs, chains: list[IntArray], target: Target, exceptional: bool
) -> tuple[FloatArray, BoolArray]:
    """Plan the chains that no closed form settles.

    Returns
    -------
    cant_mm : ndarray, shape (n,)
    not_compliant : ndarray of bool, shape (n,)
        By the curve alone, or because of a transition that cannot be kept.
    """
    nodes = Nodes.join([nodes for _, nodes in node_blocks(line, grid, target, exceptional)])
    cant, left = settle_unslowed(line, pairs, nodes, chains, exceptional)
    not_compliant = nodes.not_compliant.copy()
    for some in _batches(left):
        curves, best = search_chains(line, pairs, nodes, some, target, exceptional, also_broken=False)
        cant[curves] = best
    hopeless = [chain for chain in left if np.isnan(cant[chain]).any()]
    for some in _batches(hopeless):
        curves, best = search_chains(line, pairs, nodes, some, target, exceptional, also_broken=True)
        cant[curves] = best
    not_compliant |= _beside_broken(line, pairs, cant, hopeless, exceptional)
    return cant, not_compliant


def _batches(chains: Sequence[IntArray]) -> Iterator[Sequence[IntArray]]:
    for begin in range(0, len(chains), SEARCHED_TOGETHER):
        yield chains[begin : begin + SEARCHED_TOGETHER]


def _renumbered(chains: Sequence[IntArray]) -> list[IntArray]:
    """Give the chains with their curves numbered by the place when all are put in a row."""
    ends = np.cumsum([len(chain) for chain in chains])
    return [np.arange(end - len(chain), end) for chain, end in zip(chains, ends, strict=True)]


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
