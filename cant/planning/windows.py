"""The rules over shared transitions read the other way: which cants of the next curve a cant allows.

At given speeds every such rule allows an interval. So pairs of cants are compared with two numbers a cant,
and no rule need be evaluated for every pair: what holds together is the meeting of intervals, what holds at
every speed up to one is the meeting of theirs.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from cant.model.limits import TOLERANCE
from cant.planning.shared import SharedAsked, jump_of_deficiency
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]


class Window(NamedTuple):
    """Intervals of cants on the curve after, bounds included [mm]; low is inf where no cant is allowed."""

    low: FloatArray
    high: FloatArray

    def within(self, other: Window) -> Window:
        """Give what both allow."""
        return Window(np.maximum(self.low, other.low), np.minimum(self.high, other.high))

    def over_classes(self) -> Window:
        """Give what all classes on the last axis allow."""
        return Window(self.low.max(axis=-1), self.high.min(axis=-1))

    def holds(self, cant_after_mm: FloatArray) -> BoolArray:
        """Tell which cants (b, ...) of the curve after are allowed beside those (a, ...) before: (a, b, ...).

        nan is never allowed.
        """
        with np.errstate(invalid="ignore"):
            above = cant_after_mm >= self.low[:, None]
            return np.asarray(above & (cant_after_mm <= self.high[:, None]))


def _around(asked: SharedAsked, cant_before_mm: FloatArray, change_mm: FloatArray) -> Window:
    """Give the cants whose signed change is no larger than a size."""
    hands = asked.meeting.before.hand * asked.meeting.after.hand
    middle = hands * cant_before_mm
    return Window(middle - change_mm, middle + change_mm)


def hard_window(asked: SharedAsked, cant_before_mm: FloatArray) -> Window:
    """Give what gradient and equality of cants allow: no lower speed can mend these.

    Parameters
    ----------
    asked : SharedAsked
        m transitions, speeds of shape (m, k), and the tier; tolerances are included.
    cant_before_mm : ndarray, shape (..., m, 1)
        Cants of the curve before [mm].

    Returns
    -------
    Window
        Shape (..., m).
    """
    meeting = asked.meeting
    both = meeting.both
    limit = asked.limit("cant gradient")
    length = meeting.ramp_m / meeting.factor
    with np.errstate(invalid="ignore"):
        by_class = (limit.value + limit.tolerance) * length
    change = np.where(both & ~np.isnan(by_class), by_class, np.inf).min(axis=-1, keepdims=True)
    alone = np.logical_not(both.any(axis=-1, keepdims=True))
    if alone.any():
        limit = asked.curve_limit("cant gradient")
        with np.errstate(invalid="ignore"):
            change = np.where(alone, (limit.value + limit.tolerance) * length, change)
    change = np.where(meeting.equal_cants, TOLERANCE, change)
    return Window(*(bound[..., 0] for bound in _around(asked, cant_before_mm, change)))


def speed_windows(asked: SharedAsked, cant_before_mm: FloatArray) -> Window:
    """Give what the rates and the jump of deficiency allow to each class at the speeds asked.

    Parameters
    ----------
    asked : SharedAsked
        m transitions, speeds of shape (..., m, k), and the tier; tolerances are included.
    cant_before_mm : ndarray, shape (..., m, 1)
        Cants of the curve before [mm].

    Returns
    -------
    Window
        Shape (..., m, k).
    """
    meeting, speed = asked.meeting, asked.speed_kmh
    both = meeting.both
    rate = asked.limit("rate of change of cant")
    with np.errstate(divide="ignore", invalid="ignore"):
        change = (rate.value + rate.tolerance) * KMH_PER_MS * meeting.ramp_m / (meeting.factor * speed)
    change = np.where(both & ~np.isnan(change), change, np.inf)
    around, window = _around(asked, cant_before_mm, change), _deficiency_window(asked, cant_before_mm)
    np.maximum(window.low, around.low, out=window.low)
    np.minimum(window.high, around.high, out=window.high)
    touching = both & (meeting.length_m == 0)
    if touching.any():
        limit = asked.limit("abrupt change of cant deficiency")
        broken = touching & (jump_of_deficiency(meeting, speed) > limit.value + limit.tolerance)
        np.copyto(window.low, np.inf, where=broken)
    return window


def _deficiency_window(asked: SharedAsked, cant_before_mm: FloatArray) -> Window:
    """Give what the rate of change of deficiency allows to each class, excess counting as deficiency 0."""
    meeting, speed = asked.meeting, asked.speed_kmh
    limit = asked.limit("rate of change of cant deficiency")
    with np.errstate(divide="ignore", invalid="ignore"):
        room = (limit.value + limit.tolerance) * KMH_PER_MS * meeting.length_m / (meeting.factor * speed)
    active = meeting.both & (meeting.length_m > 0) & np.isfinite(room)
    room = np.where(active, room, np.inf)
    before, after = (
        np.where(active, equilibrium_cant(speed, line.radius_m, line.constant), 0.0)
        for line in (meeting.before, meeting.after)
    )
    # In place from here on: these arrays are the largest of a search.
    signed = before - cant_before_mm
    np.maximum(signed, 0.0, out=signed)
    signed *= meeting.before.hand * meeting.after.hand
    # The deficiency after lies in [signed - room, signed + room] and is at least 0.
    middle = after - signed
    low, high = middle - room, middle + room
    np.copyto(low, np.inf, where=signed < -room)
    np.copyto(high, np.inf, where=signed <= room)
    return Window(low, high)


def allowed_after(asked: SharedAsked, cant_before_mm: FloatArray) -> Window:
    """Give the interval of cants that a cant of the curve before allows on the curve after, by all rules.

    Parameters
    ----------
    asked : SharedAsked
        m transitions, speeds of shape (m, k), and the tier; tolerances are included.
    cant_before_mm : ndarray, shape (..., m, 1)
        Cants of the curve before [mm].

    Returns
    -------
    Window
        Shape (..., m).
    """
    hard = hard_window(asked, cant_before_mm)
    return hard.within(speed_windows(asked, cant_before_mm).over_classes())
