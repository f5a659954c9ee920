"""The constants behind the formulas: symbol, value, unit, meaning and source, and how C and e turn over.

Apart from the formulas because a printed constant is a fact of a document, not of physics: the same gauge has
several, and a plan says which one it used.
"""

from __future__ import annotations

from dataclasses import dataclass

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.units import FOOT_M, GRAVITY_MS2, INCH_MM, KMH_PER_MS, MILE_KM, STANDARD_GRAVITY_MS2

KMH2_PER_MS2 = KMH_PER_MS**2
"""(km/h)^2 in one (m/s)^2: 12.96."""


@dataclass(frozen=True, slots=True)
class Constant:
    """One constant: symbol, value, unit, what it means, and where it is from."""

    symbol: str
    value: float
    unit: str
    meaning: str
    source: str


CONSTANTS: tuple[Constant, ...] = (
    Constant(
        "g",
        GRAVITY_MS2,
        "m/s2",
        "gravity as railway standards print it",
        "Polish regulation of 1998, par. 33",
    ),
    Constant("g_n", STANDARD_GRAVITY_MS2, "m/s2", "standard acceleration of gravity", "NIST SP 811, B.8"),
    Constant(
        "12.96", KMH2_PER_MS2, "(km/h)2/(m/s)2", "3.6 squared: speeds in km/h", "definition of the units"
    ),
    Constant("in", INCH_MM, "mm", "inch", "NIST SP 811, B.8"),
    Constant("ft", FOOT_M, "m", "foot", "NIST SP 811, B.8"),
    Constant("mi", MILE_KM, "km", "mile", "NIST SP 811, B.8"),
)
"""What the formulas rest on. Rail spacings and printed constants belong to the limit sets."""


def constant_from_rail_spacing(
    rail_spacing_mm: ArrayLike, gravity_ms2: ArrayLike = GRAVITY_MS2
) -> FloatArray:
    """Equilibrium constant C that a rail spacing gives.

    Parameters
    ----------
    rail_spacing_mm : array_like
        Distance e of the two wheel-rail contact points [mm], any shape; about gauge plus one rail-head width.
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        C of ``D_EQ = C V^2 / R`` [mm m / (km/h)2], broadcast shape.

    Notes
    -----
    ``C = e / (12.96 g)``. 1500 mm gives 11.798; 1750 mm 13.765; 1120 mm 8.809. Positive for every real track.
    The gauge in the place of e (1067 mm: 8.4) gives 4 to 5 % less.

    References
    ----------
    .. [1] Polish regulation of 10 September 1998 (Dz.U. 1998 nr 151 poz. 987), par. 33: g = 9.81 m/s2 and the
       distance between the rails' centre lines.
    """
    return divide(rail_spacing_mm, KMH2_PER_MS2 * floats(gravity_ms2))


def rail_spacing_from_constant(constant: ArrayLike, gravity_ms2: ArrayLike = GRAVITY_MS2) -> FloatArray:
    """Rail spacing e that a printed constant implies.

    Parameters
    ----------
    constant : array_like
        C of ``D_EQ = C V^2 / R`` [mm m / (km/h)2], any shape.
    gravity_ms2 : array_like
        g [m/s2].

    Returns
    -------
    ndarray
        e [mm], broadcast shape.

    Notes
    -----
    ``e = 12.96 g C``, the inverse of :func:`constant_from_rail_spacing`. Holds for any C > 0.

    References
    ----------
    .. [1] As for :func:`constant_from_rail_spacing`.
    """
    return KMH2_PER_MS2 * floats(gravity_ms2) * floats(constant)


def constant_from_us(us_constant: ArrayLike) -> FloatArray:
    """Equilibrium constant in metric units from the American one.

    Parameters
    ----------
    us_constant : array_like
        k of ``E = k V^2 D``, D the degree of curve on a 100 ft chord [in / (mph2 deg)], any shape.

    Returns
    -------
    ndarray
        C of ``D_EQ = C V^2 / R`` [mm m / (km/h)2], broadcast shape.

    Notes
    -----
    Degree and radius stand in inverse proportion only in the arc definition, ``R = 5729.578 ft / D``, which
    is used here: ``C = 25.4 k . 5729.578 . 0.3048 / 1.609344^2``. 0.0007 gives 11.989, e = 1524.2 mm. With
    the chord definition the two differ by less than 0.04 % up to 5 degrees.

    References
    ----------
    .. [1] 49 CFR 213.57(b), ``Vmax = sqrt((Ea + Eu) / (0.0007 D))``.
    .. [2] MIL-HDBK-1005/6, ``R = 5729.578 / D``.
    """
    degree_feet = 180.0 * 100.0 / 3.141592653589793
    return floats(us_constant) * (INCH_MM * degree_feet * FOOT_M / MILE_KM**2)
