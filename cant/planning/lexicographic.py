"""Comparing by several measures in their order: least of the first, of those least of the second ..."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

RELATIVE = 1e-9
"""Measures that differ by less than this share, or this much, are equal: sums come in different orders."""


def slack(value: FloatArray) -> FloatArray:
    """Give how much larger than a measure another may be and still count as equal."""
    return RELATIVE * np.maximum(np.abs(value), 1.0)


def first_best(measures: Sequence[FloatArray], allowed: BoolArray, axis: int) -> tuple[IntArray, BoolArray]:
    """Find the best along an axis, the first of equals.

    Parameters
    ----------
    measures : sequence of ndarray
        The most important first; the shape of ``allowed``.
    allowed : ndarray of bool
        What may be chosen.
    axis : int

    Returns
    -------
    chosen : ndarray of int
        Index along the axis; 0 where nothing is allowed.
    any_allowed : ndarray of bool
    """
    left = allowed
    for measure in measures:
        value = np.where(left, measure, np.inf)
        least = value.min(axis=axis, keepdims=True)
        with np.errstate(invalid="ignore"):
            left = left & (value <= least + slack(np.where(np.isfinite(least), least, 0.0)))
    return np.argmax(left, axis=axis), np.asarray(allowed.any(axis=axis))


def least_of_groups(measures: FloatArray, group: IntArray) -> tuple[IntArray, FloatArray, IntArray]:
    """Find the best row of each group.

    Parameters
    ----------
    measures : ndarray, shape (s, c)
        Rows, the most important measure first.
    group : ndarray of int, shape (s,)
        Ascending.

    Returns
    -------
    groups : ndarray of int, shape (g,)
        Those that have a row.
    least : ndarray, shape (g, c)
        The least of each measure among the rows that are best by the measures before it.
    best : ndarray of int, shape (g,)
        The first of the best rows.
    """
    start = np.flatnonzero(np.diff(group, prepend=-1))
    least = np.zeros((len(start), measures.shape[1]))
    rows = np.arange(len(group))
    if not len(rows):
        return group, least, rows
    owner = np.repeat(np.arange(len(start)), np.diff(start, append=len(group)))
    left = np.ones(len(group), dtype=np.bool_)
    for j in range(measures.shape[1]):
        value = np.where(left, measures[:, j], np.inf)
        least[:, j] = np.minimum.reduceat(value, start)
        most = least[:, j] + slack(np.where(np.isfinite(least[:, j]), least[:, j], 0.0))
        left &= value <= most[owner]
    return group[start], least, np.minimum.reduceat(np.where(left, rows, len(rows)), start)


def distinct_rows(rows: FloatArray) -> tuple[IntArray, IntArray]:
    """Give the first of each kind of rows (s, c), nan like nan, and the place of each row's kind in these."""
    if not len(rows):
        return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64)
    known = np.nan_to_num(rows, nan=-1.0)
    order = np.lexsort(known.T)
    ahead = known[order]
    new = np.concatenate([[True], (ahead[1:] != ahead[:-1]).any(axis=1)])
    place = np.empty(len(rows), dtype=np.int64)
    place[order] = np.cumsum(new) - 1
    return order[new], place


def not_above(low: FloatArray, ceiling: FloatArray) -> BoolArray:
    """Tell which rows (s, c) are not larger than others (s, c), in the order of the measures."""
    above: BoolArray = np.zeros(len(low), dtype=np.bool_)
    level: BoolArray = np.ones(len(low), dtype=np.bool_)
    for j in range(low.shape[1]):
        room = 10 * slack(ceiling[:, j])
        above |= level & (low[:, j] > ceiling[:, j] + room)
        level &= np.abs(low[:, j] - ceiling[:, j]) <= room
    return ~above
