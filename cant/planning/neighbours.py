"""Where curves meet: order along each line and track, shared transitions, overlaps, room for ramps.

Works on chainages and lengths alone; knows nothing of traffic, limits or cant.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from cant.model.curves import HAND_UNKNOWN, SHAPES, CurveList
from cant.model.plan import Finding

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

BEFORE, AFTER = 0, 1
"""The two ends of a curve: towards the smaller and the greater chainage."""

REACH_M = 0.5
"""Chainages closer than this [m] are the same point, as far as a list can tell."""
DISAGREEMENT_M = 1.0
"""Lengths that differ by more than this [m] are worth a finding."""
DISAGREEMENT_RATIO = 0.01
DEFAULT_WEIGHT_LENGTH_M = 100.0
_MICRON = 1e-6


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
    findings : list of Finding
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
    findings: list[Finding] = field(default_factory=list)


@dataclass
class _Ends:
    """The list's lengths turned so that end 0 is at the smaller chainage, also where the list descends."""

    low_km: FloatArray
    high_km: FloatArray
    transition_m: FloatArray
    ramp_m: FloatArray


def _turn(curves: CurveList, descending: BoolArray) -> _Ends:
    transition = np.stack([curves.transition_in_m, curves.transition_out_m])
    ramp = np.stack([curves.ramp_in_m, curves.ramp_out_m])
    ramp = np.where(ramp > 0, ramp, np.nan)
    return _Ends(
        low_km=np.where(descending, curves.end_km, curves.start_km),
        high_km=np.where(descending, curves.start_km, curves.end_km),
        transition_m=np.where(descending, transition[::-1], transition),
        ramp_m=np.where(descending, ramp[::-1], ramp),
    )


def _codes(curves: CurveList) -> IntArray:
    """Give each curve the number of its line and track."""
    known: dict[tuple[str, str], int] = {}
    return np.array(
        [known.setdefault(key, len(known)) for key in zip(curves.line, curves.track, strict=True)],
        dtype=np.int64,
    )


def _descending(curves: CurveList, codes: IntArray) -> BoolArray:
    """Tell for each curve whether its line and track is listed against the chainage."""
    groups = int(codes.max(initial=-1)) + 1
    up = np.bincount(codes, weights=curves.start_km < curves.end_km, minlength=groups)
    down = np.bincount(codes, weights=curves.start_km > curves.end_km, minlength=groups)
    return (down > up)[codes] if groups else np.zeros(0, dtype=np.bool_)


def weight_lengths(curves: CurveList) -> FloatArray:
    """Give the lengths that weigh curves against each other [m]: stated, else from chainages, else 100 m."""
    from_chainage = np.abs(curves.end_km - curves.start_km) * 1000.0
    length = np.where(np.isnan(curves.length_m), from_chainage, curves.length_m)
    return np.where(np.isnan(length), DEFAULT_WEIGHT_LENGTH_M, length)


def find_neighbours(curves: CurveList) -> Neighbourhood:
    """Find out how curves meet.

    Parameters
    ----------
    curves : CurveList
        Rejected rows too: a curve beside one must not be taken to run to a straight.

    Returns
    -------
    Neighbourhood
        ``pairs`` holds only transitions between two rows that are neither rejected nor contradictory; drop
        more of them with :func:`forget`.
    """
    n = len(curves)
    codes = _codes(curves)
    descending = _descending(curves, codes)
    ends = _turn(curves, descending)
    findings = _length_findings(curves)
    contradictory = np.where(descending, curves.start_km < curves.end_km, curves.start_km > curves.end_km)
    findings += [
        Finding("chainage-against-list", "stop", "Start and End run against the rest of the list.", int(i))
        for i in np.flatnonzero(contradictory & ~curves.rejected)
    ]

    position = np.where(np.isnan(ends.low_km), ends.high_km, ends.low_km)
    placed = np.flatnonzero(~np.isnan(position))
    order = placed[np.lexsort((placed, position[placed], codes[placed]))]
    first, second = order[:-1], order[1:]
    same = codes[first] == codes[second]
    first, second = first[same], second[same]
    distance = np.round((ends.low_km[second] - ends.high_km[first]) * 1000.0 / _MICRON) * _MICRON

    near = np.nan_to_num(ends.transition_m[AFTER, first])
    far = np.nan_to_num(ends.transition_m[BEFORE, second])
    larger = np.maximum(near, far)
    clash = distance < -REACH_M - _MICRON
    shares = ~clash & (distance <= larger + REACH_M + _MICRON)
    overlaps = ~clash & ~shares & (distance < near + far - _MICRON)

    contradictory[first[clash]] = True
    contradictory[second[clash]] = True
    for a, b, d in zip(first[clash], second[clash], distance[clash], strict=True):
        text = (
            f"The arcs of {curves.curve[a]} and {curves.curve[b]} overlap by {-d:.1f} m: "
            "one of the chainages is wrong."
        )
        findings += [Finding("arcs-overlap", "stop", text, int(i)) for i in (a, b)]

    transition = ends.transition_m.copy()
    for a, b, d in zip(first[overlaps], second[overlaps], distance[overlaps], strict=True):
        text = (
            f"The transitions between {curves.curve[a]} and {curves.curve[b]} need "
            f"{near_far(ends, a, b):.1f} m, the arcs are {d:.1f} m apart: each is taken as {d / 2:.1f} m."
        )
        findings += [Finding("transitions-overlap", "warning", text, int(i)) for i in (a, b)]
        transition[AFTER, a] = transition[BEFORE, b] = d / 2

    shared = np.zeros((2, n), dtype=np.bool_)
    shared[AFTER, first[shares]] = True
    shared[BEFORE, second[shares]] = True
    on_straight = (transition == 0) & ~shared
    room = _room_on_straight(n, first, second, distance, far, near, clash | shares)
    room = np.where(on_straight, room, np.nan)
    ramp = np.where(np.isnan(ends.ramp_m), np.where(on_straight, room, transition), ends.ramp_m)

    pairs = _pairs(curves, ends, first[shares], second[shares], distance[shares])
    findings += _shared_length_findings(curves, ends, pairs)
    result = Neighbourhood(
        transition_m=np.where(shared, np.nan, transition),
        ramp_m=np.where(shared, np.nan, ramp),
        stated_ramp_m=ends.ramp_m,
        ramp_room_m=room,
        on_straight=on_straight,
        shared=shared,
        order=order,
        pairs=pairs,
        descending=descending,
        contradictory=contradictory,
        weight_length_m=weight_lengths(curves),
        findings=findings,
    )
    no_hand = np.zeros(n, dtype=np.bool_)
    nameless = curves.hand == HAND_UNKNOWN
    no_hand[pairs.first[nameless[pairs.first]]] = True
    no_hand[pairs.second[nameless[pairs.second]]] = True
    result.findings += [
        Finding(
            "hand-unknown",
            "stop",
            "The hand of this curve is not stated, and it shares a transition: L or R is needed.",
            int(i),
        )
        for i in np.flatnonzero(no_hand & ~curves.rejected)
    ]
    result.contradictory |= no_hand
    return forget(result, curves.rejected | result.contradictory)


def near_far(ends: _Ends, first: int, second: int) -> float:
    """Give the sum of the two transitions that meet between two curves [m]."""
    return float(np.nansum([ends.transition_m[AFTER, first], ends.transition_m[BEFORE, second]]))


def _room_on_straight(
    n: int,
    first: IntArray,
    second: IntArray,
    distance: FloatArray,
    far: FloatArray,
    near: FloatArray,
    excluded: BoolArray,
) -> FloatArray:
    """Give the room for a cant ramp at each end [m]: to the next transition, at most half way to its arc."""
    room = np.full((2, n), np.nan)
    keep = ~excluded
    room[AFTER, first[keep]] = np.minimum(distance - far, distance / 2)[keep]
    room[BEFORE, second[keep]] = np.minimum(distance - near, distance / 2)[keep]
    return room


def _pairs(curves: CurveList, ends: _Ends, first: IntArray, second: IntArray, distance: FloatArray) -> Pairs:
    length = np.where(distance < REACH_M, 0.0, distance)
    stated = np.where(
        np.isnan(ends.ramp_m[AFTER, first]), ends.ramp_m[BEFORE, second], ends.ramp_m[AFTER, first]
    )
    ramp = np.where(np.isnan(stated), np.where(length > 0, length, np.nan), stated)
    peak = np.array([SHAPES[name] for name in curves.shape])
    factor = np.maximum(peak[first], peak[second]) if len(first) else np.zeros(0)
    return Pairs(first, second, length, ramp, factor)


def _length_findings(curves: CurveList) -> list[Finding]:
    by_chainage = np.abs(curves.end_km - curves.start_km) * 1000.0
    difference = np.abs(by_chainage - curves.length_m)
    wrong = (difference > DISAGREEMENT_M + _MICRON) & (difference > DISAGREEMENT_RATIO * curves.length_m)
    return [
        Finding(
            "length-disagrees",
            "warning",
            f"Length is stated as {curves.length_m[i]:.1f} m, the chainages give {by_chainage[i]:.1f} m.",
            int(i),
        )
        for i in np.flatnonzero(wrong & ~curves.rejected)
    ]


def _shared_length_findings(curves: CurveList, ends: _Ends, pairs: Pairs) -> list[Finding]:
    findings = []
    for end, owner in ((AFTER, pairs.first), (BEFORE, pairs.second)):
        stated = ends.transition_m[end, owner]
        for i in np.flatnonzero(np.abs(stated - pairs.length_m) > DISAGREEMENT_M + _MICRON):
            findings.append(
                Finding(
                    "shared-length-disagrees",
                    "warning",
                    f"The transition between {curves.curve[pairs.first[i]]} and "
                    f"{curves.curve[pairs.second[i]]} is stated as {stated[i]:.1f} m, the chainages leave "
                    f"{pairs.length_m[i]:.1f} m, which is used.",
                    int(owner[i]),
                )
            )
    return findings


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
    return Neighbourhood(
        transition_m=neighbourhood.transition_m,
        ramp_m=np.where(lost, neighbourhood.stated_ramp_m, neighbourhood.ramp_m),
        stated_ramp_m=neighbourhood.stated_ramp_m,
        ramp_room_m=neighbourhood.ramp_room_m,
        on_straight=neighbourhood.on_straight,
        shared=shared,
        order=neighbourhood.order,
        pairs=kept,
        descending=neighbourhood.descending,
        contradictory=neighbourhood.contradictory,
        weight_length_m=neighbourhood.weight_length_m,
        findings=neighbourhood.findings,
    )


def chains_of(n: int, pairs: Pairs) -> list[IntArray]:
    """Give the curves that share transitions, each chain in order of chainage; lone curves are left out."""
    if not len(pairs):
        return []
    after = np.full(n, -1, dtype=np.int64)
    after[pairs.first] = pairs.second
    has_before = np.zeros(n, dtype=np.bool_)
    has_before[pairs.second] = True
    chains = []
    for start in pairs.first[~has_before[pairs.first]]:
        chain = [int(start)]
        while after[chain[-1]] >= 0:
            chain.append(int(after[chain[-1]]))
        chains.append(np.array(chain, dtype=np.int64))
    return chains
