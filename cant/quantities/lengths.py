"""The length that a transition needs, and the speed that its length allows.

Apart from :mod:`cant.quantities.transitions`, whose rates and gradient these turn round.
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.units import KMH_PER_MS


def length_for_gradient(
    cant_change_mm: ArrayLike, gradient_limit_mm_per_m: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Ramp length that a limit of the cant gradient needs.

    Parameters
    ----------
    cant_change_mm : array_like
        Change of cant [mm], any shape, either sign.
    gradient_limit_mm_per_m : array_like
        Limit [mm/m], a shape that broadcasts; ``inf`` where there is none.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        L [m], broadcast shape.

    Notes
    -----
    ``L = k |dD| / limit``.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.transitions.cant_gradient`. Indian curve sheet: 0.72 Ca
       is 1 in 720.
    """
    return divide(floats(peak_factor) * np.abs(floats(cant_change_mm)), gradient_limit_mm_per_m)


def length_for_rate(
    change_mm: ArrayLike, speed_kmh: ArrayLike, rate_limit_mm_s: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Length that a limit of a rate of change (of cant, or of deficiency) needs.

    Parameters
    ----------
    change_mm : array_like
        Change of cant or of deficiency [mm], any shape, either sign.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.
    rate_limit_mm_s : array_like
        Limit [mm/s]; ``inf`` where there is none.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        L [m], broadcast shape.

    Notes
    -----
    ``L = k |change| V / (3.6 limit)``.

    References
    ----------
    .. [1] Japanese permanent-way practice: L = 0.008 C V is 34.7 mm/s, L = 0.009 Cd V is 30.9 mm/s.
    """
    top = floats(peak_factor) * np.abs(floats(change_mm)) * floats(speed_kmh)
    return divide(top, KMH_PER_MS * floats(rate_limit_mm_s))


def needed_length(
    cant_change_mm: ArrayLike,
    deficiency_change_mm: ArrayLike,
    speed_kmh: ArrayLike,
    gradient_limit_mm_per_m: ArrayLike,
    cant_rate_limit_mm_s: ArrayLike,
    deficiency_rate_limit_mm_s: ArrayLike,
    peak_factor: ArrayLike = 1.0,
) -> FloatArray:
    """Transition length that keeps gradient and both rates of change.

    Parameters
    ----------
    cant_change_mm, deficiency_change_mm : array_like
        Changes over the transition [mm], any shape, either sign.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.
    gradient_limit_mm_per_m, cant_rate_limit_mm_s, deficiency_rate_limit_mm_s : array_like
        Limits [mm/m, mm/s, mm/s]; ``inf`` where there is none.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        L [m], broadcast shape: the longest of the three.

    References
    ----------
    .. [1] Of this form are the Japanese 0.8 C, 0.008 C V, 0.009 Cd V and the Indian 0.72 Ca, 0.0056 Ca V,
       0.0056 Cd V.
    """
    by_gradient = length_for_gradient(cant_change_mm, gradient_limit_mm_per_m, peak_factor)
    by_cant = length_for_rate(cant_change_mm, speed_kmh, cant_rate_limit_mm_s, peak_factor)
    by_deficiency = length_for_rate(deficiency_change_mm, speed_kmh, deficiency_rate_limit_mm_s, peak_factor)
    return np.maximum(np.maximum(by_gradient, by_cant), by_deficiency)


def speed_for_rate(
    cant_mm: ArrayLike,
    radius_m: ArrayLike,
    length_m: ArrayLike,
    rate_limit_mm_s: ArrayLike,
    constant: ArrayLike,
    peak_factor: ArrayLike = 1.0,
) -> FloatArray:
    """Highest speed at which the rate of change of deficiency keeps its limit, straight to arc.

    Parameters
    ----------
    cant_mm, radius_m, length_m : array_like
        D [mm], R [m], L of the transition [m], shapes that broadcast.
    rate_limit_mm_s : array_like
        Limit of dI/dt [mm/s].
    constant : array_like
        C [mm m / (km/h)2].
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        V [km/h], broadcast shape; ``inf`` on straight track.

    Notes
    -----
    The root of ``k (C V^2 / R - D) V = 3.6 L limit``: a cubic in V, of which exactly one root is at or above
    the equilibrium speed. Found by Newton's method from above, where it cannot overshoot.

    References
    ----------
    .. [1] Inverse of
       :func:`cant.quantities.transitions.rate_of_change_of_deficiency` with the deficiency of the same speed.
    """
    cant, curvature = np.maximum(floats(cant_mm), 0.0), divide(constant, np.abs(floats(radius_m)))
    room = divide(KMH_PER_MS * floats(length_m) * floats(rate_limit_mm_s), peak_factor)
    # V^3 = (D V + room) / c with V <= sqrt(D / c) + cbrt(room / c): a start that lies above the root.
    speed = np.sqrt(divide(cant, curvature)) + np.cbrt(divide(room, curvature))
    with np.errstate(invalid="ignore"):
        for _ in range(20):
            step = divide((curvature * speed**2 - cant) * speed - room, 3 * curvature * speed**2 - cant)
            speed = np.where(np.isfinite(step), speed - step, speed)
    straight = (curvature == 0) & ~np.isnan(cant + room)
    return np.where(straight, np.inf, speed)[()]
