"""Where curves meet: shared transitions, chains of them, and what else is known about the ends of curves.

How that follows from chainages and lengths stands in :mod:`cant.planning.chainages`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field, replace

import numpy as np
import numpy.typing as npt

from cant.model.plan import Finding

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

BEFORE, AFTER = 0, 1
"""The two ends of a curve: towards the smaller and the greater chainage."""

Remark = Callable[[], Iterable[Finding]]
"""Findings that are put into words when somebody asks for them: a register has thousands."""


@dataclass
class Pairs:
    """Shared transitions, ordered along the line; all arrays of shape (m,).

    Attributes
    ----------
    first, second : ndarray of int
        Indices of the two curves, ``first`` at the smaller chainage.
    length_m : ndarray
        Length of the transition [m], 0 where the arcs touch.
    ramp_m : ndarray
        Length of the cant ramp [m]; nan where there is none and the signed cants are equal.
    factor : ndarray
        Peak over mean gradient of its shape [-], the larger of the two curves'.
    """

    first: IntArray
    second: IntArray
    length_m: FloatArray
    ramp_m: FloatArray
    factor: FloatArray

    @property
    def equal_cants(self) -> BoolArray:
        """Whether the two signed cants must be equal: length 0 and no ramp stated."""
        return np.isnan(self.ramp_m)

    def __len__(self) -> int:
        return len(self.first)

    def take(self, indices: npt.ArrayLike) -> Pairs:
        """Give some of the pairs."""
        at = np.asarray(indices, dtype=np.int64)
        return Pairs(self.first[at], self.second[at], self.length_m[at], self.ramp_m[at], self.factor[at])

    def after(self, n: int) -> IntArray:
        """Give for each of n curves the position of the pair that it begins, -1 where none, shape (n,)."""
        position = np.full(n, -1, dtype=np.int64)
        position[self.first] = np.arange(len(self))
        return position

    def among(self, curves: IntArray) -> Pairs:
        """Give the pairs among some curves, the curves numbered by their position among them."""
        order = np.argsort(curves)
        inside = np.flatnonzero(np.isin(self.first, curves) & np.isin(self.second, curves))
        chosen = self.take(inside)
        chosen.first = order[np.searchsorted(curves[order], chosen.first)]
        chosen.second = order[np.searchsorted(curves[order], chosen.second)]
        return chosen

    def beside(self, curves: IntArray) -> IntArray:
        """Give some curves and then those that share a transition with one of them."""
        others = np.concatenate(
            [self.second[np.isin(self.first, curves)], self.first[np.isin(self.second, curves)]]
        )
        return np.concatenate([curves, np.setdiff1d(others, curves)])


@dataclass
class Neighbourhood:
    """How the curves of a list lie to each other.

    Attributes
    ----------
    transition_m : ndarray, shape (2, n)
        Length of the transition to a straight at each end [m]; nan: not known, or shared.
    ramp_m : ndarray, shape (2, n)
        Length of the cant ramp to a straight [m] over which gradient and rate of cant hold; nan: no check.
    stated_ramp_m : ndarray, shape (2, n)
        Length of the cant ramp as the list states it [m]; nan where it states none.
    ramp_room_m : ndarray, shape (2, n)
        Where the ramp lies on the straight for want of a transition: the room there is [m]; nan elsewhere.
    on_straight : ndarray of bool, shape (2, n)
        Length 0 at a straight: the cant ramp lies on the straight.
    shared : ndarray of bool, shape (2, n)
        The end is a shared transition that is planned as such.
    order : ndarray of int
        Curves with known chainage, by line, track and chainage.
    pairs : Pairs
    descending : ndarray of bool, shape (n,)
        The line and track is listed against the chainage: its transition "in" is at the greater one.
    contradictory : ndarray of bool, shape (n,)
        Chainages contradict each other: not to be assessed.
    weight_length_m : ndarray, shape (n,)
        Length, else from the chainages, else 100 m.
    track : ndarray of int, shape (n,)
        Number of the line and track on which each curve lies.
    remarks : list of callable
        What there is to be said about the data.
    """

    transition_m: FloatArray
    ramp_m: FloatArray
    stated_ramp_m: FloatArray
    ramp_room_m: FloatArray
    on_straight: BoolArray
    shared: BoolArray
    order: IntArray
    pairs: Pairs
    descending: BoolArray
    contradictory: BoolArray
    weight_length_m: FloatArray
    track: IntArray
    remarks: list[Remark] = field(default_factory=list)


def forget(neighbourhood: Neighbourhood, dropped: BoolArray) -> Neighbourhood:
    """Plan without some curves: what they share with others is then a transition that is not known.

    A cant ramp that the list states there is still checked, as it is beside any transition not known.
    """
    pairs = neighbourhood.pairs
    keep = ~(dropped[pairs.first] | dropped[pairs.second])
    shared = np.zeros_like(neighbourhood.shared)
    kept = pairs.take(np.flatnonzero(keep))
    shared[AFTER, kept.first] = True
    shared[BEFORE, kept.second] = True
    lost = neighbourhood.shared & ~shared
    ramp = np.where(lost, neighbourhood.stated_ramp_m, neighbourhood.ramp_m)
    return replace(neighbourhood, ramp_m=ramp, shared=shared, pairs=kept)


@dataclass
class Chains:
    """The curves that share transitions, chain after chain, each in order of chainage.

    Attributes
    ----------
    members : ndarray of int, shape (c,)
        Curves; those that share no transition are left out.
    begin : ndarray of int, shape (q,)
        Where each chain begins among them.
    """

    members: IntArray
    begin: IntArray

    @classmethod
    def of(cls, pairs: Pairs) -> Chains:
        """Find the chains that shared transitions, ordered along the line, make."""
        starts = np.ones(len(pairs), dtype=np.bool_)
        starts[1:] = pairs.first[1:] != pairs.second[:-1]
        # Every pair adds its second curve, and one that begins a chain its first curve before.
        place = np.arange(len(pairs)) + np.cumsum(starts)
        members = np.empty(len(pairs) + int(starts.sum()), dtype=np.int64)
        members[place] = pairs.second
        members[place[starts] - 1] = pairs.first[starts]
        return cls(members, place[starts] - 1)

    def __len__(self) -> int:
        return len(self.begin)

    def any(self, curves: BoolArray) -> BoolArray:
        """Tell which chains have a member among curves marked in an array (n,), shape (q,)."""
        if not len(self):
            return np.zeros(0, dtype=np.bool_)
        return np.asarray(np.logical_or.reduceat(curves[self.members], self.begin))

    def take(self, wanted: BoolArray) -> list[IntArray]:
        """Give the curves of some chains, marked in an array (q,), each as an array of its own."""
        ends = np.append(self.begin[1:], len(self.members))
        return [
            self.members[begin:end]
            for begin, end in zip(self.begin[wanted].tolist(), ends[wanted].tolist(), strict=True)
        ]


def chains_of(pairs: Pairs) -> list[IntArray]:
    """Give all chains, the curves of each in order of chainage; lone curves are left out."""
    chains = Chains.of(pairs)
    return chains.take(np.ones(len(chains), dtype=np.bool_))
