"""The shapes of a transition: how cant and curvature grow along it, their peak, and how far the arc moves in.

Apart from the lengths and rates because a shape is a function of the share t = x / L of the way alone. Cant
and curvature follow the same shape.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from cant.errors import InputError
from cant.model.curves import SHAPES
from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats

_PI = float(np.pi)


def _helmert(t: FloatArray) -> FloatArray:
    return np.where(t <= 0.5, 2 * t**2, 1 - 2 * (1 - t) ** 2)


_PROFILES: Mapping[str, Callable[[FloatArray], FloatArray]] = {
    "linear": lambda t: t,
    "bloss": lambda t: t**2 * (3 - 2 * t),
    "cosine": lambda t: (1 - np.cos(_PI * t)) / 2,
    "helmert": _helmert,
    "sine": lambda t: t - np.sin(2 * _PI * t) / (2 * _PI),
}
_SLOPES: Mapping[str, Callable[[FloatArray], FloatArray]] = {
    "linear": lambda t: 1 + 0 * t,
    "bloss": lambda t: 6 * t * (1 - t),
    "cosine": lambda t: _PI / 2 * np.sin(_PI * t),
    "helmert": lambda t: 4 * np.minimum(t, 1 - t),
    "sine": lambda t: 1 - np.cos(2 * _PI * t),
}
SHIFT_FACTORS: Mapping[str, float] = {
    "linear": 1 / 24,
    "bloss": 1 / 40,
    "cosine": 1 / 8 - 1 / _PI**2,
    "helmert": 1 / 48,
    "sine": 1 / 24 - 1 / (4 * _PI**2),
}
"""Shift of the arc over L^2 / R [-]: the integral of (1 - t) f(t) from 0 to 1, less 1/8."""


def _known(shape: str) -> str:
    if shape not in SHAPES:
        message = f"unknown shape '{shape}' of a transition: it is one of {', '.join(SHAPES)}"
        raise InputError(message)
    return shape


def profile(share: ArrayLike, shape: str) -> FloatArray:
    """Share of the whole change of cant that is reached at a share of the way.

    Parameters
    ----------
    share : array_like
        t = x / L [-], any shape; outside 0 to 1 the change has not begun or is complete.
    shape : str
        ``linear``, ``bloss``, ``cosine``, ``helmert`` or ``sine`` [-].

    Returns
    -------
    ndarray
        f(t) [-], the shape of ``share``, from 0 to 1.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    linear ``t``; Bloss ``3 t^2 - 2 t^3``; cosine ``(1 - cos(pi t)) / 2``; Helmert (Schramm) ``2 t^2`` up to
    the middle and ``1 - 2 (1 - t)^2`` after it; sine (Klein) ``t - sin(2 pi t) / (2 pi)``.

    References
    ----------
    .. [1] The definitions of the named curves; the Bloss curve is checked in tests against the ordinates of a
       published guide.
    """
    return _PROFILES[_known(shape)](np.clip(floats(share), 0.0, 1.0))[()]


def profile_slope(share: ArrayLike, shape: str) -> FloatArray:
    """Slope of the profile: gradient over mean gradient at a share of the way.

    Parameters
    ----------
    share : array_like
        t = x / L [-], any shape.
    shape : str
        As for :func:`profile` [-].

    Returns
    -------
    ndarray
        f'(t) [-], the shape of ``share``; 0 outside 0 to 1, at the ends that from inside.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    linear 1; Bloss ``6 t (1 - t)``; cosine ``pi / 2 sin(pi t)``; Helmert ``4 min(t, 1 - t)``; sine
    ``1 - cos(2 pi t)``.

    References
    ----------
    .. [1] Derivative of :func:`profile`; checked in tests against numerical differentiation.
    """
    t = floats(share)
    inside = (t >= 0) & (t <= 1) | np.isnan(t)
    return np.where(inside, _SLOPES[_known(shape)](np.clip(t, 0.0, 1.0)), 0.0)[()]


def _factors(table: Mapping[str, float], shape: str | ArrayLike) -> FloatArray:
    """Look factors up for one shape or an array of shapes."""
    words, place = np.unique(np.asarray(shape, dtype=np.str_), return_inverse=True)
    values = floats([table[_known(str(word))] for word in words])
    return values[place].reshape(np.shape(shape))[()]


def peak_factor(shape: str | ArrayLike) -> FloatArray:
    """Peak gradient over mean gradient of a shape: it multiplies cant gradient and both rates of change.

    Parameters
    ----------
    shape : str or array_like of str
        Shape of each transition [-], any array shape.

    Returns
    -------
    ndarray
        Factor [-], the same array shape: linear 1, Bloss 1.5, cosine pi / 2, Helmert 2, sine 2.

    Raises
    ------
    InputError
        For an unknown shape.

    References
    ----------
    .. [1] Largest value of :func:`profile_slope`, which for all these shapes lies in the middle.
    """
    return _factors(SHAPES, shape)


def shift_of_arc(length_m: ArrayLike, radius_m: ArrayLike, shape: str | ArrayLike = "linear") -> FloatArray:
    """How far a transition moves the arc inwards from the tangent.

    Parameters
    ----------
    length_m : array_like
        L [m], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts; ``inf`` is straight.
    shape : str or array_like of str
        Shape of the transition [-].

    Returns
    -------
    ndarray
        p [m], broadcast shape; 0 on straight track.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    ``p = factor L^2 / R``: linear (clothoid, cubic parabola) 1/24, Bloss 1/40, cosine 1/8 - 1/pi^2, Helmert
    1/48, sine 1/24 - 1/(4 pi^2). First order in L / R: for L = R / 3 it is 0.1 % too large.

    References
    ----------
    .. [1] Derived: twice the integral of the curvature, less ``R (1 - cos(L / (2 R)))``. Worked design R 780,
       L 120 (Indonesia): 0.77 m.
    """
    return divide(_factors(SHIFT_FACTORS, shape) * floats(length_m) ** 2, radius_m)
