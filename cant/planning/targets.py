"""What each method would like the cant to be; one optimiser plans them all.

A method gives a target and nothing else: it knows no limits, so two methods differ in one number a curve.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.quantities.kinematics import equilibrium_cant

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

Target = Callable[[Line, FloatArray], FloatArray]
"""Line of n curves and speeds (..., n, k) [km/h] to targets (..., n, 1) [mm]."""


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
    """Equilibrium cant of the rms speed (method ``rms``)."""
    return equilibrium_cant(rms_speed(line, speed_kmh), line.radius_m, line.constant)


TARGETS: dict[str, Target] = {"rms": rms_target}
"""Methods by name."""
