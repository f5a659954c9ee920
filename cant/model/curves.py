"""The curve list: columns of equal length, one entry a curve, everything in canonical units.

Columns, not records: a national register has 100,000 curves. A single curve is looked at through
:meth:`CurveList.as_read`.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, fields
from typing import Any

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
HandArray = npt.NDArray[np.int8]
IntArray = npt.NDArray[np.int64]

DOES_NOT_RUN = -1.0
"""In a column of class speeds: the class does not run on this curve (nan: the row does not say)."""

LEFT, RIGHT, HAND_UNKNOWN = 1, -1, 0
SHAPES: dict[str, float] = {
    "linear": 1.0,
    "bloss": 1.5,
    "cosine": float(np.pi / 2),
    "helmert": 2.0,
    "sine": 2.0,
}
"""Shape of a transition: peak over mean gradient [-]."""

PLAIN: frozenset[str] = frozenset({"plain"})


@dataclass
class CurveList:
    """All curve rows of a file, in input order, the rejected ones too (a neighbour must know of them).

    Attributes
    ----------
    file : str
        Name of the file, "" for a DataFrame.
    sheet, line, track, curve : list of str, length n
        Sheet, and the three names by which a curve is known.
    row : ndarray of int, shape (n,)
        Row number in the sheet, from 1.
    rejected : ndarray of bool, shape (n,)
        True where the row cannot be assessed; the numbers of such a row are nan where not known.
    start_km, end_km : ndarray, shape (n,)
        Chainage of the ends of the circular arc [km]; nan where not known.
    radius_m : ndarray, shape (n,)
        Radius [m], positive.
    hand : ndarray of int8, shape (n,)
        LEFT, RIGHT or HAND_UNKNOWN, seen in the direction of the list.
    length_m : ndarray, shape (n,)
        Length of the arc [m]; nan where not stated.
    transition_in_m, transition_out_m, ramp_in_m, ramp_out_m : ndarray, shape (n,)
        Lengths of transitions and cant ramps [m]; nan "not known", 0 "none".
    shape : list of str, length n
        Key of :data:`SHAPES`.
    cant_mm : ndarray, shape (n,)
        Cant as it is today [mm]; nan where not known.
    cant_fixed : ndarray of bool, shape (n,)
        Today's cant may not be changed.
    cant_at_most_mm, cant_at_least_mm : ndarray, shape (n,)
        Bounds of the site [mm]; nan where there is none.
    speed_kmh : ndarray, shape (n,)
        Line speed [km/h]; nan where not stated.
    situations : list of frozenset of str, length n
        Situation words, lower case; ``{"plain"}`` where blank.
    class_speeds : dict of str to ndarray, shape (n,)
        Speed of a class as the row gives it [km/h]; nan not given, :data:`DOES_NOT_RUN` for ``none``.
    excess_waived : dict of str to ndarray of bool, shape (n,)
        By class: its excess is shown on this curve and does not bind, by a decision that needs approval.
    exceptional_allowed : ndarray of bool, shape (n,), or None
        Where exceptional values may be used if the settings allow that tier; None: everywhere.
    held_mm : ndarray, shape (n,), or None
        Cant held by hand, by a decision of the engineer [mm]; nan, or None as a whole, where none is.
    held_because : list of str, length n, or None
        His reason for each.
    """

    file: str
    sheet: list[str]
    row: IntArray
    line: list[str]
    track: list[str]
    curve: list[str]
    rejected: BoolArray
    start_km: FloatArray
    end_km: FloatArray
    radius_m: FloatArray
    hand: HandArray
    length_m: FloatArray
    transition_in_m: FloatArray
    transition_out_m: FloatArray
    ramp_in_m: FloatArray
    ramp_out_m: FloatArray
    shape: list[str]
    cant_mm: FloatArray
    cant_fixed: BoolArray
    cant_at_most_mm: FloatArray
    cant_at_least_mm: FloatArray
    speed_kmh: FloatArray
    situations: list[frozenset[str]]
    class_speeds: dict[str, FloatArray] = field(default_factory=dict)
    excess_waived: dict[str, BoolArray] = field(default_factory=dict)
    exceptional_allowed: BoolArray | None = None
    held_mm: FloatArray | None = None
    held_because: list[str] | None = None

    def __len__(self) -> int:
        return len(self.curve)

    def take(self, indices: npt.ArrayLike) -> CurveList:
        """Give the rows of some indices, in that order, as a list of their own."""
        at = np.asarray(indices, dtype=np.int64)
        chosen: dict[str, Any] = {}
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                chosen[item.name] = value[at]
            elif isinstance(value, list):
                chosen[item.name] = [value[i] for i in at]
            elif isinstance(value, dict):
                chosen[item.name] = {key: column[at] for key, column in value.items()}
            else:
                chosen[item.name] = value
        return CurveList(**chosen)

    def hold(self, index: int, cant_mm: float, because: str) -> None:
        """Hold the cant of a curve by hand, in place.

        Parameters
        ----------
        index : int
        cant_mm : float
            The cant [mm].
        because : str
            The engineer's reason.
        """
        if self.held_mm is None or self.held_because is None:
            self.held_mm, self.held_because = np.full(len(self), np.nan), [""] * len(self)
        self.held_mm[index], self.held_because[index] = cant_mm, because

    def held(self, index: int) -> dict[str, Any] | None:
        """Give the cant held by hand on a curve and the reason for it, None where none is held."""
        if self.held_mm is None or self.held_because is None or np.isnan(self.held_mm[index]):
            return None
        return {"cant_mm": float(self.held_mm[index]), "because": self.held_because[index]}

    def as_read(self, index: int) -> dict[str, Any]:
        """Give a curve after units and notation are resolved (``as_read`` of the JSON), None where blank."""
        return {
            "radius_m": none_if_nan(self.radius_m[index]),
            "hand": {LEFT: "L", RIGHT: "R"}.get(int(self.hand[index])),
            "length_m": none_if_nan(self.length_m[index]),
            "start_km": none_if_nan(self.start_km[index]),
            "end_km": none_if_nan(self.end_km[index]),
            "transition_in_m": none_if_nan(self.transition_in_m[index]),
            "transition_out_m": none_if_nan(self.transition_out_m[index]),
            "cant_mm": none_if_nan(self.cant_mm[index]),
            "speed_kmh": none_if_nan(self.speed_kmh[index]),
            "situation": situation_text(self.situations[index]),
        }

    @classmethod
    def from_rows(cls, rows: Iterable[Mapping[str, Any]], file: str = "") -> CurveList:
        """Make a list from mappings whose keys are the attribute names; what is missing is not known.

        ``hand`` may be ``"L"``, ``"R"`` or a number, ``situations`` any iterable of words, ``class_speeds`` a
        mapping of class name to km/h (:data:`DOES_NOT_RUN` for none), None stands for not known.
        """
        given = list(rows)

        def numbers(name: str) -> FloatArray:
            values = [row.get(name) for row in given]
            return np.array([np.nan if v is None else float(v) for v in values], dtype=np.float64)

        def flags(name: str) -> BoolArray:
            return np.array([bool(row.get(name, False)) for row in given], dtype=np.bool_)

        def words(name: str, default: str = "") -> list[str]:
            return [str(row.get(name) or default) for row in given]

        hands = {"L": LEFT, "R": RIGHT, None: HAND_UNKNOWN}
        classes = dict.fromkeys(name for row in given for name in (row.get("class_speeds") or {}))
        return cls(
            file=file,
            sheet=words("sheet"),
            row=np.array([int(row.get("row", i + 2)) for i, row in enumerate(given)], dtype=np.int64),
            line=words("line"),
            track=words("track"),
            curve=words("curve"),
            rejected=flags("rejected"),
            start_km=numbers("start_km"),
            end_km=numbers("end_km"),
            radius_m=numbers("radius_m"),
            hand=np.array(
                [h if isinstance(h := row.get("hand"), int) else hands[h] for row in given], dtype=np.int8
            ),
            length_m=numbers("length_m"),
            transition_in_m=numbers("transition_in_m"),
            transition_out_m=numbers("transition_out_m"),
            ramp_in_m=numbers("ramp_in_m"),
            ramp_out_m=numbers("ramp_out_m"),
            shape=words("shape", "linear"),
            cant_mm=numbers("cant_mm"),
            cant_fixed=flags("cant_fixed"),
            cant_at_most_mm=numbers("cant_at_most_mm"),
            cant_at_least_mm=numbers("cant_at_least_mm"),
            speed_kmh=numbers("speed_kmh"),
            situations=[frozenset(row.get("situations") or PLAIN) for row in given],
            class_speeds={
                name: np.array(
                    [
                        np.nan if (v := (row.get("class_speeds") or {}).get(name)) is None else float(v)
                        for row in given
                    ],
                    dtype=np.float64,
                )
                for name in classes
            },
        )


def none_if_nan(value: float | np.floating[Any]) -> float | None:
    """Give a plain float, or None for nan and infinities (JSON knows neither)."""
    number = float(value)
    return number if math.isfinite(number) else None


def situation_text(words: frozenset[str]) -> str | None:
    """Give situation words as the table has them, None for plain track."""
    return "; ".join(sorted(words)) if words != PLAIN else None
