"""What each end of a curve has and what it needs: gradient, rates, and the lengths that the limits demand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE, Pairs
from cant.planning.rules import Asked
from cant.planning.shared import (
    Meeting,
    SharedAsked,
    change_of_cant,
    change_of_deficiency,
    jump_of_deficiency,
)
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass
class EndFigures:
    """One end of each curve, at given cants and speeds: arrays (n,), of a class (n, k).

    Attributes
    ----------
    length_m, ramp_m : ndarray, shape (n,)
        Transition and cant ramp there [m]; nan where not known.
    change_mm : ndarray, shape (n,)
        Change of cant over the ramp [mm].
    gradient_mm_per_m : ndarray, shape (n,)
        Peak gradient of the ramp; nan where no ramp is known.
    cant_rate_mm_per_s, deficiency_rate_mm_per_s, jump_mm : ndarray, shape (n, k)
        Peak rates, and the abrupt change where there is no transition; nan where not defined.
    ramp_needed_m, transition_needed_m : ndarray, shape (n,)
        Lengths that the normal limits demand at planned speeds [m]; nan where nothing limits.
    ramp_by, transition_by : ndarray of int, shape (n,)
        Class whose speed demands it; for the ramp -1 where the gradient does.
    """

    length_m: FloatArray
    ramp_m: FloatArray
    change_mm: FloatArray
    gradient_mm_per_m: FloatArray
    cant_rate_mm_per_s: FloatArray
    deficiency_rate_mm_per_s: FloatArray
    jump_mm: FloatArray
    ramp_needed_m: FloatArray
    transition_needed_m: FloatArray
    ramp_by: IntArray
    transition_by: IntArray

    def put(self, rows: IntArray, other: EndFigures) -> None:
        """Take over the figures of some curves from others of the same number."""
        for name in self.__dataclass_fields__:
            getattr(self, name)[rows] = getattr(other, name)


@dataclass(frozen=True)
class _Change:
    """What changes over an end, and by what it is limited."""

    cant_mm: FloatArray
    deficiency_mm: FloatArray
    deficiency_planned_mm: FloatArray
    jump_mm: FloatArray
    factor: FloatArray
    length_m: FloatArray
    ramp_m: FloatArray


def _worst(needed: FloatArray) -> tuple[FloatArray, IntArray]:
    """Give the largest over the classes and its class; nan and -1 where none."""
    value = np.where(np.isfinite(needed), needed, -np.inf)
    column = value.argmax(axis=-1).astype(np.int64)
    worst = value[np.arange(len(value)), column]
    none = ~np.isfinite(worst)
    return np.where(none, np.nan, worst), np.where(none, -1, column)


def _figures(change: _Change, speed_kmh: FloatArray, asked: Asked | SharedAsked) -> EndFigures:
    """Work out an end; ``asked`` holds the normal limits at planned speeds."""
    planned = asked.speed_kmh
    with np.errstate(divide="ignore", invalid="ignore"):
        gradient = np.where(change.ramp_m > 0, change.factor * change.cant_mm / change.ramp_m, np.nan)
        cant_rate = gradient * speed_kmh / KMH_PER_MS
        rate = change.factor * change.deficiency_mm * speed_kmh / (KMH_PER_MS * change.length_m)
        by_gradient = change.factor * change.cant_mm / asked.limit("cant gradient").value
        limit = asked.limit("rate of change of cant").value
        by_rate = change.factor * change.cant_mm * planned / (KMH_PER_MS * limit)
        limit = asked.limit("rate of change of cant deficiency").value
        by_deficiency = change.factor * change.deficiency_planned_mm * planned / (KMH_PER_MS * limit)
    shape = planned.shape
    by_gradient = np.where(np.isnan(planned), np.nan, np.broadcast_to(by_gradient, shape))
    ramp_gradient, _ = _worst(by_gradient)
    ramp_rate, ramp_class = _worst(by_rate)
    transition, transition_class = _worst(by_deficiency)
    return EndFigures(
        length_m=change.length_m[:, 0].copy(),
        ramp_m=change.ramp_m[:, 0].copy(),
        change_mm=change.cant_mm[:, 0],
        gradient_mm_per_m=gradient[:, 0],
        cant_rate_mm_per_s=np.array(np.broadcast_to(cant_rate, shape)),
        deficiency_rate_mm_per_s=np.where(change.length_m > 0, rate, np.nan),
        jump_mm=np.where(change.length_m == 0, change.jump_mm, np.nan),
        ramp_needed_m=np.fmax(ramp_gradient, ramp_rate),
        transition_needed_m=transition,
        ramp_by=np.where(np.nan_to_num(ramp_rate) > np.nan_to_num(ramp_gradient), ramp_class, -1),
        transition_by=transition_class,
    )


def end_figures(
    line: Line, pairs: Pairs, cant_mm: FloatArray, run_kmh: FloatArray
) -> tuple[EndFigures, EndFigures]:
    """Work out both ends of each curve.

    Parameters
    ----------
    line : Line
        n curves.
    pairs : Pairs
        Shared transitions among them.
    cant_mm : ndarray, shape (n,)
        Cants [mm]; nan where not known.
    run_kmh : ndarray, shape (n, k)
        Speeds run [km/h].

    Returns
    -------
    pair of EndFigures
        At the smaller and at the greater chainage.
    """
    ends = []
    cant = cant_mm[:, None]
    asked = Asked(line, line.planned_kmh, False)
    balance = equilibrium_cant(run_kmh, line.radius_m, line.constant)
    planned = equilibrium_cant(line.planned_kmh, line.radius_m, line.constant)
    for end in (BEFORE, AFTER):
        change = _Change(
            cant_mm=np.abs(cant),
            deficiency_mm=np.maximum(balance - cant, 0.0),
            deficiency_planned_mm=np.maximum(planned - cant, 0.0),
            jump_mm=balance,
            factor=line.factor,
            length_m=line.transition_m[end],
            ramp_m=line.ramp_m[end],
        )
        ends.append(_figures(change, run_kmh, asked))
    if len(pairs):
        shared = _shared_figures(Meeting.of(line, pairs), pairs, cant, run_kmh)
        ends[AFTER].put(pairs.first, shared)
        ends[BEFORE].put(pairs.second, shared)
    return ends[BEFORE], ends[AFTER]


def _shared_figures(meeting: Meeting, pairs: Pairs, cant: FloatArray, run_kmh: FloatArray) -> EndFigures:
    cants = (cant[pairs.first], cant[pairs.second])
    speed = np.minimum(run_kmh[pairs.first], run_kmh[pairs.second])
    planned = np.where(meeting.both, meeting.planned_kmh, np.nan)
    change = _Change(
        cant_mm=change_of_cant(meeting, *cants),
        deficiency_mm=change_of_deficiency(meeting, speed, *cants),
        deficiency_planned_mm=change_of_deficiency(meeting, planned, *cants),
        jump_mm=jump_of_deficiency(meeting, speed),
        factor=meeting.factor,
        length_m=meeting.length_m,
        ramp_m=meeting.ramp_m,
    )
    return _figures(change, speed, SharedAsked(meeting, planned, False))
