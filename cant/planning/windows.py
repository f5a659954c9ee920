"""The rules over shared transitions read the other way: which cants of the next curve a cant allows.

At given speeds every such rule allows an interval; where nothing needs approval and nothing gives way, a
chain is a shortest path through these intervals, and no pair of cants need be tried.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from cant.model.limits import TOLERANCE
from cant.planning.shared import SharedAsked, jump_of_deficiency
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]


def _largest_change_of_cant(asked: SharedAsked) -> FloatArray:
    """Give the largest signed change of cant that gradient, rate and equality allow [mm], shape (m, 1)."""
    meeting = asked.meeting
    gradient, rate = asked.limit("cant gradient"), asked.limit("rate of change of cant")
    with np.errstate(divide="ignore", invalid="ignore"):
        length = meeting.ramp_m / meeting.factor
        by_gradient = (gradient.value + gradient.tolerance) * length
        by_rate = (rate.value + rate.tolerance) * length * KMH_PER_MS / asked.speed_kmh
    both = meeting.both
    largest = np.where(both, np.fmin(by_gradient, by_rate), np.inf).min(axis=-1, keepdims=True)
    alone = np.logical_not(both.any(axis=-1, keepdims=True))
    if alone.any():
        limit = asked.curve_limit("cant gradient")
        largest = np.where(alone, (limit.value + limit.tolerance) * length, largest)
    return np.where(meeting.equal_cants, TOLERANCE, largest)


def allowed_after(asked: SharedAsked, cant_before_mm: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Give the interval of cants that a cant of the curve before allows on the curve after.

    Parameters
    ----------
    asked : SharedAsked
        m transitions, speeds of shape (m, k), and the tier; tolerances are included.
    cant_before_mm : ndarray, shape (..., m, 1)
        Cants of the curve before [mm].

    Returns
    -------
    low, high : ndarray, shape (..., m)
        Bounds included [mm]; low is inf where no cant at all is allowed.
    """
    meeting, speed = asked.meeting, asked.speed_kmh
    hands = meeting.before.hand * meeting.after.hand
    change = _largest_change_of_cant(asked)
    low = (hands * cant_before_mm - change)[..., 0]
    high = (hands * cant_before_mm + change)[..., 0]
    limit = asked.limit("rate of change of cant deficiency")
    with np.errstate(divide="ignore", invalid="ignore"):
        room = (limit.value + limit.tolerance) * KMH_PER_MS * meeting.length_m / (meeting.factor * speed)
    active = meeting.both & (meeting.length_m > 0) & np.isfinite(room)
    room = np.where(active, room, np.inf)
    before, after = (
        equilibrium_cant(speed, line.radius_m, line.constant) for line in (meeting.before, meeting.after)
    )
    signed = hands * np.maximum(before - cant_before_mm, 0.0)
    with np.errstate(invalid="ignore"):
        lowest = np.where(signed + room >= 0, after - signed - room, np.inf)
        highest = np.where(signed - room > 0, after - signed + room, np.inf)
    low = np.maximum(low, np.where(active, lowest, -np.inf).max(axis=-1))
    high = np.minimum(high, np.where(active, highest, np.inf).min(axis=-1))
    return np.where(_jump_kept(asked), low, np.inf), high


def _jump_kept(asked: SharedAsked) -> BoolArray:
    """Tell where the jump of deficiency is within its limit, shape (m,): cants have no part in it."""
    meeting = asked.meeting
    touching = meeting.length_m == 0
    if not touching.any():
        return np.ones(len(meeting), dtype=np.bool_)
    limit = asked.limit("abrupt change of cant deficiency")
    within = jump_of_deficiency(meeting, asked.speed_kmh) <= limit.value + limit.tolerance
    return np.asarray((within | ~(meeting.both & touching)).all(axis=-1))
