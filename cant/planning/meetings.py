"""Every pair of cants over one shared transition: whether it is allowed, what it permits, what it costs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.assess import passed_shared, shared_hard_kept
from cant.planning.permissible import Permitted, permitted_shared, shared_held, speed_steps
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
    own: tuple[Permitted, Permitted],
    exceptional: bool,
) -> PairTable:
    """Evaluate all pairs of cants over one transition, for speeds up to the planned ones.

    Parameters
    ----------
    meeting : Meeting
        One transition.
    cant_before_mm, cant_after_mm : ndarray, shapes (a,) and (b,)
        Levels of the two curves [mm].
    own : pair of Permitted, shapes (a, k) and (b, k)
        What each curve by itself permits.
    exceptional : bool
    """
    cants = _spread(cant_before_mm[:, None], cant_after_mm[:, None])
    hard, hard_overrun = shared_hard_kept(meeting, cants, exceptional)
    planned = (meeting.before.planned_kmh, meeting.after.planned_kmh)
    steps = (speed_steps(meeting.before), speed_steps(meeting.after))
    shape = (len(cant_before_mm), len(cant_after_mm), meeting.both.shape[1])
    permitted = [
        Permitted(
            np.broadcast_to(part.up_to_kmh[:, :, 0], shape), np.broadcast_to(part.planned[:, :, 0], shape)
        )
        for part in permitted_shared(meeting, cants, _spread_own(own), steps, exceptional, planned)
    ]
    flat = shape[:2]
    return PairTable(
        np.broadcast_to(hard[:, :, 0], flat), np.broadcast_to(hard_overrun[:, :, 0], flat), *permitted
    )


def _spread_own(own: tuple[Permitted, Permitted]) -> tuple[Permitted, Permitted]:
    up_to = _spread(own[0].up_to_kmh, own[1].up_to_kmh)
    planned = own[0].planned[:, None, None, :], own[1].planned[None, :, None, :]
    return Permitted(up_to[0], planned[0]), Permitted(up_to[1], planned[1])


def unhindered(
    meeting: Meeting,
    cant_before_mm: FloatArray,
    cant_after_mm: FloatArray,
    own: tuple[Permitted, Permitted],
    exceptional: bool,
) -> BoolArray:
    """Tell which pairs a transition allows without slowing any train further, shape (a, b).

    Parameters
    ----------
    meeting : Meeting
        One transition.
    cant_before_mm, cant_after_mm : ndarray, shapes (a,) and (b,)
        Levels of the two curves [mm].
    own : pair of Permitted, shapes (a, k) and (b, k)
        What each curve by itself permits.
    exceptional : bool
    """
    cants = _spread(cant_before_mm[:, None], cant_after_mm[:, None])
    sides = (meeting.before, meeting.after)
    alone = _spread_own(own)
    run = [part.run_speed(line.planned_kmh) for part, line in zip(alone, sides, strict=True)]
    hard, _ = shared_hard_kept(meeting, cants, exceptional)
    held = np.asarray(shared_held(meeting, cants, np.minimum(*run), exceptional).all(axis=-1))
    free: BoolArray = np.asarray(hard[:, :, 0] & held[:, :, 0])
    # A train that is slow by itself must find every multiple of the step below its speed in order too.
    ceiling = [np.where(part.planned, 0.0, line.planned_kmh) for part, line in zip(alone, sides, strict=True)]
    if not free.any() or not any((speed > 0).any() for speed in ceiling):
        return np.broadcast_to(free, (len(cant_before_mm), len(cant_after_mm)))
    steps = (speed_steps(meeting.before), speed_steps(meeting.after))
    shared = permitted_shared(meeting, cants, alone, steps, exceptional, (ceiling[0], ceiling[1]))
    for part, beside, line, speed in zip(alone, shared, sides, run, strict=True):
        together = Permitted(
            np.minimum(part.up_to_kmh, beside.up_to_kmh), np.logical_and(part.planned, beside.planned)
        )
        same = np.logical_or(np.equal(together.run_speed(line.planned_kmh), speed), ~line.runs)
        free = np.logical_and(free, np.asarray(same.all(axis=-1))[:, :, 0])
    return free


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
