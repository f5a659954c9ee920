"""A long line in parts, planned one after the other: what is planned twice over never stands in memory whole.

Lines and tracks know nothing of each other, and along a track a curve looks no further than its chain of
shared transitions and the next curve; so a part with a few curves of its surroundings is planned as it is in
the whole line.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.outcome import Outcome, plan_arrays

IntArray = npt.NDArray[np.int64]

LARGE_PART = 16_384
"""Curves of a part, where the line can be cut there."""
MARGIN = 16
"""Curves of the surroundings on either side: a few more than any of them looks at."""


@dataclass(frozen=True)
class Part:
    """A part of the line.

    Attributes
    ----------
    own : ndarray of int
        Its curves.
    every : ndarray of int
        The same, and behind them those beside the part on the same track, which are planned along.
    """

    own: IntArray
    every: IntArray


def parts_of(outcome: Outcome, large: int = LARGE_PART) -> list[Part]:
    """Cut a line into parts, tracks together and long tracks between their chains.

    Parameters
    ----------
    outcome : Outcome
        The line.
    large : int
        Curves from which a part is full.

    Returns
    -------
    list of Part
        Every curve, rejected ones too, is an own one of exactly one part.
    """
    n = len(outcome.curves)
    if n <= large:
        every = np.arange(n)
        return [Part(every, every)]
    pieces = [piece for track in _tracks(outcome) for piece in _pieces(outcome, track, large)]
    parts: list[Part] = []
    waiting: list[Part] = []
    for piece in pieces:
        waiting.append(piece)
        if sum(len(one.own) for one in waiting) >= large:
            parts.append(_joined(waiting))
            waiting = []
    return [*parts, _joined(waiting)] if waiting else parts


def plan_part(outcome: Outcome, part: Part, method: str) -> Outcome:
    """Plan the curves of a part with another method; its own ones come first, in their order."""
    settings = outcome.settings.model_copy(update={"method": method})
    if len(part.own) == len(outcome.curves):
        curves, placed = outcome.curves, None
    else:
        curves, placed = outcome.curves.take(part.every), placed_on(outcome, part.every)
    turnouts = outcome.turnouts
    return plan_arrays(curves, outcome.traffic, outcome.limits, settings, turnouts=turnouts, placed=placed)


def placed_on(outcome: Outcome, every: IntArray) -> dict[int, list[int]]:
    """Give the turnouts of copies of curves, by position: those of the curves that they are copies of."""
    branches = outcome.line.branches
    if branches is None:
        return {}
    return {
        position: [int(t) for t in branches.number[curve] if t >= 0]
        for position, curve in enumerate(every)
        if branches.there[curve].any()
    }


def _tracks(outcome: Outcome) -> list[IntArray]:
    """Give the curves of each line and track in order of chainage, those without a place last."""
    curves = outcome.curves
    rank = np.full(len(curves), len(curves), dtype=np.int64)
    rank[outcome.neighbourhood.order] = np.arange(len(outcome.neighbourhood.order))
    members: dict[tuple[str, str], list[int]] = {}
    for index, key in enumerate(zip(curves.line, curves.track, strict=True)):
        members.setdefault(key, []).append(index)
    tracks = (np.array(indices, dtype=np.int64) for indices in members.values())
    return [track[np.argsort(rank[track], kind="stable")] for track in tracks]


def _pieces(outcome: Outcome, track: IntArray, large: int) -> list[Part]:
    """Cut a track between its chains, where each piece shows which way the track is listed."""
    joined = np.zeros(len(outcome.curves), dtype=np.bool_)
    joined[outcome.pairs.first] = True
    pieces: list[Part] = []
    begin, end = 0, min(large, len(track))
    while begin < len(track):
        while end < len(track) and joined[track[end - 1]]:
            end += 1
        low, high = max(0, begin - MARGIN), min(len(track), end + MARGIN)
        around = np.concatenate([track[low:begin], track[end:high]])
        piece = Part(track[begin:end], np.concatenate([track[begin:end], around]))
        if end < len(track) and not _shows_direction(outcome, piece.every):
            end += 1
            continue
        pieces.append(piece)
        begin, end = end, min(end + large, len(track))
    return pieces


def _shows_direction(outcome: Outcome, every: IntArray) -> bool:
    """Tell whether most curves of a piece run along the chainage as most of the whole track do."""
    start, end = outcome.curves.start_km[every], outcome.curves.end_km[every]
    descends = np.count_nonzero(start > end) > np.count_nonzero(start < end)
    return bool(descends == outcome.neighbourhood.descending[every[0]])


def _joined(pieces: list[Part]) -> Part:
    own = np.concatenate([piece.own for piece in pieces])
    around = np.concatenate([piece.every[len(piece.own) :] for piece in pieces])
    return Part(own, np.concatenate([own, around]))
