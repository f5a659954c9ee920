"""What each method would like the cant to be; one optimiser plans them all.

A method gives a target and nothing else, so two methods differ in one number a curve. Only ``balanced`` looks
at limits, because what it balances are shares of them.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
import numpy.typing as npt

from cant.model.settings import Settings
from cant.planning.line import Line
from cant.planning.rules import Asked
from cant.quantities.kinematics import equilibrium_cant

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

Target = Callable[[Line, FloatArray], FloatArray]
"""Line of n curves and speeds (..., n, k) [km/h] to targets (..., n, 1) [mm]."""

_UNLIMITED_MM = 1e9
"""Stands for a limit that there is not: against it every other limit is small."""
_NO_ROOM_MM = 1e-6
"""Stands for a limit of 0: shares of it must stay finite."""


def traffic_weights(line: Line, moving: BoolArray) -> FloatArray:
    """Give the weight of each class on each curve, shape (..., n, k).

    Trains times mass; where a moving class lacks a mass, trains; where one lacks a number of trains, or all
    weights are 0, all alike.

    Parameters
    ----------
    line : Line
    moving : ndarray of bool, shape (..., n, k)
        Classes that count: those that run there at more than 0 km/h.
    """
    no_mass = (moving & np.isnan(line.mass_t)).any(axis=-1, keepdims=True)
    no_trains = (moving & np.isnan(line.trains)).any(axis=-1, keepdims=True)
    weight = np.where(no_mass, line.trains, line.trains * line.mass_t)
    weight = np.where(moving & ~no_trains, weight, 0.0)
    weight = np.nan_to_num(weight)
    nothing = weight.sum(axis=-1, keepdims=True) <= 0
    return np.where(nothing, moving.astype(np.float64), weight)


def rms_speed(line: Line, speed_kmh: FloatArray) -> FloatArray:
    """Give the tonnage-weighted root-mean-square speed [km/h], shape (..., n, 1); 0 where nothing moves."""
    speed = np.nan_to_num(speed_kmh)
    moving = line.runs & (speed > 0)
    weight = traffic_weights(line, moving)
    total = weight.sum(axis=-1, keepdims=True)
    square = (weight * speed**2).sum(axis=-1, keepdims=True)
    return np.asarray(np.sqrt(np.divide(square, total, out=np.zeros_like(square), where=total > 0)))


def rms_target(line: Line, speed_kmh: FloatArray) -> FloatArray:
    """Equilibrium cant of the rms speed (method ``rms``).

    It makes the tonnage-weighted sum of squares of deficiency and excess smallest, hence loads both rails
    alike.
    """
    return equilibrium_cant(rms_speed(line, speed_kmh), line.radius_m, line.constant)


def fraction_target(line: Line, speed_kmh: FloatArray, fraction: float) -> FloatArray:
    """Give a share of the equilibrium cant of the fastest class (method ``fraction``)."""
    speed = np.where(line.runs, np.nan_to_num(speed_kmh), 0.0)
    fastest = speed.max(axis=-1, keepdims=True, initial=0.0)
    return fraction * equilibrium_cant(fastest, line.radius_m, line.constant)


def balanced_target(line: Line, speed_kmh: FloatArray) -> FloatArray:
    """Smallest greatest share of a limit: deficiency of one class against excess of another (``balanced``).

    For a faster class f and a slower regular class s the shares of their normal limits are equal at
    ``(E_s D_f + I_f D_s) / (I_f + E_s)``, both being ``(D_f - D_s) / (I_f + E_s)`` there. The pair with the
    largest such share decides: at its cant no class has a larger one. Where no regular class runs, the target
    is that of ``rms``.
    """
    speed = np.nan_to_num(speed_kmh)
    asked = Asked(line, speed, False)
    deficiency, excess = (
        np.clip(asked.limit(quantity).value, _NO_ROOM_MM, _UNLIMITED_MM)
        for quantity in ("cant deficiency", "cant excess")
    )
    balance = equilibrium_cant(speed, line.radius_m, line.constant)
    fast, slow = balance[..., :, None], balance[..., None, :]
    room = deficiency[..., :, None] + excess[..., None, :]
    share = np.where(line.runs[..., :, None] & line.regular[..., None, :], (fast - slow) / room, -np.inf)
    even = (excess[..., None, :] * fast + deficiency[..., :, None] * slow) / room
    k = line.classes
    if not k:
        return rms_target(line, speed_kmh)
    shape = np.broadcast_shapes(share.shape, even.shape)[:-2]
    shares = np.broadcast_to(share, (*shape, k, k)).reshape(*shape, k * k)
    cants = np.broadcast_to(even, (*shape, k, k)).reshape(*shape, k * k)
    decides = shares.argmax(axis=-1)[..., None]
    known = np.isfinite(np.take_along_axis(shares, decides, axis=-1))
    return np.where(known, np.take_along_axis(cants, decides, axis=-1), rms_target(line, speed_kmh))


def least_target(line: Line, speed_kmh: FloatArray) -> FloatArray:
    """No cant at all: the optimiser then takes the least that the limits allow (method ``least``)."""
    return np.zeros((*speed_kmh.shape[:-1], 1))


def underbalance_target(line: Line, speed_kmh: FloatArray, margin_mm: float) -> FloatArray:
    """Aim a little under the equilibrium cant of the class with most tonnes (``underbalance``).

    Not below 0. Where tonnes are not known, the class with most trains; of equals the slower.
    """
    speed = np.nan_to_num(speed_kmh)
    moving = line.runs & (speed > 0)
    weight = traffic_weights(line, moving)
    most = weight.max(axis=-1, keepdims=True, initial=0.0)
    heaviest = np.where(moving & (weight >= most), speed, np.inf).min(axis=-1, keepdims=True, initial=np.inf)
    balance = equilibrium_cant(np.where(np.isfinite(heaviest), heaviest, 0.0), line.radius_m, line.constant)
    return np.maximum(balance - margin_mm, 0.0)


def today_target(line: Line, speed_kmh: FloatArray, within_mm: float) -> FloatArray:
    """Today's cant where it is known and close to the target of ``rms``, else that target (``today``)."""
    rms = rms_target(line, speed_kmh)
    with np.errstate(invalid="ignore"):
        close = np.abs(line.cant_today_mm - rms) <= within_mm
    return np.where(close, line.cant_today_mm, rms)


def target_of(method: str, settings: Settings) -> Target:
    """Give the target of a method with its parameters from the settings.

    Parameters
    ----------
    method : str
        One of :data:`cant.model.settings.METHODS`; KeyError for another.
    settings : Settings
        ``fraction_of_fastest``, ``underbalance_mm``, ``today_within_mm``.
    """
    targets: dict[str, Target] = {
        "rms": rms_target,
        "fraction": partial(fraction_target, fraction=settings.fraction_of_fastest),
        "balanced": balanced_target,
        "least": least_target,
        "underbalance": partial(underbalance_target, margin_mm=settings.underbalance_mm),
        "today": partial(today_target, within_mm=settings.today_within_mm),
    }
    return targets[method]
