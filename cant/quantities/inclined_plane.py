"""The exact mechanics of a train on an inclined plane, and how far the standards' linear form parts from it.

Apart from :mod:`cant.quantities.kinematics` because no limit is printed for the exact form: it is there to
say how good the linear one is.
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.quantities.kinematics import centripetal_acceleration
from cant.units import GRAVITY_MS2


def equilibrium_cant_exact(
    speed_kmh: ArrayLike,
    radius_m: ArrayLike,
    rail_spacing_mm: ArrayLike,
    gravity_ms2: ArrayLike = GRAVITY_MS2,
) -> FloatArray:
    """Cant at which a plane inclined by sin(phi) = D / e carries the train without lateral force.

    Parameters
    ----------
    speed_kmh : array_like
        V [km/h], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts; ``inf`` is straight.
    rail_spacing_mm : array_like
        e [mm].
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        D_EQ [mm], broadcast shape, the sign that of the radius; always below e.

    Notes
    -----
    ``tan(phi) = a / g``, so ``D_EQ = e sin(atan(a / g)) = e a / sqrt(a^2 + g^2)``, ``a = V^2 / (12.96 R)``.
    Exact for a plane at any angle. How far the linear form parts from it tells
    :func:`linear_form_overstatement`.

    References
    ----------
    .. [1] Statics of the inclined plane.
    """
    a = centripetal_acceleration(speed_kmh, radius_m)
    return divide(floats(rail_spacing_mm) * a, np.hypot(a, floats(gravity_ms2)))


def linear_form_overstatement(equilibrium_cant_mm: ArrayLike, rail_spacing_mm: ArrayLike) -> FloatArray:
    """How far the linear equilibrium cant lies above the exact one.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ of the linear form [mm], any shape, either sign.
    rail_spacing_mm : array_like
        e [mm], a shape that broadcasts.

    Returns
    -------
    ndarray
        Linear minus exact [mm], broadcast shape, the sign that of D_EQ.

    Notes
    -----
    ``D_EQ (1 - 1 / sqrt(1 + (D_EQ / e)^2))``, about ``D_EQ^3 / (2 e^2)``. Holds where C = e / (12.96 g).

    References
    ----------
    .. [1] Difference of :func:`cant.quantities.kinematics.equilibrium_cant` and
       :func:`equilibrium_cant_exact`, in closed form.
    """
    linear = floats(equilibrium_cant_mm)
    return linear - divide(linear, np.hypot(1.0, divide(linear, rail_spacing_mm)))


def unbalanced_acceleration_exact(
    speed_kmh: ArrayLike,
    radius_m: ArrayLike,
    cant_mm: ArrayLike,
    rail_spacing_mm: ArrayLike,
    gravity_ms2: ArrayLike = GRAVITY_MS2,
) -> FloatArray:
    """Lateral acceleration in the plane of a track inclined by sin(phi) = D / e.

    Parameters
    ----------
    speed_kmh, radius_m : array_like
        V [km/h], R [m], any shape; ``inf`` is straight.
    cant_mm, rail_spacing_mm : array_like
        D, e [mm], shapes that broadcast; |D| at most e, else nan.
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        a_q [m/s2], broadcast shape; positive towards the outside.

    Notes
    -----
    ``a_q = a cos(phi) - g sin(phi)``, ``a = V^2 / (12.96 R)``. Exact for a plane at any angle.

    References
    ----------
    .. [1] Mechanics of the inclined plane.
    """
    sine = divide(cant_mm, rail_spacing_mm)
    with np.errstate(invalid="ignore"):
        cosine = np.sqrt(1.0 - sine**2)
    return centripetal_acceleration(speed_kmh, radius_m) * cosine - floats(gravity_ms2) * sine
