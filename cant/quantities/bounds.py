"""The cant at which each limit is just kept: every rule turned round, so that checking and bounding agree.

A lower bound comes from what lacks cant (deficiency, its rate, felt acceleration outwards), an upper one from
what has too much of it. Limits of ``inf`` bound nothing.
"""

from __future__ import annotations

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.units import GRAVITY_MS2, KMH_PER_MS


def least_cant_for_deficiency(equilibrium_cant_mm: ArrayLike, deficiency_limit_mm: ArrayLike) -> FloatArray:
    """Least cant at which the cant deficiency keeps its limit.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ of the class [mm], any shape.
    deficiency_limit_mm : array_like
        I_lim [mm], a shape that broadcasts.

    Returns
    -------
    ndarray
        D [mm], broadcast shape; negative where any cant will do.

    Notes
    -----
    ``D_EQ - I_lim``.

    References
    ----------
    .. [1] From the definition of deficiency; the German term for it is the least cant of a speed.
    """
    return floats(equilibrium_cant_mm) - floats(deficiency_limit_mm)


def most_cant_for_excess(equilibrium_cant_mm: ArrayLike, excess_limit_mm: ArrayLike) -> FloatArray:
    """Most cant at which the cant excess keeps its limit.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ of the class [mm], any shape; 0 for a train that stands.
    excess_limit_mm : array_like
        E_lim [mm], a shape that broadcasts.

    Returns
    -------
    ndarray
        D [mm], broadcast shape.

    Notes
    -----
    ``D_EQ + E_lim``.

    References
    ----------
    .. [1] From the definition of excess.
    """
    return floats(equilibrium_cant_mm) + floats(excess_limit_mm)


def unbalance_for_felt_acceleration(
    acceleration_limit_ms2: ArrayLike,
    roll_coefficient: ArrayLike,
    rail_spacing_mm: ArrayLike,
    gravity_ms2: ArrayLike = GRAVITY_MS2,
) -> FloatArray:
    """Deficiency (or excess) at which the acceleration felt on the floor reaches its limit.

    Parameters
    ----------
    acceleration_limit_ms2 : array_like
        Limit of the felt acceleration [m/s2], any shape.
    roll_coefficient : array_like
        s [-], a shape that broadcasts; -1 feels nothing.
    rail_spacing_mm : array_like
        e [mm].
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        |D_EQ - D| [mm], broadcast shape: taken from D_EQ it is the least cant, added to it the most.

    Notes
    -----
    ``a e / (g (1 + s))``.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.kinematics.felt_acceleration`.
    """
    track_plane = divide(acceleration_limit_ms2, 1.0 + floats(roll_coefficient))
    return divide(track_plane * floats(rail_spacing_mm), gravity_ms2)


def most_cant_for_gradient(
    gradient_limit_mm_per_m: ArrayLike, length_m: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Most change of cant that a ramp can hold within a limit of its gradient.

    Parameters
    ----------
    gradient_limit_mm_per_m : array_like
        Limit [mm/m], any shape.
    length_m : array_like
        L of the ramp [m], a shape that broadcasts.
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        dD [mm], broadcast shape.

    Notes
    -----
    ``limit L / k``.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.transitions.cant_gradient`.
    """
    return divide(floats(gradient_limit_mm_per_m) * floats(length_m), peak_factor)


def most_change_for_rate(
    rate_limit_mm_s: ArrayLike, speed_kmh: ArrayLike, length_m: ArrayLike, peak_factor: ArrayLike = 1.0
) -> FloatArray:
    """Most change (of cant, or of deficiency) within a limit of its rate.

    Parameters
    ----------
    rate_limit_mm_s : array_like
        Limit [mm/s], any shape.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.
    length_m : array_like
        L [m].
    peak_factor : array_like
        Peak over mean of the shape [-].

    Returns
    -------
    ndarray
        Change [mm], broadcast shape; ``inf`` for a train that stands. For the cant of a curve it is the upper
        bound; for the deficiency, D_EQ less it is the lower bound of the cant.

    Notes
    -----
    ``3.6 limit L / (k V)``.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.transitions.rate_of_change_of_cant`.
    """
    return divide(
        KMH_PER_MS * floats(rate_limit_mm_s) * floats(length_m), floats(peak_factor) * floats(speed_kmh)
    )


def utilisation(value: ArrayLike, limit: ArrayLike) -> FloatArray:
    """Share of a limit that a value uses.

    Parameters
    ----------
    value, limit : array_like
        In the same unit [any], shapes that broadcast; the value positive.

    Returns
    -------
    ndarray
        value / limit [-], broadcast shape; 0 where not limited.

    References
    ----------
    .. [1] Usual figure of a check; no source of its own.
    """
    return divide(value, limit)
