"""The array contract of every quantity: what is accepted, and how a division that has no answer behaves.

Apart from the formulas so that each of them stays one line of algebra.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray: TypeAlias = NDArray[np.float64]
"""What every quantity returns; a scalar in gives a scalar of numpy out."""

__all__ = ["ArrayLike", "FloatArray", "divide", "floats"]


def floats(values: ArrayLike) -> FloatArray:
    """Give values as an array of floats, without a copy where they are one already.

    Parameters
    ----------
    values : array_like
        Numbers of any unit [-], any shape; None is nan.

    Returns
    -------
    ndarray
        The same numbers [-], the same shape.

    References
    ----------
    .. [1] The array contract of this package, :mod:`cant.quantities`.
    """
    return np.asarray(values, dtype=np.float64)


def divide(numerator: ArrayLike, denominator: ArrayLike) -> FloatArray:
    """Divide without a warning: x / 0 is infinite, 0 / 0 and inf / inf are nan.

    Parameters
    ----------
    numerator, denominator : array_like
        Numbers of any unit [-], shapes that broadcast.

    Returns
    -------
    ndarray
        The quotient [-], broadcast shape.

    References
    ----------
    .. [1] IEEE 754-2019, 7.2 and 7.3.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.divide(floats(numerator), floats(denominator)))[()]
