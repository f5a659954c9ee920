"""What a speed, a radius and a cant do to a train: equilibrium, deficiency, excess, acceleration.

Speeds that follow from a cant stand in :mod:`cant.quantities.speeds`. Every curve is seen in its own hand:
cant is positive where the outer rail is the higher, and so is an acceleration towards the outside.

::

    centre of the curve <---            ___---O  outer rail
                             e   ___---       |
                           ___---             |  D       sin(phi) = D / e
        inner rail  O---___ phi ______________|
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.quantities.constants import KMH2_PER_MS2
from cant.units import GRAVITY_MS2


def centripetal_acceleration(speed_kmh: ArrayLike, radius_m: ArrayLike) -> FloatArray:
    """Horizontal acceleration towards the centre of the curve.

    Parameters
    ----------
    speed_kmh : array_like
        V [km/h], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts; ``inf`` is straight, a negative one curves the other way.

    Returns
    -------
    ndarray
        v^2 / R [m/s2], broadcast shape; 0 on straight track.

    Notes
    -----
    ``a = V^2 / (12.96 R)``. Holds for a point mass on a circular arc.

    References
    ----------
    .. [1] Newtonian mechanics of uniform circular motion.
    """
    return divide(floats(speed_kmh) ** 2, KMH2_PER_MS2 * floats(radius_m))


def equilibrium_cant(speed_kmh: ArrayLike, radius_m: ArrayLike, constant: ArrayLike) -> FloatArray:
    """Cant at which neither deficiency nor excess exists: the linear form of the standards.

    Parameters
    ----------
    speed_kmh : array_like
        V [km/h], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts; ``inf`` is straight, the sign goes over to the cant.
    constant : array_like
        C [mm m / (km/h)2]: as a standard prints it, or e / (12.96 g).

    Returns
    -------
    ndarray
        D_EQ [mm], broadcast shape; 0 on straight track.

    Notes
    -----
    ``D_EQ = C V^2 / R``. It takes tan = sin, and so lies above the exact form of the inclined plane
    (:mod:`cant.quantities.inclined_plane`) by the share ``1 - 1 / sqrt(1 + (D_EQ / e)^2)``: on 1500 mm
    0.05 mm at 60 mm, 0.9 mm (0.6 %) at 160 mm, 5.8 mm (1.9 %) at 300 mm. Limits are printed for it.

    References
    ----------
    .. [1] German EBO par. 40(7), C = 11.8; 49 CFR 213.57(b) in US units; other railways print their own C.
    """
    return divide(floats(constant) * floats(speed_kmh) ** 2, radius_m)


def cant_deficiency(equilibrium_cant_mm: ArrayLike, cant_mm: ArrayLike) -> FloatArray:
    """Cant that is lacking to equilibrium.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ in the curve's own hand [mm], any shape, 0 or more.
    cant_mm : array_like
        D [mm], a shape that broadcasts; negative where the outer rail is the lower.

    Returns
    -------
    ndarray
        I [mm], broadcast shape; 0 where there is excess.

    Notes
    -----
    ``I = max(D_EQ - D, 0)``.

    References
    ----------
    .. [1] Regulation (EU) 1299/2014, annex, 4.2.4.3.
    """
    return np.maximum(floats(equilibrium_cant_mm) - floats(cant_mm), 0.0)


def cant_excess(equilibrium_cant_mm: ArrayLike, cant_mm: ArrayLike) -> FloatArray:
    """Cant above equilibrium.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ in the curve's own hand [mm], any shape, 0 or more.
    cant_mm : array_like
        D [mm], a shape that broadcasts.

    Returns
    -------
    ndarray
        E [mm], broadcast shape; 0 where there is deficiency; D itself for a train that stands.

    Notes
    -----
    ``E = max(D - D_EQ, 0)``.

    References
    ----------
    .. [1] Common definition of the trade; Indian Railways Permanent Way Manual, chapter 4, uses it alike.
    """
    return np.maximum(floats(cant_mm) - floats(equilibrium_cant_mm), 0.0)


def unbalanced_acceleration(
    equilibrium_cant_mm: ArrayLike,
    cant_mm: ArrayLike,
    rail_spacing_mm: ArrayLike,
    gravity_ms2: ArrayLike = GRAVITY_MS2,
) -> FloatArray:
    """Lateral acceleration in the track plane that the cant leaves over.

    Parameters
    ----------
    equilibrium_cant_mm : array_like
        D_EQ in the curve's own hand [mm], any shape.
    cant_mm : array_like
        D [mm], a shape that broadcasts.
    rail_spacing_mm : array_like
        e [mm].
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        a_q [m/s2], broadcast shape; positive towards the outside (deficiency), negative towards the inside.

    Notes
    -----
    ``a_q = g (D_EQ - D) / e``: 153 mm on 1500 mm is 1.0 m/s2. The linear form; at 160 mm of cant it lies
    1.2 % above :func:`cant.quantities.inclined_plane.unbalanced_acceleration_exact`.

    References
    ----------
    .. [1] Polish regulation of 10 September 1998, par. 33 (limits as accelerations in the track plane).
    """
    unbalanced = floats(equilibrium_cant_mm) - floats(cant_mm)
    return divide(floats(gravity_ms2) * unbalanced, rail_spacing_mm)


def felt_acceleration(unbalanced_acceleration_ms2: ArrayLike, roll_coefficient: ArrayLike) -> FloatArray:
    """Lateral acceleration felt on the vehicle floor, where the body rolls outwards on its springs.

    Parameters
    ----------
    unbalanced_acceleration_ms2 : array_like
        a_q in the track plane [m/s2], any shape.
    roll_coefficient : array_like
        s, the roll (flexibility) coefficient [-], a shape that broadcasts; 0 for a rigid body, about 0.2 to
        0.4 for coaches (common practice, from memory), negative for a body that tilts inwards.

    Returns
    -------
    ndarray
        (1 + s) a_q [m/s2], broadcast shape, the sign that of a_q.

    Notes
    -----
    Quasi-static: steady curving, no track irregularity.

    References
    ----------
    .. [1] The definition of the roll coefficient of railway vehicles.
    """
    return (1.0 + floats(roll_coefficient)) * floats(unbalanced_acceleration_ms2)


def cant_from_acceleration(
    acceleration_ms2: ArrayLike, rail_spacing_mm: ArrayLike, gravity_ms2: ArrayLike = GRAVITY_MS2
) -> FloatArray:
    """Cant (deficiency or excess) that belongs to an acceleration in the track plane.

    Parameters
    ----------
    acceleration_ms2 : array_like
        a_q [m/s2], any shape.
    rail_spacing_mm : array_like
        e [mm], a shape that broadcasts.
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        a e / g [mm], broadcast shape, the sign that of a_q.

    Notes
    -----
    The inverse of the linear form, :func:`unbalanced_acceleration`: 0.85 m/s2 on 1500 mm is 130 mm.

    References
    ----------
    .. [1] Polish regulation of 10 September 1998, par. 33, table 3.9.
    """
    return divide(floats(acceleration_ms2) * floats(rail_spacing_mm), gravity_ms2)
