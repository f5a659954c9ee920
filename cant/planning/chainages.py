"""How curves meet, found from chainages and lengths: order, shared transitions, overlaps, room for ramps.

Apart from :mod:`cant.planning.neighbours`, which says what is found and serves the rules, because the
contradictions of a list are settled here. Knows nothing of traffic, limits or cant.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import partial

import numpy as np
import numpy.typing as npt

from cant.model.curves import HAND_UNKNOWN, SHAPES, CurveList
from cant.model.plan import Finding
from cant.planning.neighbours import AFTER, BEFORE, Neighbourhood, Pairs, forget

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

REACH_M = 0.5
"""Chainages closer than this [m] are the same point, as far as a list can tell."""
DISAGREEMENT_M = 1.0
"""Lengths that differ by more than this [m] are worth a finding."""
DISAGREEMENT_RATIO = 0.01
DEFAULT_WEIGHT_LENGTH_M = 100.0
_MICRON = 1e-6


@dataclass
class _Ends:
    """The list's lengths turned so that end 0 is at the smaller chainage, also where the list descends."""

    low_km: FloatArray
    high_km: FloatArray
    transition_m: FloatArray
    ramp_m: FloatArray

    @classmethod
    def of(cls, curves: CurveList, descending: BoolArray) -> _Ends:
        transition = np.stack([curves.transition_in_m, curves.transition_out_m])
        ramp = np.stack([curves.ramp_in_m, curves.ramp_out_m])
        ramp = np.where(ramp > 0, ramp, np.nan)
        return cls(
            low_km=np.where(descending, curves.end_km, curves.start_km),
            high_km=np.where(descending, curves.start_km, curves.end_km),
            transition_m=np.where(descending, transition[::-1], transition),
            ramp_m=np.where(descending, ramp[::-1], ramp),
        )

    def order(self, track: IntArray) -> IntArray:
        """Give the curves with known chainage by track and chainage."""
        position = np.where(np.isnan(self.low_km), self.high_km, self.low_km)
        placed = np.flatnonzero(~np.isnan(position))
        return placed[np.lexsort((position[placed], track[placed]))]


@dataclass
class _Gaps:
    """What lies between consecutive curves of a line and track, first and second; arrays (g,).

    ``near_m`` and ``far_m`` are the transitions that meet there, 0 where not known. Of ``clash`` (the arcs
    lie over each other), ``shares`` (one transition) and ``overlaps`` (two that are too long) at most one
    holds.
    """

    first: IntArray
    second: IntArray
    distance_m: FloatArray
    near_m: FloatArray
    far_m: FloatArray
    clash: BoolArray
    shares: BoolArray
    overlaps: BoolArray

    @classmethod
    def of(cls, ends: _Ends, order: IntArray, track: IntArray) -> _Gaps:
        first, second = order[:-1], order[1:]
        same = track[first] == track[second]
        first, second = first[same], second[same]
        distance = np.round((ends.low_km[second] - ends.high_km[first]) * 1000.0 / _MICRON) * _MICRON
        near = np.nan_to_num(ends.transition_m[AFTER, first])
        far = np.nan_to_num(ends.transition_m[BEFORE, second])
        clash = distance < -REACH_M - _MICRON
        shares = ~clash & (distance <= np.maximum(near, far) + REACH_M + _MICRON)
        overlaps = ~clash & ~shares & (distance < near + far - _MICRON)
        return cls(first, second, distance, near, far, clash, shares, overlaps)

    def room_m(self, n: int) -> FloatArray:
        """Give the room for a ramp on the straight at each end of n curves [m], (2, n); nan: none.

        It goes to the next transition, at most half way to its arc.
        """
        room = np.full((2, n), np.nan)
        apart = ~(self.clash | self.shares)
        half = self.distance_m / 2
        room[AFTER, self.first[apart]] = np.minimum(self.distance_m - self.far_m, half)[apart]
        room[BEFORE, self.second[apart]] = np.minimum(self.distance_m - self.near_m, half)[apart]
        return room


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
        more of them with :func:`cant.planning.neighbours.forget`.
    """
    n, track = len(curves), _track_numbers(curves)
    descending = _descending(curves, track)
    ends = _Ends.of(curves, descending)
    order = ends.order(track)
    gaps = _Gaps.of(ends, order, track)
    pairs = _pairs(curves, ends, gaps)
    backwards = np.where(descending, curves.start_km < curves.end_km, curves.start_km > curves.end_km)
    handless = _without_hand(curves, pairs)
    contradictory = backwards | handless
    contradictory[gaps.first[gaps.clash]] = True
    contradictory[gaps.second[gaps.clash]] = True

    transition = ends.transition_m.copy()
    half = gaps.distance_m[gaps.overlaps] / 2
    transition[AFTER, gaps.first[gaps.overlaps]] = half
    transition[BEFORE, gaps.second[gaps.overlaps]] = half
    shared = np.zeros((2, n), dtype=np.bool_)
    shared[AFTER, pairs.first] = True
    shared[BEFORE, pairs.second] = True
    on_straight = (transition == 0) & ~shared
    room = np.where(on_straight, gaps.room_m(n), np.nan)
    ramp = np.where(np.isnan(ends.ramp_m), np.where(on_straight, room, transition), ends.ramp_m)
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
        track=track,
        remarks=[  # not lambdas: a plan must be able to go into another process
            partial(_length_findings, curves),
            partial(_backward_findings, backwards & ~curves.rejected),
            partial(_clash_findings, curves, gaps),
            partial(_overlap_findings, curves, gaps),
            partial(_shared_length_findings, curves, ends, pairs),
            partial(_hand_findings, handless & ~curves.rejected),
        ],
    )
    return forget(result, curves.rejected | contradictory)


def _track_numbers(curves: CurveList) -> IntArray:
    """Give each curve the number of its line and track, in order of appearance."""
    keys = list(zip(curves.line, curves.track, strict=True))
    number = {key: i for i, key in enumerate(dict.fromkeys(keys))}
    return np.fromiter(map(number.__getitem__, keys), np.int64, len(keys))


def _descending(curves: CurveList, track: IntArray) -> BoolArray:
    """Tell for each curve whether its line and track is listed against the chainage."""
    groups = int(track.max(initial=-1)) + 1
    up = np.bincount(track, weights=curves.start_km < curves.end_km, minlength=groups)
    down = np.bincount(track, weights=curves.start_km > curves.end_km, minlength=groups)
    return (down > up)[track] if groups else np.zeros(0, dtype=np.bool_)


def weight_lengths(curves: CurveList) -> FloatArray:
    """Give the lengths that weigh curves against each other [m]: stated, else from chainages, else 100 m."""
    from_chainage = np.abs(curves.end_km - curves.start_km) * 1000.0
    length = np.where(np.isnan(curves.length_m), from_chainage, curves.length_m)
    return np.where(np.isnan(length), DEFAULT_WEIGHT_LENGTH_M, length)


def shape_factors(curves: CurveList) -> FloatArray:
    """Give the peak over mean gradient of each curve's transitions [-], shape (n,)."""
    return np.fromiter(map(SHAPES.__getitem__, curves.shape), np.float64, len(curves))


def _pairs(curves: CurveList, ends: _Ends, gaps: _Gaps) -> Pairs:
    first, second = gaps.first[gaps.shares], gaps.second[gaps.shares]
    distance = gaps.distance_m[gaps.shares]
    length = np.where(distance < REACH_M, 0.0, distance)
    stated = np.where(
        np.isnan(ends.ramp_m[AFTER, first]), ends.ramp_m[BEFORE, second], ends.ramp_m[AFTER, first]
    )
    ramp = np.where(np.isnan(stated), np.where(length > 0, length, np.nan), stated)
    peak = shape_factors(curves)
    return Pairs(first, second, length, ramp, np.maximum(peak[first], peak[second]))


def _without_hand(curves: CurveList, pairs: Pairs) -> BoolArray:
    """Mark curves that share a transition, for which a hand is needed that is not stated."""
    sharing = np.zeros(len(curves), dtype=np.bool_)
    sharing[pairs.first] = sharing[pairs.second] = True
    return np.asarray(sharing & (curves.hand == HAND_UNKNOWN))


# -- in words ---------------------------------------------------------------------------------------------


def _length_findings(curves: CurveList) -> Iterator[Finding]:
    by_chainage = np.abs(curves.end_km - curves.start_km) * 1000.0
    difference = np.abs(by_chainage - curves.length_m)
    wrong = (difference > DISAGREEMENT_M + _MICRON) & (difference > DISAGREEMENT_RATIO * curves.length_m)
    for i in np.flatnonzero(wrong & ~curves.rejected):
        text = f"Length is stated as {curves.length_m[i]:.1f} m, the chainages give {by_chainage[i]:.1f} m."
        yield Finding("length-disagrees", "warning", text, int(i))


def _backward_findings(backwards: BoolArray) -> Iterator[Finding]:
    for i in np.flatnonzero(backwards):
        text = "Start and End run against the rest of the list."
        yield Finding("chainage-against-list", "stop", text, int(i))


def _clash_findings(curves: CurveList, gaps: _Gaps) -> Iterator[Finding]:
    for g in np.flatnonzero(gaps.clash):
        both = int(gaps.first[g]), int(gaps.second[g])
        text = (
            f"The arcs of {curves.curve[both[0]]} and {curves.curve[both[1]]} overlap by "
            f"{-gaps.distance_m[g]:.1f} m: one of the chainages is wrong."
        )
        yield from (Finding("arcs-overlap", "stop", text, i) for i in both)


def _overlap_findings(curves: CurveList, gaps: _Gaps) -> Iterator[Finding]:
    for g in np.flatnonzero(gaps.overlaps):
        both, distance = (int(gaps.first[g]), int(gaps.second[g])), gaps.distance_m[g]
        text = (
            f"The transitions between {curves.curve[both[0]]} and {curves.curve[both[1]]} need "
            f"{gaps.near_m[g] + gaps.far_m[g]:.1f} m, the arcs are {distance:.1f} m apart: "
            f"each is taken as {distance / 2:.1f} m."
        )
        yield from (Finding("transitions-overlap", "warning", text, i) for i in both)


def _shared_length_findings(curves: CurveList, ends: _Ends, pairs: Pairs) -> Iterator[Finding]:
    for end, owner in ((AFTER, pairs.first), (BEFORE, pairs.second)):
        stated = ends.transition_m[end, owner]
        for i in np.flatnonzero(np.abs(stated - pairs.length_m) > DISAGREEMENT_M + _MICRON):
            first, second = curves.curve[pairs.first[i]], curves.curve[pairs.second[i]]
            text = (
                f"The transition between {first} and {second} is stated as {stated[i]:.1f} m, the chainages "
                f"leave {pairs.length_m[i]:.1f} m, which is used."
            )
            yield Finding("shared-length-disagrees", "warning", text, int(owner[i]))


def _hand_findings(handless: BoolArray) -> Iterable[Finding]:
    for i in np.flatnonzero(handless):
        text = "The hand of this curve is not stated, and it shares a transition: L or R is needed."
        yield Finding("hand-unknown", "stop", text, int(i))
