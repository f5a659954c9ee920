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


_MIXER = 0x9E3779B97F4A7C15
"""An odd number without pattern: its powers spread the bits of a row over the whole of a number."""


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
    known = np.nan_to_num(rows, nan=-1.0) + 0.0
    # A row's bits are mixed into one number: sorting these is far quicker than sorting rows. Round numbers
    # differ in their high bits only, which a product would lose: they are folded down first.
    bits = np.ascontiguousarray(known).view(np.uint64)
    mixers = np.cumprod(np.full(known.shape[1], _MIXER, dtype=np.uint64))
    mixed = ((bits ^ (bits >> np.uint64(32))) * mixers).sum(axis=1, dtype=np.uint64)
    _, first, place = np.unique(mixed, return_index=True, return_inverse=True)
    if (known == known[first[place]]).all():
        return first, place
    # Two kinds gave the same number, which is next to impossible.
    _, first, place = np.unique(known, axis=0, return_index=True, return_inverse=True)
    return first, place


def not_above(low: FloatArray, ceiling: FloatArray, slacks: float = 10) -> BoolArray:
    """Tell which rows (s, c) are not larger than others (s, c), in the order of the measures.

    Measures no more than so many times the slack apart count as equal.
    """
    above: BoolArray = np.zeros(len(low), dtype=np.bool_)
    level: BoolArray = np.ones(len(low), dtype=np.bool_)
    for j in range(low.shape[1]):
        room = slacks * slack(ceiling[:, j])
        above |= level & (low[:, j] > ceiling[:, j] + room)
        level &= np.abs(low[:, j] - ceiling[:, j]) <= room
    return ~above
