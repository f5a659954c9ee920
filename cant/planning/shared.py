r"""The rules over a shared transition: signed change of cant and of deficiency between two curves.

::

    cant        D1 h1 ________                          h = 1 left-hand, -1 right-hand
                              \_____________ D2 h2      change of cant = |D1 h1 - D2 h2|
                      arc 1   |  length  |  arc 2

A class runs it at the lower of its two speeds; excess counts as deficiency 0; the stricter limit of the two
curves holds.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.model.limits import TOLERANCE
from cant.planning.limit_table import LimitAt
from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.rules import BETWEEN, Asked, Rule
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

SHARED_GRADIENT = Rule("cant gradient", BETWEEN, 0, False)
SHARED_EQUAL = Rule("equal cants", BETWEEN, 0, False, of_class=False)
SHARED_CANT_RATE = Rule("rate of change of cant", BETWEEN, 0, True)
SHARED_DEFICIENCY_RATE = Rule("rate of change of cant deficiency", BETWEEN, 0, True)
SHARED_ABRUPT = Rule("abrupt change of cant deficiency", BETWEEN, 0, True)


@dataclass(frozen=True)
class Meeting:
    """Some shared transitions with the arrays of the two curves at each, m of them.

    Attributes
    ----------
    before, after : Line
        The curve at the smaller and at the greater chainage of each, m curves each.
    length_m, ramp_m, factor : ndarray, shape (m, 1)
        As in :class:`cant.planning.neighbours.Pairs`.
    """

    before: Line
    after: Line
    length_m: FloatArray
    ramp_m: FloatArray
    factor: FloatArray

    @classmethod
    def of(cls, line: Line, pairs: Pairs) -> Meeting:
        """Look at some transitions of a line."""
        return cls(
            before=line.take(pairs.first),
            after=line.take(pairs.second),
            length_m=pairs.length_m[:, None],
            ramp_m=pairs.ramp_m[:, None],
            factor=pairs.factor[:, None],
        )

    def take(self, indices: npt.ArrayLike) -> Meeting:
        """Give some of the transitions."""
        at = np.asarray(indices)
        return Meeting(
            self.before.take(at), self.after.take(at), self.length_m[at], self.ramp_m[at], self.factor[at]
        )

    def take_classes(self, columns: npt.NDArray[np.int64]) -> Meeting:
        """Give the same transitions with some of the classes only."""
        return Meeting(
            self.before.take_classes(columns),
            self.after.take_classes(columns),
            self.length_m,
            self.ramp_m,
            self.factor,
        )

    def unfold(self, transitions: npt.NDArray[np.int64], columns: npt.NDArray[np.int64]) -> Meeting:
        """Give some classes over some transitions, each as a transition of its own with one class."""
        at = transitions
        return Meeting(
            self.before.unfold(at, columns),
            self.after.unfold(at, columns),
            self.length_m[at],
            self.ramp_m[at],
            self.factor[at],
        )

    def __len__(self) -> int:
        return len(self.length_m)

    @property
    def both(self) -> BoolArray:
        """Whether a class runs on both curves, shape (m, k)."""
        return self.before.runs & self.after.runs

    @property
    def planned_kmh(self) -> FloatArray:
        """Lower of a class's two planned speeds [km/h], shape (m, k)."""
        return np.minimum(self.before.planned_kmh, self.after.planned_kmh)

    @property
    def equal_cants(self) -> BoolArray:
        """Whether the signed cants must be equal, shape (m, 1)."""
        return np.isnan(self.ramp_m)


@dataclass(frozen=True, slots=True)
class SharedValue:
    """A rule over shared transitions with its value: arrays broadcast to (..., m, k)."""

    rule: Rule
    value: FloatArray
    limit: LimitAt
    active: BoolArray

    def kept(self) -> BoolArray:
        """Tell whether the limit is kept; True where the rule does not apply."""
        return ~self.active | (self.value <= self.limit.value + self.limit.tolerance)


def stricter(one: LimitAt, other: LimitAt) -> LimitAt:
    """Give the smaller of two limits, with its own tolerance and row."""
    first = one.value <= other.value
    return LimitAt(
        np.where(first, one.value, other.value),
        np.where(first, one.tolerance, other.tolerance),
        np.where(first, one.row, other.row),
        one.gap | other.gap,
    )


class SharedAsked:
    """The limits of shared transitions at given speeds and one tier.

    Parameters
    ----------
    meeting : Meeting
    speed_kmh : ndarray, shape (..., m, k)
        Speed over the transition.
    exceptional : bool
    """

    def __init__(self, meeting: Meeting, speed_kmh: FloatArray, exceptional: bool) -> None:
        self.meeting = meeting
        self.speed_kmh = speed_kmh
        self._sides = (
            Asked(meeting.before, speed_kmh, exceptional),
            Asked(meeting.after, speed_kmh, exceptional),
        )

    def limit(self, quantity: str) -> LimitAt:
        """Give the stricter limit of the two curves, shape (..., m, k)."""
        before, after = self._sides
        return stricter(before.limit(quantity), after.limit(quantity))

    def curve_limit(self, quantity: str) -> LimitAt:
        """Give the stricter limit of rows that speak of no class, shape (m, 1)."""
        before, after = self._sides
        return stricter(before.curve_limit(quantity), after.curve_limit(quantity))


def change_of_cant(meeting: Meeting, cant_before_mm: FloatArray, cant_after_mm: FloatArray) -> FloatArray:
    """Signed change of cant between the two curves, as its size [mm], shape (..., m, 1)."""
    return np.abs(meeting.before.hand * cant_before_mm - meeting.after.hand * cant_after_mm)


def change_of_deficiency(
    meeting: Meeting, speed_kmh: FloatArray, cant_before_mm: FloatArray, cant_after_mm: FloatArray
) -> FloatArray:
    """Signed change of cant deficiency, as its size [mm], shape (..., m, k); excess counts as 0."""
    parts = [
        line.hand * np.maximum(equilibrium_cant(speed_kmh, line.radius_m, line.constant) - cant_mm, 0.0)
        for line, cant_mm in ((meeting.before, cant_before_mm), (meeting.after, cant_after_mm))
    ]
    return np.abs(parts[0] - parts[1])


def jump_of_deficiency(meeting: Meeting, speed_kmh: FloatArray) -> FloatArray:
    """Jump of deficiency where the arcs touch [mm], shape (..., m, k): whatever the (equal) cants."""
    parts = [
        line.hand * equilibrium_cant(speed_kmh, line.radius_m, line.constant)
        for line in (meeting.before, meeting.after)
    ]
    return np.abs(parts[0] - parts[1])


def hard_values(
    asked: SharedAsked, cant_before_mm: FloatArray, cant_after_mm: FloatArray
) -> Iterator[SharedValue]:
    """Yield what no lower speed can mend: gradient, and equal cants where the arcs touch without a ramp."""
    meeting = asked.meeting
    change = change_of_cant(meeting, cant_before_mm, cant_after_mm)
    with np.errstate(invalid="ignore"):
        gradient = meeting.factor * change / meeting.ramp_m
    ramped = ~meeting.equal_cants
    if ramped.any():
        yield SharedValue(SHARED_GRADIENT, gradient, asked.limit("cant gradient"), meeting.both & ramped)
        alone = ~meeting.both.any(axis=-1, keepdims=True) & ramped
        if alone.any():
            yield SharedValue(SHARED_GRADIENT, gradient, asked.curve_limit("cant gradient"), alone)
    if meeting.equal_cants.any():
        zero = np.zeros(meeting.ramp_m.shape)
        limit = LimitAt(zero, zero + TOLERANCE, np.full(zero.shape, -1, dtype=np.int16), zero > 0)
        yield SharedValue(SHARED_EQUAL, change, limit, meeting.equal_cants)


def speed_values(
    asked: SharedAsked, cant_before_mm: FloatArray, cant_after_mm: FloatArray
) -> Iterator[SharedValue]:
    """Yield what a lower speed can mend: rates over the transition, and the jump where there is none."""
    meeting, speed = asked.meeting, asked.speed_kmh
    ramped = ~meeting.equal_cants
    long = meeting.length_m > 0
    with np.errstate(divide="ignore", invalid="ignore"):
        if ramped.any():
            change = change_of_cant(meeting, cant_before_mm, cant_after_mm)
            rate = meeting.factor * change * speed / (KMH_PER_MS * meeting.ramp_m)
            yield SharedValue(
                SHARED_CANT_RATE, rate, asked.limit("rate of change of cant"), meeting.both & ramped
            )
        if long.any():
            change = change_of_deficiency(meeting, speed, cant_before_mm, cant_after_mm)
            rate = meeting.factor * change * speed / (KMH_PER_MS * meeting.length_m)
            yield SharedValue(
                SHARED_DEFICIENCY_RATE,
                rate,
                asked.limit("rate of change of cant deficiency"),
                meeting.both & long,
            )
    if not long.all():
        yield SharedValue(
            SHARED_ABRUPT,
            jump_of_deficiency(meeting, speed),
            asked.limit("abrupt change of cant deficiency"),
            meeting.both & ~long,
        )


def shared_values(
    asked: SharedAsked, cant_before_mm: FloatArray, cant_after_mm: FloatArray
) -> Iterator[SharedValue]:
    """Yield every rule over shared transitions at given cants, shapes (..., m, 1)."""
    yield from hard_values(asked, cant_before_mm, cant_after_mm)
    yield from speed_values(asked, cant_before_mm, cant_after_mm)
