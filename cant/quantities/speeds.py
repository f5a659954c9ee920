"""The speeds and radii that belong to a cant and its limits: the formulas of equilibrium turned round.

Apart from :mod:`cant.quantities.kinematics` because these answer "how fast, how slow, how sharp may it be?".
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats


def _speed_of(cant_mm: FloatArray, radius_m: ArrayLike, constant: ArrayLike) -> FloatArray:
    """V whose equilibrium cant is ``cant_mm`` [km/h]; 0 where that is not positive, inf on straight track."""
    with np.errstate(invalid="ignore"):
        square = divide(np.maximum(cant_mm, 0.0), constant) * np.abs(floats(radius_m))
        zero = (cant_mm <= 0.0) & ~np.isnan(floats(radius_m)) & ~np.isnan(floats(constant))
        return np.sqrt(np.where(zero, 0.0, square))[()]


def equilibrium_speed(cant_mm: ArrayLike, radius_m: ArrayLike, constant: ArrayLike) -> FloatArray:
    """Speed at which neither deficiency nor excess exists with the cant as set.

    Parameters
    ----------
    cant_mm : array_like
        D in the curve's own hand [mm], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts; its sign does not matter.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        V [km/h], broadcast shape; 0 where the cant is 0 or negative, ``inf`` on straight track with cant.

    Notes
    -----
    ``V = sqrt(R D / C)``.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.kinematics.equilibrium_cant`.
    """
    return _speed_of(floats(cant_mm), radius_m, constant)


def permissible_speed(
    cant_mm: ArrayLike, deficiency_limit_mm: ArrayLike, radius_m: ArrayLike, constant: ArrayLike
) -> FloatArray:
    """Highest speed at which the cant deficiency keeps its limit.

    Parameters
    ----------
    cant_mm : array_like
        D in the curve's own hand [mm], any shape; negative on a contrary branch.
    deficiency_limit_mm : array_like
        I_lim [mm], a shape that broadcasts.
    radius_m : array_like
        R [m]; its sign does not matter.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        V [km/h], broadcast shape; 0 where D + I_lim is 0 or less, ``inf`` on straight track.

    Notes
    -----
    ``V = sqrt(R (D + I_lim) / C)``. Before any speed step; deficiency alone.

    References
    ----------
    .. [1] 49 CFR 213.57(b), ``Vmax = sqrt((Ea + Eu) / (0.0007 D))``.
    .. [2] German EBO par. 40(7), ``v = sqrt(r / 11.8 . (u + u_f))``.
    """
    return _speed_of(floats(cant_mm) + floats(deficiency_limit_mm), radius_m, constant)


def lowest_speed(
    cant_mm: ArrayLike, excess_limit_mm: ArrayLike, radius_m: ArrayLike, constant: ArrayLike
) -> FloatArray:
    """Speed below which the cant excess goes over its limit.

    Parameters
    ----------
    cant_mm : array_like
        D in the curve's own hand [mm], any shape.
    excess_limit_mm : array_like
        E_lim [mm], a shape that broadcasts; ``inf`` where excess is not limited.
    radius_m : array_like
        R [m]; its sign does not matter.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        V [km/h], broadcast shape; 0 where the excess never goes over, ``inf`` on straight track with more
        cant than the limit.

    Notes
    -----
    ``V = sqrt(R (D - E_lim) / C)`` where D > E_lim.

    References
    ----------
    .. [1] Inverse of :func:`cant.quantities.kinematics.cant_excess`.
    """
    return _speed_of(floats(cant_mm) - floats(excess_limit_mm), radius_m, constant)


def smallest_radius(
    speed_kmh: ArrayLike, cant_mm: ArrayLike, deficiency_limit_mm: ArrayLike, constant: ArrayLike
) -> FloatArray:
    """Sharpest radius that a speed allows with a cant.

    Parameters
    ----------
    speed_kmh : array_like
        V [km/h], any shape.
    cant_mm, deficiency_limit_mm : array_like
        D, I_lim [mm], shapes that broadcast.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        R [m], broadcast shape, positive; ``inf`` where D + I_lim is 0 or less, nan there for a speed of 0.

    Notes
    -----
    ``R = C V^2 / (D + I_lim)``.

    References
    ----------
    .. [1] Dutch tunnel handbook (metro), table 38.1, follows from it with D + I = 240 and 210 mm.
    """
    available = np.maximum(floats(cant_mm) + floats(deficiency_limit_mm), 0.0)
    return divide(floats(constant) * floats(speed_kmh) ** 2, available)


def smallest_radius_for_mix(
    fastest_kmh: ArrayLike,
    slowest_kmh: ArrayLike,
    deficiency_limit_mm: ArrayLike,
    excess_limit_mm: ArrayLike,
    constant: ArrayLike,
) -> FloatArray:
    """Radius below which no cant whatever serves a fast and a slow class together.

    Parameters
    ----------
    fastest_kmh, slowest_kmh : array_like
        Speeds of the two classes [km/h], any shape.
    deficiency_limit_mm : array_like
        I_lim of the fast class [mm], a shape that broadcasts.
    excess_limit_mm : array_like
        E_lim of the slow class [mm].
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        R [m], broadcast shape; 0 where the first is not the faster.

    Notes
    -----
    The fast class wants ``D >= C V_f^2 / R - I_lim``, the slow one ``D <= C V_s^2 / R + E_lim``: both can be
    had where ``R >= C (V_f^2 - V_s^2) / (I_lim + E_lim)``. Largest cant, ramps and rates only narrow it.

    References
    ----------
    .. [1] Derived here from the definitions of deficiency and excess; common practice of the trade.
    """
    spread = np.maximum(floats(fastest_kmh) ** 2 - floats(slowest_kmh) ** 2, 0.0)
    return divide(floats(constant) * spread, floats(deficiency_limit_mm) + floats(excess_limit_mm))


def rms_speed(speed_kmh: ArrayLike, weight: ArrayLike, axis: int = -1) -> FloatArray:
    """Weighted root-mean-square speed of a mix of classes.

    Parameters
    ----------
    speed_kmh : array_like
        V of each class [km/h], shape (..., n_classes) along ``axis``; nan where a class does not run.
    weight : array_like
        Weight of each class [-], a shape that broadcasts: trains a day times mass for the tonnage mean.
    axis : int
        Axis of the classes.

    Returns
    -------
    ndarray
        V [km/h], the shape without that axis; nan where no class has weight.

    Notes
    -----
    ``V = sqrt(sum w V^2 / sum w)``. Its equilibrium cant is the minimiser of ``sum w (D_EQ - D)^2``.

    References
    ----------
    .. [1] Permanent-way practice in Japan, ``sqrt(sum V^2 / n)``; with tonnage weights in China.
    """
    speed, weights = np.broadcast_arrays(floats(speed_kmh), floats(weight))
    runs = ~np.isnan(speed)
    total = np.sum(np.where(runs, weights, 0.0), axis=axis)
    square = np.sum(np.where(runs, weights * np.where(runs, speed, 0.0) ** 2, 0.0), axis=axis)
    return np.sqrt(divide(square, total))


def speed_on_step(speed_kmh: ArrayLike, step_kmh: ArrayLike) -> FloatArray:
    """Highest multiple of the speed step that a speed reaches.

    Parameters
    ----------
    speed_kmh : array_like
        V [km/h], any shape, 0 or more.
    step_kmh : array_like
        Step of posted speeds [km/h], a shape that broadcasts, positive.

    Returns
    -------
    ndarray
        V [km/h], broadcast shape; never more than ``speed_kmh`` save for 1e-9 of a step of rounding.

    Notes
    -----
    ``floor(V / step + 1e-9) step``.

    References
    ----------
    .. [1] South Central Railway curve note: speeds posted are rounded down to 5 km/h.
    """
    step = floats(step_kmh)
    return np.floor(divide(speed_kmh, step) + 1e-9) * step


def time_over(length_m: ArrayLike, speed_kmh: ArrayLike) -> FloatArray:
    """Time a train takes over a length at constant speed.

    Parameters
    ----------
    length_m : array_like
        Length [m], any shape.
    speed_kmh : array_like
        V [km/h], a shape that broadcasts.

    Returns
    -------
    ndarray
        3.6 length / V [s], broadcast shape; ``inf`` for a train that stands.

    Notes
    -----
    Braking and getting away again are left out: a loss computed with it holds over the curve alone.

    References
    ----------
    .. [1] Definition of speed.
    """
    return divide(3.6 * floats(length_m), speed_kmh)
