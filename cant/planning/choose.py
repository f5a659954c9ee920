"""The choice of cants for a whole line, from what is cheap to settle to what is not.

1. Where a cant within all normal limits at planned speeds exists, the nearest to the target is best: no
   time lost, no approval. That is a closed form for all curves at once, and for each chain whose members'
   best cants agree over its transitions.
2. Curves by themselves that are left: every level of the grid is weighed.
3. Chains that are left: a shortest path over cants that cost each curve as little time as it can have, where
   the transitions allow such a path; else the full search of :mod:`cant.planning.give_way`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.chain_choice import Stage, shortest_path
from cant.planning.give_way import ChainSearch, Link, Member
from cant.planning.grid import Grid
from cant.planning.lexicographic import slack
from cant.planning.line import Line
from cant.planning.meetings import PairTable, make_pair_table, pair_approvals, unhindered
from cant.planning.neighbours import Pairs, chains_of
from cant.planning.nodes import Nodes, best_alone, node_blocks
from cant.planning.normal_chains import settle_within_normal
from cant.planning.permissible import Permitted
from cant.planning.rules import Asked, curve_terms
from cant.planning.shared import Meeting, SharedAsked, shared_values
from cant.planning.targets import Target

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


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


@dataclass
class Bounds:
    """The bounds on each curve's cant by itself, arrays of shape (n,); see :func:`normal_bounds`."""

    low_mm: FloatArray
    high_mm: FloatArray
    speeds_kept: BoolArray


def normal_bounds(line: Line) -> Bounds:
    """Give the bounds of the curves by themselves at planned speeds and normal values, tolerance included."""
    n = len(line)
    low, high = np.full(n, -np.inf), np.full(n, np.inf)
    kept = np.ones(n, dtype=np.bool_)
    for terms in curve_terms(Asked(line, line.planned_kmh, False)):
        if terms.rule.sense == 0:
            kept &= terms.kept(np.zeros((n, 1))).all(axis=-1)
        elif terms.rule.sense < 0:
            low = np.maximum(low, terms.bound(with_tolerance=True).max(axis=-1))
        else:
            high = np.minimum(high, terms.bound(with_tolerance=True).min(axis=-1))
    return Bounds(low, high, kept)


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
    cant[~bounds.speeds_kept | (grid.fixed_mm < 0) | ~planned] = np.nan
    in_chain = np.zeros(len(line), dtype=np.bool_)
    in_chain[pairs.first] = in_chain[pairs.second] = True
    chains = chains_of(len(line), pairs)
    unsettled = _unsettled_chains(line, pairs, cant, chains)
    possible = [chain for chain in unsettled if not np.isnan(cant[chain]).any()]
    hopeless = [chain for chain in unsettled if np.isnan(cant[chain]).any()]
    settled, left = settle_within_normal(line, grid, pairs, possible, (bounds.low_mm, bounds.high_mm), wanted)
    cant = np.where(np.isnan(settled), cant, settled)
    unsettled = hopeless + left
    not_compliant = np.zeros(len(line), dtype=np.bool_)
    lone = np.flatnonzero(planned & ~in_chain & np.isnan(cant))
    for at, nodes in node_blocks(line.take(lone), grid.take(lone), target, exceptional, complete=False):
        cant[lone[at]] = nodes.cant_mm[best_alone(nodes), np.arange(len(at))]
        not_compliant[lone[at]] = nodes.not_compliant
    if unsettled:
        members = np.concatenate(unsettled)
        search = _Search(line.take(members).with_bands(), pairs.among(members), target, exceptional)
        blocks = node_blocks(line.take(members), grid.take(members), target, exceptional, complete=True)
        for at, nodes in blocks:
            not_compliant[members[at]] = nodes.not_compliant
            search.keep(at, nodes)
        begin = 0
        for chain in unsettled:
            local = np.arange(begin, begin + len(chain))
            cant[chain], broken = search.plan(local)
            not_compliant[chain] |= broken
            begin += len(chain)
    settled_at_once = np.ones(len(line), dtype=np.bool_)
    settled_at_once[lone] = False
    for chain in unsettled:
        settled_at_once[chain] = False
    return Choice(cant, not_compliant, settled_at_once)


def _unsettled_chains(
    line: Line, pairs: Pairs, cant_mm: FloatArray, chains: Sequence[IntArray]
) -> list[IntArray]:
    """Find the chains whose members' best cants by themselves do not stand together."""
    if not chains:
        return []
    meeting = Meeting.of(line, pairs)
    known = ~np.isnan(cant_mm)
    cants = (np.nan_to_num(cant_mm)[pairs.first][:, None], np.nan_to_num(cant_mm)[pairs.second][:, None])
    good = known[pairs.first] & known[pairs.second]
    for found in shared_values(SharedAsked(meeting, meeting.planned_kmh, False), *cants):
        good &= found.kept().all(axis=-1)
    bad_after = np.zeros(len(line), dtype=np.bool_)
    bad_after[pairs.first] = ~good
    return [chain for chain in chains if bad_after[chain].any()]


@dataclass
class _Curve:
    """What the search needs of one curve of an unsettled chain."""

    line: Line
    cant_mm: FloatArray
    alone: Permitted
    run_kmh: FloatArray
    measures: FloatArray
    bound: bool

    def take(self, at: IntArray) -> _Curve:
        """Give some of its levels."""
        return _Curve(
            self.line,
            self.cant_mm[at],
            Permitted(self.alone.up_to_kmh[at], self.alone.planned[at]),
            self.run_kmh[at],
            self.measures[at],
            self.bound,
        )

    @property
    def cheapest(self) -> IntArray:
        """Levels that lose as little time as any, by the curve alone."""
        left = np.ones(len(self.cant_mm), dtype=np.bool_)
        for column in self.measures.T[:2]:
            least = column[left].min()
            left &= column <= least + slack(least)
        return np.flatnonzero(left)


class _Search:
    """The unsettled chains of a line."""

    def __init__(self, line: Line, pairs: Pairs, target: Target, exceptional: bool) -> None:
        self._line = line
        self._pairs = pairs
        self._target = target
        self._exceptional = exceptional
        self._curves: dict[int, _Curve] = {}
        self._pair_after = {int(first): j for j, first in enumerate(pairs.first)}

    def keep(self, curves: IntArray, nodes: Nodes) -> None:
        """Keep what the nodes say of some curves."""
        for j, curve in enumerate(curves):
            level = np.flatnonzero(nodes.allowed[:, j])
            line = self._line.take([curve])
            sited = np.isfinite(line.at_most_mm) | np.isfinite(line.at_least_mm) | line.fixed
            self._curves[int(curve)] = _Curve(
                line=line,
                cant_mm=nodes.cant_mm[level, j],
                alone=Permitted(nodes.alone.up_to_kmh[level, j], nodes.alone.planned[level, j]),
                run_kmh=nodes.run_kmh[level, j],
                measures=np.stack(
                    [
                        measure[level, j]
                        for measure in (
                            nodes.stopped,
                            nodes.lost_s,
                            nodes.count,
                            nodes.overrun,
                            nodes.square,
                            nodes.cant_mm,
                        )
                    ],
                    axis=-1,
                ),
                bound=bool(sited.any()),
            )

    def plan(self, chain: IntArray) -> tuple[FloatArray, BoolArray]:
        """Give the best cants of a chain [mm], and which curves are not compliant because of a transition."""
        curves = [self._curves[int(i)] for i in chain]
        meetings = [Meeting.of(self._line, self._pairs.take([self._pair_after[int(i)]])) for i in chain[:-1]]
        cheap = [curve.take(curve.cheapest) for curve in curves]
        level = self._without_giving_way(cheap, meetings)
        if level is not None:
            cants = np.array([curve.cant_mm[i] for curve, i in zip(cheap, level, strict=True)])
            return cants, np.zeros(len(chain), dtype=np.bool_)
        links = [
            Link(meeting, self._table(meeting, before, after))
            for meeting, before, after in zip(meetings, curves[:-1], curves[1:], strict=True)
        ]
        members = [Member(curve.line, curve.cant_mm, curve.alone) for curve in curves]
        level = ChainSearch(members, links, self._target).best()
        cants = np.array([curve.cant_mm[i] for curve, i in zip(curves, level, strict=True)])
        return cants, _broken_curves(curves, links, level)

    def _table(self, meeting: Meeting, before: _Curve, after: _Curve) -> PairTable:
        return make_pair_table(
            meeting, before.cant_mm, after.cant_mm, (before.alone, after.alone), self._exceptional
        )

    def _without_giving_way(self, curves: list[_Curve], meetings: list[Meeting]) -> list[int] | None:
        """Find the best path on which no transition costs time: None where there is none."""
        stages = []
        for i, curve in enumerate(curves):
            measures = list(curve.measures.T)
            if i == len(meetings):
                stages.append(Stage(measures))
                continue
            after = curves[i + 1]
            free = unhindered(
                meetings[i], curve.cant_mm, after.cant_mm, (curve.alone, after.alone), self._exceptional
            )
            count, over = pair_approvals(
                meetings[i], curve.cant_mm, after.cant_mm, curve.run_kmh, after.run_kmh
            )
            none = np.zeros(free.shape)
            stages.append(Stage(measures, free, [none, none, count, over, none, none]))
        return shortest_path(stages)


def _broken_curves(curves: list[_Curve], links: list[Link], level: list[int]) -> BoolArray:
    """Mark the bound curves at transitions that cannot be kept; both where neither is bound."""
    marked = np.zeros(len(curves), dtype=np.bool_)
    for i, link in enumerate(links):
        if not link.table.hard[level[i], level[i + 1]]:
            bound = [curves[i].bound, curves[i + 1].bound]
            marked[[i, i + 1]] |= np.array(bound if any(bound) else [True, True])
    return marked
