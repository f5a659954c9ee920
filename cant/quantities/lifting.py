"""What the gang needs when cant changes: stations along a ramp, ordinates there, and what moves with a lift.

Apart from the shapes because these follow chainage, not the share of the way.
"""

from __future__ import annotations

import numpy as np

from cant.errors import InputError
from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats
from cant.quantities.shapes import profile


def stations(start_m: float, end_m: float, spacing_m: float) -> FloatArray:
    """Chainages at which a ramp is set out: both its ends, and every round multiple of the spacing between.

    Parameters
    ----------
    start_m, end_m : float
        Chainage of the ends [m], in either order.
    spacing_m : float
        Distance of the stations [m], usually 5 or 10.

    Returns
    -------
    ndarray
        Chainages [m], shape (n_stations,), from ``start_m`` to ``end_m``; a multiple closer than 1 mm to an
        end is left out for the end.

    Raises
    ------
    InputError
        Where the spacing is not positive.

    References
    ----------
    .. [1] Practice of setting out on site: values are marked on sleepers at round chainages.
    """
    if not spacing_m > 0:
        message = f"the distance of the stations of a ramp must be more than 0 m, not {spacing_m:g} m"
        raise InputError(message)
    low, high = min(start_m, end_m), max(start_m, end_m)
    inner = np.arange(np.ceil(low / spacing_m), np.floor(high / spacing_m) + 1) * spacing_m
    inner = inner[(inner > low + 0.001) & (inner < high - 0.001)]
    points = np.concatenate(([low], inner, [high] if high > low else []))
    return points if start_m <= end_m else points[::-1]


def ramp_ordinates(
    station_m: ArrayLike, start_m: float, end_m: float, start_cant_mm: float, end_cant_mm: float, shape: str
) -> FloatArray:
    """Cant at stations along a ramp.

    Parameters
    ----------
    station_m : array_like
        Chainages [m], any shape; outside the ramp the cant is that of the nearer end.
    start_m, end_m : float
        Chainage of the ends of the ramp [m], in either order.
    start_cant_mm, end_cant_mm : float
        Signed cant there [mm]; in a reverse curve they differ in sign and the ramp passes zero.
    shape : str
        Shape of the ramp, as for :func:`cant.quantities.shapes.profile` [-].

    Returns
    -------
    ndarray
        Cant [mm], the shape of ``station_m``; a ramp without length jumps at ``start_m``.

    Raises
    ------
    InputError
        For an unknown shape.

    Notes
    -----
    ``D(x) = D_1 + (D_2 - D_1) f((x - x_1) / (x_2 - x_1))``.

    References
    ----------
    .. [1] :func:`cant.quantities.shapes.profile`.
    """
    along = floats(station_m) - start_m
    length = end_m - start_m
    share = divide(along, length) if length else np.where(along > 0, 1.0, 0.0)
    return start_cant_mm + (end_cant_mm - start_cant_mm) * profile(share, shape)


def lateral_shift(cant_change_mm: ArrayLike, height_m: ArrayLike, rail_spacing_mm: ArrayLike) -> FloatArray:
    """Sideways movement of a point above the rails when the cant changes.

    Parameters
    ----------
    cant_change_mm : array_like
        dD [mm], any shape.
    height_m : array_like
        h of the point above rail level [m], a shape that broadcasts: platform edge, contact wire.
    rail_spacing_mm : array_like
        e [mm].

    Returns
    -------
    ndarray
        Shift [mm], broadcast shape; positive towards the inside of the curve where cant is added.

    Notes
    -----
    ``h dD / e``, small angle, about rail level: 10 mm of cant move a point at 5 m by 33 mm.

    References
    ----------
    .. [1] Geometry of a small rotation about the track's long axis.
    """
    return divide(1000.0 * floats(height_m) * floats(cant_change_mm), rail_spacing_mm)


def rise_of_centre(cant_change_mm: ArrayLike) -> FloatArray:
    """Rise of the track's centre line when one rail is lifted about the other.

    Parameters
    ----------
    cant_change_mm : array_like
        dD [mm], any shape, either sign: a tamper lifts, so less cant means that the inner rail is lifted.

    Returns
    -------
    ndarray
        |dD| / 2 [mm], the same shape.

    References
    ----------
    .. [1] Geometry; cant made by raising the outer rail with the inner one as reference is common practice.
    """
    return np.abs(floats(cant_change_mm)) / 2.0
