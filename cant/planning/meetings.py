"""Every pair of cants over one shared transition: whether it is allowed, what it permits, what it costs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_shared, shared_hard_kept
from cant.planning.permissible import Permitted, permitted_shared, speed_steps
from cant.planning.shared import Meeting

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]


@dataclass
class PairTable:
    """All pairs of a levels before and b levels after one transition: arrays (a, b), of a class (a, b, k).

    Attributes
    ----------
    hard : ndarray of bool
        Keeps what no lower speed can mend.
    hard_overrun : ndarray
        By how much it does not.
    before, after : Permitted
        What the transition permits on the two curves.
    """

    hard: BoolArray
    hard_overrun: FloatArray
    before: Permitted
    after: Permitted


def _spread(before: FloatArray, after: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Put levels (a, x) and (b, x) on axes of their own: (a, 1, 1, x) and (1, b, 1, x)."""
    return before[:, None, None, :], after[None, :, None, :]


def make_pair_table(
    meeting: Meeting,
    cant_before_mm: FloatArray,
    cant_after_mm: FloatArray,
    own_before_kmh: FloatArray,
    own_after_kmh: FloatArray,
    exceptional: bool,
) -> PairTable:
    """Evaluate all pairs of cants over one transition.

    Parameters
    ----------
    meeting : Meeting
        One transition.
    cant_before_mm, cant_after_mm : ndarray, shapes (a,) and (b,)
        Levels of the two curves [mm].
    own_before_kmh, own_after_kmh : ndarray, shapes (a, k) and (b, k)
        Speeds run as far as each curve by itself decides [km/h].
    exceptional : bool
    """
    cants = _spread(cant_before_mm[:, None], cant_after_mm[:, None])
    own = _spread(own_before_kmh, own_after_kmh)
    hard, hard_overrun = shared_hard_kept(meeting, cants, exceptional)
    steps = (speed_steps(meeting.before), speed_steps(meeting.after))
    shape = (len(cant_before_mm), len(cant_after_mm), own_before_kmh.shape[1])
    permitted = [
        Permitted(
            np.broadcast_to(part.up_to_kmh[:, :, 0], shape), np.broadcast_to(part.planned[:, :, 0], shape)
        )
        for part in permitted_shared(meeting, cants, own, steps, exceptional)
    ]
    flat = shape[:2]
    return PairTable(
        np.broadcast_to(hard[:, :, 0], flat), np.broadcast_to(hard_overrun[:, :, 0], flat), *permitted
    )


def pair_approvals(
    meeting: Meeting,
    cant_before_mm: FloatArray,
    cant_after_mm: FloatArray,
    run_before_kmh: FloatArray,
    run_after_kmh: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Give number and overrun of the normal limits passed over one transition by all pairs, each (a, b).

    Speeds are those run on the two curves, (a, k) and (b, k).
    """
    cants = _spread(cant_before_mm[:, None], cant_after_mm[:, None])
    passed = passed_shared(meeting, cants, np.minimum(*_spread(run_before_kmh, run_after_kmh)))
    shape = (len(cant_before_mm), len(cant_after_mm))
    count, total = (np.asarray(x) for x in (passed.count, passed.total))
    if count.ndim == 0:
        return np.zeros(shape), np.zeros(shape)
    return np.broadcast_to(count[..., 0], shape), np.broadcast_to(total[..., 0], shape)
