"""Candidates that change the alignment: longer transitions with the shift, larger radii with the offset."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from cant.explaining.candidate import Candidate
from cant.explaining.decisions import Change, CurveKey, Flatter, SharedLength, TransitionLength
from cant.explaining.room import lengths_needed, radius_needed, shared_lengths_needed, without_ends
from cant.model.curves import none_if_nan
from cant.planning.outcome import Outcome
from cant.quantities.geometry import apex_offset, turn_of_curve
from cant.quantities.shapes import shift_of_arc

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]
Side: TypeAlias = Literal["in", "out"]
Part: TypeAlias = tuple[tuple[int, Change], dict[str, Any]]
"""A change at the index of its curve, and the numbers for its words."""

_LARGEST_TURN_RAD = 2.5
"""Curves that turn further have no useful apex between their tangents."""

_WIDE_MOVE_M = 20.0
"""Moving the apex of a curve this far departs from what is there as much as doubling its radius."""
_SHORT_M = 20.0
"""What is added to a shorter transition departs from what is there as if it were this long."""


def _more_shift(has_m: float, wanted_m: float, radius_m: float, shape: str) -> float:
    return float(shift_of_arc(wanted_m, radius_m, shape)) - float(shift_of_arc(has_m, radius_m, shape))


class Alignment:
    """Changes of the alignment of some curves of a plan.

    Parameters
    ----------
    outcome : Outcome
    at : ndarray of int
        The curves.
    length_step_m, radius_step_m : float
        To what lengths and radii are rounded up.
    radius_m : ndarray, optional
        Radii that the curves are to have [m], shape (n,); the smallest that help where not given.
    """

    def __init__(
        self,
        outcome: Outcome,
        at: IntArray,
        length_step_m: float,
        radius_step_m: float,
        radius_m: FloatArray | None = None,
    ) -> None:
        self._outcome, self._at = outcome, at
        self._wanted_m = radius_m
        self._line = outcome.line.take(at)
        grid = outcome.grid.take(at)
        target = outcome.target(self._line, np.nan_to_num(self._line.planned_kmh))[:, 0]
        if radius_m is None:
            self._radius = radius_needed(self._line, grid, target, radius_step_m)
        else:
            self._radius = radius_m
            self._line.radius_m = radius_m[:, None]
        self._lengths = lengths_needed(self._line, grid, target, length_step_m)
        self._shared = self._shared_lengths(length_step_m)

    def of(self, j: int) -> Iterator[Candidate]:
        """Yield what might help the j-th curve."""
        yield from self._longer(j)
        yield from self._flatter(j)

    def flatter_and_longer(self, j: int) -> Iterator[Candidate]:
        """Yield the candidate of the radius given and the transitions that go with it."""
        for flatter in self._flatter(j):
            for longer in self._longer(j):
                yield Candidate(
                    "flatter curve and longer transition",
                    flatter.curve,
                    flatter.changes + longer.changes,
                    max(flatter.departure, longer.departure),
                    {**flatter.facts, **longer.facts},
                )

    def _longer(self, j: int) -> Iterator[Candidate]:
        curve = int(self._at[j])
        found = [*self._longer_to_straight(j, curve), *self._longer_shared(j, curve)]
        added = [fact["to_m"] - fact["from_m"] for _, fact in found]
        arc = self._outcome.neighbourhood.weight_length_m[curve]
        if not found or sum(added) / 2 >= arc - 1.0:
            return
        departure = max(
            more / max(fact["from_m"], _SHORT_M) for more, (_, fact) in zip(added, found, strict=True)
        )
        changes = tuple(change for change, _ in found)
        facts = {"transitions": [fact for _, fact in found]}
        yield Candidate("longer transition", curve, changes, departure, facts)

    def _longer_to_straight(self, j: int, curve: int) -> Iterator[Part]:
        curves, radius = self._outcome.curves, float(self._line.radius_m[j, 0])
        turned = bool(self._outcome.neighbourhood.descending[curve])
        sides: tuple[Side, Side] = ("out", "in") if turned else ("in", "out")
        for end, side in enumerate(sides):
            wanted = float(self._lengths[end][j])
            if np.isnan(wanted):
                continue
            has = float(np.nan_to_num(self._line.transition_m[end][j, 0]))
            change = TransitionLength(on=CurveKey.of(curves, curve), end=side, length_m=wanted)
            shift = _more_shift(has, wanted, radius, curves.shape[curve])
            yield (curve, change), {"end": side, "from_m": has, "to_m": wanted, "shift_m": shift}

    def _longer_shared(self, j: int, curve: int) -> Iterator[Part]:
        curves = self._outcome.curves
        for first, second, has, wanted in self._shared.get(curve, []):
            change = SharedLength(
                on=CurveKey.of(curves, first), next=CurveKey.of(curves, second), length_m=wanted
            )
            radii = {own: float(curves.radius_m[own]) for own in (first, second)}
            radii[curve] = float(self._line.radius_m[j, 0])
            # The two arcs lie apart by the shift of their difference of curvature.
            bend = abs(curves.hand[first] / radii[first] - curves.hand[second] / radii[second])
            shift = _more_shift(has, wanted, 1.0 / max(float(bend), 1e-9), curves.shape[first])
            other = curves.curve[second if first == curve else first]
            yield (first, change), {"shared_with": other, "from_m": has, "to_m": wanted, "shift_m": shift}

    def _flatter(self, j: int) -> Iterator[Candidate]:
        curve, curves = int(self._at[j]), self._outcome.curves
        wanted = self._radius[j]
        today = float(self._outcome.line.radius_m[curve, 0])
        if np.isnan(wanted):
            return
        arc = np.nanmax(
            [curves.length_m[curve], 1000 * abs(curves.end_km[curve] - curves.start_km[curve]), -1.0]
        )
        ends = np.nan_to_num([curves.transition_in_m[curve], curves.transition_out_m[curve]])
        turn = float(turn_of_curve(arc, today, ends[0], ends[1])) if arc > 0 else np.nan
        if turn > _LARGEST_TURN_RAD:
            return
        offset = none_if_nan(float(apex_offset(today, wanted, turn))) if not np.isnan(turn) else None
        yield Candidate(
            "flatter curve",
            curve,
            ((curve, Flatter(on=CurveKey.of(curves, curve), radius_m=float(wanted))),),
            max(float(wanted / today - 1.0), (offset or 0.0) / _WIDE_MOVE_M),
            {"from_m": today, "to_m": float(wanted), "offset_m": offset},
        )

    def _shared_lengths(self, rounding_m: float) -> dict[int, list[tuple[int, int, float, float]]]:
        """Give for each curve (first, second, length there is, length needed) of its shared transitions."""
        outcome = self._outcome
        every = outcome.pairs.beside(self._at)
        line, pairs = outcome.line.take(every), outcome.pairs.among(every)
        if self._wanted_m is not None:
            line.radius_m[: len(self._at), 0] = self._wanted_m
        target = outcome.target(line, np.nan_to_num(line.planned_kmh))[:, 0]
        cant = without_ends(line, outcome.grid.take(every), target)
        needed = shared_lengths_needed(line, pairs, cant, rounding_m)
        found: dict[int, list[tuple[int, int, float, float]]] = {}
        for j in np.flatnonzero(~np.isnan(needed)):
            first, second = int(every[pairs.first[j]]), int(every[pairs.second[j]])
            for curve in (first, second):
                found.setdefault(curve, []).append(
                    (first, second, float(pairs.length_m[j]), float(needed[j]))
                )
        return found


def realigned(
    outcome: Outcome, at: IntArray, length_step_m: float, radius_step_m: float
) -> Iterator[Candidate]:
    """Yield the candidates of a larger radius together with the longer transitions that it then needs.

    For curves that neither alone helps. Parameters as for :class:`Alignment`.
    """
    line = outcome.line.take(at)
    target = outcome.target(line, np.nan_to_num(line.planned_kmh))[:, 0]
    radius = radius_needed(line, outcome.grid.take(at), target, radius_step_m, arc_alone=True)
    known = np.flatnonzero(~np.isnan(radius))
    if not len(known):
        return
    alignment = Alignment(outcome, at[known], length_step_m, radius_step_m, radius[known])
    for j in range(len(known)):
        yield from alignment.flatter_and_longer(j)
