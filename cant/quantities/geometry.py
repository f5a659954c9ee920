"""Radius from what is measured or written in its place: versine and chord, each kind of degree of curve.

The same number of degrees names radii that differ by a factor of 1.5 from one country to another; a kind is
never guessed here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from cant.errors import InputError
from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.units import FOOT_M


@dataclass(frozen=True, slots=True)
class DegreeKind:
    """A definition of the degree of curve: the length that one degree of turn belongs to.

    Attributes
    ----------
    length_m : float
        Length of arc or chord [m].
    chord : bool
        True where it is a chord, False where an arc.
    words : str
        Who uses it.
    """

    length_m: float
    chord: bool
    words: str


DEGREE_KINDS: dict[str, DegreeKind] = {
    "100 ft chord": DegreeKind(100 * FOOT_M, True, "North American railways: 1 degree is 1746.40 m"),
    "100 ft arc": DegreeKind(
        100 * FOOT_M, False, "North American roads, some railways: 1 degree is 1746.38 m"
    ),
    "30.5 m chord": DegreeKind(30.5, True, "Indian railways, exact: 1 degree is 1747.5 m"),
    "1750/D": DegreeKind(1750 * np.pi / 180, False, "Indian railways, rounded rule: 1 degree is 1750 m"),
    "20 m chord": DegreeKind(20.0, True, "Brazil and much of Latin America: 1 degree is 1145.9 m"),
    "20 m arc": DegreeKind(20.0, False, "metric arc definition: 1 degree is 1145.9 m"),
}
"""Kinds of degree of curve, by the name that a person would use."""


def _kind(name: str) -> DegreeKind:
    if name not in DEGREE_KINDS:
        message = f"unknown kind '{name}' of degree of curve: it is one of {', '.join(DEGREE_KINDS)}"
        raise InputError(message)
    return DEGREE_KINDS[name]


def radius_from_degree(degree: ArrayLike, kind: str) -> FloatArray:
    """Radius of a curve that is given in degrees.

    Parameters
    ----------
    degree : array_like
        D [deg], any shape; 0 is straight, the sign goes over to the radius.
    kind : str
        One of :data:`DEGREE_KINDS` [-].

    Returns
    -------
    ndarray
        R [m], the same shape; ``inf`` for 0.

    Raises
    ------
    InputError
        For an unknown kind.

    Notes
    -----
    Chord c: ``R = (c / 2) / sin(D / 2)``; arc s: ``R = 180 s / (pi D)``. A chord definition holds up to 180
    degrees.

    References
    ----------
    .. [1] MIL-HDBK-1005/6: R = 5729.578 / D ft (100 ft arc).
    .. [2] Indian Railways Permanent Way Manual, para 401: 30.5 m chord, 1750 / D.
    """
    definition, turn = _kind(kind), np.radians(floats(degree))
    if definition.chord:
        return divide(definition.length_m / 2.0, np.sin(turn / 2.0))
    return divide(definition.length_m, turn)


def degree_from_radius(radius_m: ArrayLike, kind: str) -> FloatArray:
    """Degree of curve of a radius.

    Parameters
    ----------
    radius_m : array_like
        R [m], any shape; ``inf`` is straight.
    kind : str
        One of :data:`DEGREE_KINDS` [-].

    Returns
    -------
    ndarray
        D [deg], the same shape; 0 for straight, nan where the radius is below half the chord.

    Raises
    ------
    InputError
        For an unknown kind.

    Notes
    -----
    Inverse of :func:`radius_from_degree`.

    References
    ----------
    .. [1] As for :func:`radius_from_degree`.
    """
    definition = _kind(kind)
    if definition.chord:
        with np.errstate(invalid="ignore"):
            return np.degrees(2.0 * np.arcsin(divide(definition.length_m / 2.0, radius_m)))
    return np.degrees(divide(definition.length_m, radius_m))


def radius_from_versine(versine_mm: ArrayLike, chord_m: ArrayLike) -> FloatArray:
    """Radius from the versine in the middle of a chord, as the trade computes it.

    Parameters
    ----------
    versine_mm : array_like
        v, the offset of the rail from the middle of the chord [mm], any shape; 0 is straight.
    chord_m : array_like
        c [m], a shape that broadcasts.

    Returns
    -------
    ndarray
        R [m], broadcast shape, the sign that of the versine; ``inf`` for 0.

    Notes
    -----
    ``R = c^2 / (8 v)`` in one unit: 50000 / v for a chord of 20 m, 12500 / v for 10 m. The circle is
    larger by v / 2, which is 0.04 m at R 600 and a chord of 20 m.

    References
    ----------
    .. [1] Indian Railways Permanent Way Manual, para 401: R = C^2 / 8V.
    """
    return divide(125.0 * floats(chord_m) ** 2, versine_mm)


def versine_from_radius(radius_m: ArrayLike, chord_m: ArrayLike) -> FloatArray:
    """Versine in the middle of a chord, as the trade computes it.

    Parameters
    ----------
    radius_m : array_like
        R [m], any shape; ``inf`` is straight.
    chord_m : array_like
        c [m], a shape that broadcasts.

    Returns
    -------
    ndarray
        v [mm], broadcast shape, the sign that of the radius.

    Notes
    -----
    ``v = c^2 / (8 R)``: 125 c^2 / R in mm with c and R in m.

    References
    ----------
    .. [1] Indian Railways Permanent Way Manual, para 401: R = C^2 / 8V.
    """
    return divide(125.0 * floats(chord_m) ** 2, radius_m)


def versine_of_circle(radius_m: ArrayLike, chord_m: ArrayLike) -> FloatArray:
    """Versine of a true circle.

    Parameters
    ----------
    radius_m : array_like
        R [m], any shape, positive, finite; not below half the chord, else nan.
    chord_m : array_like
        c [m], a shape that broadcasts.

    Returns
    -------
    ndarray
        v [mm], broadcast shape.

    Notes
    -----
    ``v = R - sqrt(R^2 - c^2 / 4)``, written without the difference of two large numbers.

    References
    ----------
    .. [1] Pythagoras. US Army TM 5-628: on a chord of 62 ft one inch is one degree (exact 1.006 in).
    """
    radius, half = floats(radius_m), floats(chord_m) / 2.0
    with np.errstate(invalid="ignore"):
        return divide(1000.0 * half**2, radius + np.sqrt(radius**2 - half**2))


def turn_of_curve(
    arc_m: ArrayLike, radius_m: ArrayLike, transition_in_m: ArrayLike, transition_out_m: ArrayLike
) -> FloatArray:
    """Whole angle that a curve turns, from tangent to tangent.

    Parameters
    ----------
    arc_m : array_like
        Length of the circular arc [m], any shape.
    radius_m : array_like
        R [m], a shape that broadcasts.
    transition_in_m, transition_out_m : array_like
        Lengths of the transitions [m].

    Returns
    -------
    ndarray
        Angle [rad], broadcast shape.

    Notes
    -----
    ``arc / R + (L_1 + L_2) / (2 R)``: holds for every shape of :mod:`cant.quantities.shapes`, whose
    curvature is on average half that of the arc.

    References
    ----------
    .. [1] Integral of the curvature. Worked design R 780, L 120 (Indonesia): 4.41 degrees in a transition.
    """
    length = floats(arc_m) + (floats(transition_in_m) + floats(transition_out_m)) / 2.0
    return divide(length, radius_m)


def apex_offset(radius_m: ArrayLike, flatter_radius_m: ArrayLike, turn_rad: ArrayLike) -> FloatArray:
    """How far the middle of a curve moves inwards when its radius is made larger between the same tangents.

    Parameters
    ----------
    radius_m, flatter_radius_m : array_like
        R today and R wanted [m], any shape.
    turn_rad : array_like
        The whole turn from tangent to tangent [rad], a shape that broadcasts, below pi.

    Returns
    -------
    ndarray
        Offset [m], broadcast shape; positive towards the inside.

    Notes
    -----
    ``(R_2 - R_1) (1 / cos(turn / 2) - 1)``: two circles between the same tangents; the shift of the
    transitions is left out.

    References
    ----------
    .. [1] Plane geometry: the external distance of a circular curve.
    """
    external = divide(1.0, np.cos(floats(turn_rad) / 2.0)) - 1.0
    return (floats(flatter_radius_m) - floats(radius_m)) * external
