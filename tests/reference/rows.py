"""The rows of a curve list as plain objects, one a curve, with the classes that run there."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from cant.model.curves import CurveList
from cant.model.traffic import Traffic

PEAK = {"linear": 1.0, "bloss": 1.5, "cosine": math.pi / 2, "helmert": 2.0, "sine": 2.0}
DOES_NOT_RUN = -1.0
LENGTH_NOISE = 6
"""Decimals of a metre to which distances are rounded: chainages are kilometres in floating point."""


@dataclass(frozen=True)
class Train:
    """A class as it runs on one curve: planned speed [km/h], trains a day, mass [t], roll coefficient."""

    name: str
    category: str
    speed: float
    trains: float | None
    mass: float | None
    roll: float | None
    regular: bool


@dataclass
class End:
    """One end of a curve.

    Attributes
    ----------
    kind : str
        ``straight`` (the transition, if any, runs to straight track), ``shared`` or ``unknown``.
    length : float or None
        Length of the transition [m], 0 for none, None for not known.
    ramp : float or None
        Length of the cant ramp over which gradient and rate of change of cant are checked [m].
    """

    kind: str
    length: float | None
    ramp: float | None


@dataclass
class Shared:
    """A shared transition between two curves: its length and cant ramp [m]; no ramp: the cants are equal."""

    first: int
    second: int
    length: float
    ramp: float | None
    peak: float


@dataclass
class Curve:
    """One row, None where a number is not known; ``trains`` are the classes that run there, by name."""

    index: int
    line: str
    track: str
    name: str
    rejected: bool
    start: float | None
    end: float | None
    radius: float
    hand: int
    stated_length: float | None
    transition: dict[str, float | None]
    stated_ramp: dict[str, float | None]
    peak: float
    today: float | None
    fixed: bool
    at_most: float | None
    at_least: float | None
    situations: frozenset[str]
    trains: dict[str, Train] = field(default_factory=dict)
    ends: dict[str, End] = field(default_factory=dict)

    @property
    def length(self) -> float:
        """Length for weights: as stated, else from the chainages, else 100 m."""
        if self.stated_length is not None:
            return self.stated_length
        if self.start is not None and self.end is not None:
            return round((self.end - self.start) * 1000, LENGTH_NOISE)
        return 100.0

    @property
    def bound(self) -> bool:
        """Whether the cant is fixed or bound by the site."""
        return self.fixed or self.at_most is not None or self.at_least is not None


def read_curves(curves: CurveList, traffic: Traffic) -> list[Curve]:
    """Turn the columns into one plain object a row, with the classes that run there."""
    result = []
    for i in range(len(curves)):
        curve = Curve(
            index=i,
            line=curves.line[i],
            track=curves.track[i],
            name=curves.curve[i],
            rejected=bool(curves.rejected[i]),
            start=_known(curves.start_km[i]),
            end=_known(curves.end_km[i]),
            radius=float(curves.radius_m[i]),
            hand=-1 if int(curves.hand[i]) == -1 else 1,
            stated_length=_known(curves.length_m[i]),
            transition={"in": _known(curves.transition_in_m[i]), "out": _known(curves.transition_out_m[i])},
            stated_ramp={
                "in": _known(curves.ramp_in_m[i]) or None,
                "out": _known(curves.ramp_out_m[i]) or None,
            },
            peak=PEAK[curves.shape[i]],
            today=_known(curves.cant_mm[i]),
            fixed=bool(curves.cant_fixed[i]),
            at_most=_known(curves.cant_at_most_mm[i]),
            at_least=_known(curves.cant_at_least_mm[i]),
            situations=curves.situations[i],
        )
        if not curve.rejected:
            curve.trains = _trains(curves, i, traffic)
        result.append(curve)
    return result


def _known(value: float) -> float | None:
    return None if math.isnan(value) else float(value)


def _trains(curves: CurveList, i: int, traffic: Traffic) -> dict[str, Train]:
    """Give the classes of a curve: the row of the track, else of the line, else the general one."""
    running = {}
    line, track = curves.line[i], curves.track[i]
    for name in dict.fromkeys(row.name for row in traffic.rows):
        rows = [r for r in traffic.rows if r.name == name]
        rows = [r for r in rows if r.line in ("", line) and r.track in ("", track)]
        if not rows:
            continue
        row = max(rows, key=lambda r: 2 * (r.track != "") + (r.line != ""))
        column = curves.class_speeds.get(name)
        own = _known(column[i]) if column is not None else None
        if own == DOES_NOT_RUN:
            continue
        candidates = [v for v in (row.speed_kmh, _known(curves.speed_kmh[i])) if v is not None]
        speed = own if own is not None else min(candidates)
        running[name] = Train(
            name, row.category, speed, row.trains_per_day, row.mass_t, row.roll_coefficient, row.regular
        )
    return running
