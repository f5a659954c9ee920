"""How cant and speed move weight from one rail to the other: a rigid body, and it says so.

Apart from the kinematics because it is the only place that needs a vehicle. Suspension roll, wind, track
irregularity and coupler forces are not in it; each makes the shift larger or smaller than given here.
"""

from __future__ import annotations

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats


def wheel_load_shift(
    unbalanced_cant_mm: ArrayLike, centre_of_gravity_m: ArrayLike, rail_spacing_mm: ArrayLike
) -> FloatArray:
    """Share of the mean wheel load that moves to the outer rail at speed.

    Parameters
    ----------
    unbalanced_cant_mm : array_like
        D_EQ - D [mm], any shape: deficiency positive, excess negative.
    centre_of_gravity_m : array_like
        h, height of the centre of gravity above the rail [m], a shape that broadcasts.
    rail_spacing_mm : array_like
        e [mm].

    Returns
    -------
    ndarray
        dQ / Q0 [-], broadcast shape; the outer wheels carry Q0 (1 + dQ/Q0), the inner ones Q0 (1 - dQ/Q0).
        Negative: the inner rail carries more. At 1 the inner wheels are without load.

    Notes
    -----
    ``2 h (D_EQ - D) / e^2``: moments of a rigid body about the middle of the track, linear in the angle. The
    roll of the body on its springs adds to it: the true shift is larger.

    References
    ----------
    .. [1] Statics of a rigid body; 100 mm, 1.8 m and 1500 mm give 16 %.
    """
    return divide(
        2000.0 * floats(centre_of_gravity_m) * floats(unbalanced_cant_mm), floats(rail_spacing_mm) ** 2
    )


def wheel_load_shift_at_rest(
    cant_mm: ArrayLike, centre_of_gravity_m: ArrayLike, rail_spacing_mm: ArrayLike
) -> FloatArray:
    """Share of the mean wheel load that moves to the outer rail while the train stands.

    Parameters
    ----------
    cant_mm : array_like
        D [mm], any shape.
    centre_of_gravity_m : array_like
        h, height of the centre of gravity above the rail [m], a shape that broadcasts.
    rail_spacing_mm : array_like
        e [mm].

    Returns
    -------
    ndarray
        dQ / Q0 [-], broadcast shape; negative with cant: the inner rail carries more.

    Notes
    -----
    ``- 2 h D / e^2``: :func:`wheel_load_shift` with D_EQ = 0. Rigid body.

    References
    ----------
    .. [1] Statics of a rigid body.
    """
    return wheel_load_shift(-floats(cant_mm), centre_of_gravity_m, rail_spacing_mm)
