"""Cant and deficiency that change along a transition: gradient, rates of change, jerk, roll.

Every peak is the mean times the peak factor of the shape (:func:`cant.quantities.shapes.peak_factor`). A
change is signed over a shared transition: between a left and a right curve the cants add up.
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.units import GRAVITY_MS2, KMH_PER_MS


def _per_length(change: ArrayLike, length_m: ArrayLike) -> FloatArray:
    """Divide a change by a length; no change over no length is 0."""
    size, length = floats(change), floats(length_m)
    return np.where((size == 0) & (length == 0), 0.0, divide(size, length))[()]


def cant_gradient(cant_change_mm: ArrayLike, length_m: ArrayLike, peak_factor: ArrayLike = 1.0) -> FloatArray:
    """Steepest gradient of a cant ramp.

    Parameters
    ----------
    cant_change_mm : array_like
        Change of cant over the ramp [mm], any shape.
    length_m : array_like
        L of the ramp [m], a shape that broadcasts.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        Gradient [mm/m], broadcast shape, the sign that of the change; ``inf`` for a change at a point.

    Notes
    -----
    ``k dD / L``; 1 in n is 1000 / n. Independent of speed: it is the design twist.

    References
    ----------
    .. [1] German EBO par. 6(4): cant ramps not steeper than 1 : 400.
    """
    return floats(peak_factor) * _per_length(cant_change_mm, length_m)


def rate_of_change_of_cant(
    cant_change_mm: ArrayLike, speed_kmh: ArrayLike, length_m: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Largest rate of change of cant with time that a train runs through.

    Parameters
    ----------
    cant_change_mm : array_like
        Change of cant over the ramp [mm], any shape.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.
    length_m : array_like
        L of the ramp [m].
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        dD/dt [mm/s], broadcast shape, the sign that of the change.

    Notes
    -----
    ``k dD V / (3.6 L)``.

    References
    ----------
    .. [1] Indian C & M Vol. I recommendations: 1 in 720 at 120 km/h is 46 mm/s.
    """
    return floats(peak_factor) * floats(speed_kmh) / KMH_PER_MS * _per_length(cant_change_mm, length_m)


def rate_of_change_of_deficiency(
    deficiency_change_mm: ArrayLike, speed_kmh: ArrayLike, length_m: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Largest rate of change of cant deficiency with time that a train runs through.

    Parameters
    ----------
    deficiency_change_mm : array_like
        Change of deficiency over the transition [mm], any shape; excess counts as deficiency 0 where a limit
        is checked.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.
    length_m : array_like
        L of the transition [m]; of a virtual one, the distance of the bogie centres.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        dI/dt [mm/s], broadcast shape, the sign that of the change.

    Notes
    -----
    ``k dI V / (3.6 L)``.

    References
    ----------
    .. [1] IRICEN notes Railway Curves, example 3.7 (virtual transition of 14.6 m).
    """
    return floats(peak_factor) * floats(speed_kmh) / KMH_PER_MS * _per_length(deficiency_change_mm, length_m)


def jerk(
    unbalanced_change_rate_mm_s: ArrayLike, rail_spacing_mm: ArrayLike, gravity_ms2: ArrayLike = GRAVITY_MS2
) -> FloatArray:
    """Change of the lateral acceleration in the track plane with time.

    Parameters
    ----------
    unbalanced_change_rate_mm_s : array_like
        Rate of change of D_EQ - D [mm/s], any shape; where there is no excess, that of the deficiency.
    rail_spacing_mm : array_like
        e [mm], a shape that broadcasts.
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        da_q/dt [m/s3], broadcast shape.

    Notes
    -----
    ``g / e`` times the rate: 55 mm/s on 1500 mm is 0.36 m/s3.

    References
    ----------
    .. [1] Derivative of :func:`cant.quantities.kinematics.unbalanced_acceleration` (linear form).
    """
    return divide(floats(gravity_ms2) * floats(unbalanced_change_rate_mm_s), rail_spacing_mm)


def roll_rate(cant_change_rate_mm_s: ArrayLike, rail_spacing_mm: ArrayLike) -> FloatArray:
    """Angular speed at which the track turns a vehicle about its long axis.

    Parameters
    ----------
    cant_change_rate_mm_s : array_like
        dD/dt [mm/s], any shape.
    rail_spacing_mm : array_like
        e [mm], a shape that broadcasts.

    Returns
    -------
    ndarray
        Roll rate [rad/s], broadcast shape.

    Notes
    -----
    ``(dD/dt) / e``, small angle: 1.3 % low at 240 mm of cant on 1500 mm. Roll on the springs is not in it.

    References
    ----------
    .. [1] Derivative of sin(phi) = D / e.
    """
    return divide(cant_change_rate_mm_s, rail_spacing_mm)
