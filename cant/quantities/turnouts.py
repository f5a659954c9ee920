"""Turnouts laid in a curve: everything in signed curvature, so that a contrary branch is no special case.

Curvature and cant of a left-hand curve are positive, of a right-hand one negative. The branch lies on the
main line's cant: where it curves the other way, that cant is negative cant for it.

::

    main left (+)  with a turnout to the left  (+): similar flexure, the branch is sharper than either
    main left (+)  with a turnout to the right (-): contrary flexure, the branch may curve either way
"""

from __future__ import annotations

import numpy as np

from cant.quantities.arrays import ArrayLike, FloatArray, divide, floats


def curvature(radius_m: ArrayLike, hand: ArrayLike) -> FloatArray:
    """Signed curvature of a radius and a hand.

    Parameters
    ----------
    radius_m : array_like
        R [m], any shape, positive; ``inf`` is straight.
    hand : array_like
        +1 left, -1 right [-], a shape that broadcasts.

    Returns
    -------
    ndarray
        Curvature [1/m], broadcast shape.

    References
    ----------
    .. [1] The sign rule of this program: left is positive.
    """
    return divide(hand, radius_m)


def branch_curvature(main_curvature_per_m: ArrayLike, turnout_curvature_per_m: ArrayLike) -> FloatArray:
    """Signed curvature of the branch of a turnout bent into a curve.

    Parameters
    ----------
    main_curvature_per_m : array_like
        Curvature of the main line [1/m], any shape, left positive.
    turnout_curvature_per_m : array_like
        Curvature of the turnout as it would lie on straight track [1/m], a shape that broadcasts, left
        positive.

    Returns
    -------
    ndarray
        Curvature of the branch [1/m], broadcast shape; 0 is a straight branch.

    Notes
    -----
    ``k_b = k_m + k_t``: similar flexure 1/R_b = 1/R_t + 1/R_m, contrary 1/R_b = |1/R_t - 1/R_m|.

    References
    ----------
    .. [1] Indian notes on turnouts on curves: the degree of the branch is the sum or difference of
       the degrees.
    """
    return floats(main_curvature_per_m) + floats(turnout_curvature_per_m)


def branch_cant(branch_curvature_per_m: ArrayLike, main_cant_mm: ArrayLike) -> FloatArray:
    """Cant of the main line as the branch sees it, in the branch's own hand.

    Parameters
    ----------
    branch_curvature_per_m : array_like
        Curvature of the branch [1/m], any shape, left positive.
    main_cant_mm : array_like
        Signed cant of the main line [mm], a shape that broadcasts, left positive.

    Returns
    -------
    ndarray
        D [mm], broadcast shape; negative where the branch's outer rail is the lower. On a straight branch
        |D|, all of it excess.

    References
    ----------
    .. [1] Signed geometry; examination problem (India): the branch needs 10 mm, the limit is 75 mm, so it
       lies at -65 mm and the main line may have 65 mm.
    """
    hand = np.sign(floats(branch_curvature_per_m))
    cant = floats(main_cant_mm)
    return np.where(hand == 0, np.abs(cant), hand * cant)[()]


def branch_deficiency(
    speed_kmh: ArrayLike, branch_curvature_per_m: ArrayLike, main_cant_mm: ArrayLike, constant: ArrayLike
) -> FloatArray:
    """Unbalanced cant of a train on the branch: deficiency where positive, excess where negative.

    Parameters
    ----------
    speed_kmh : array_like
        V on the branch [km/h], any shape.
    branch_curvature_per_m : array_like
        Curvature of the branch [1/m], a shape that broadcasts, left positive.
    main_cant_mm : array_like
        Signed cant of the main line [mm], left positive.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    ndarray
        D_EQ - D in the branch's own hand [mm], broadcast shape.

    Notes
    -----
    ``C V^2 |k_b| - D_b``, D_b from :func:`branch_cant`.

    References
    ----------
    .. [1] :func:`cant.quantities.kinematics.equilibrium_cant` in curvature.
    """
    needed = floats(constant) * floats(speed_kmh) ** 2 * np.abs(floats(branch_curvature_per_m))
    return needed - branch_cant(branch_curvature_per_m, main_cant_mm)


def main_cant_range(
    speed_kmh: ArrayLike,
    main_curvature_per_m: ArrayLike,
    branch_curvature_per_m: ArrayLike,
    deficiency_limit_mm: ArrayLike,
    excess_limit_mm: ArrayLike,
    constant: ArrayLike,
) -> tuple[FloatArray, FloatArray]:
    """Least and most cant of the main line that the branch allows.

    Parameters
    ----------
    speed_kmh : array_like
        V on the branch [km/h], any shape.
    main_curvature_per_m, branch_curvature_per_m : array_like
        Curvatures [1/m], shapes that broadcast, left positive; a straight main line counts as left.
    deficiency_limit_mm, excess_limit_mm : array_like
        Limits on the branch [mm]; ``inf`` where there is none.
    constant : array_like
        C [mm m / (km/h)2].

    Returns
    -------
    tuple of ndarray
        Least and most cant in the main line's own hand [mm], each of broadcast shape.

    Notes
    -----
    Branch with the main line's hand: ``D_EQ,b - I_lim <= D <= D_EQ,b + E_lim``. Contrary branch:
    ``-(D_EQ,b + E_lim) <= D <= I_lim - D_EQ,b``; on a straight one the smaller
    of the two limits holds either way.

    References
    ----------
    .. [1] Examination problem (India), as for :func:`branch_cant`.
    """
    branch = floats(branch_curvature_per_m)
    needed = floats(constant) * floats(speed_kmh) ** 2 * np.abs(branch)
    main_hand = np.where(floats(main_curvature_per_m) < 0, -1.0, 1.0)
    least, most = needed - floats(deficiency_limit_mm), needed + floats(excess_limit_mm)
    same = np.sign(branch) == main_hand
    straight = branch == 0
    tighter = np.minimum(floats(deficiency_limit_mm), floats(excess_limit_mm))
    low = np.where(straight, -tighter, np.where(same, least, -most))
    high = np.where(straight, tighter, np.where(same, most, -least))
    return low[()], high[()]
