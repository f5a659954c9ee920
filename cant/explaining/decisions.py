"""Decisions that an engineer can take where a plan does not satisfy him, and what each changes in the tables.

A decision is data: it can be written down as JSON, read back, and applied to the tables of a plan, which can
then be planned as they stand. It changes the list, never the plan: a cant held by hand too is a demand that
the planner then answers, checked against every limit.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Annotated, Any, Literal

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, ValidationError

from cant.errors import InputError
from cant.model.curves import CurveList, FloatArray
from cant.model.limits import LimitSet
from cant.model.settings import EXCEPTIONAL_TIER, NORMAL_TIER, Settings
from cant.model.traffic import Traffic
from cant.model.turnouts import Turnout
from cant.planning.grid import LARGEST_CANT_MM
from cant.quantities.geometry import turn_of_curve

LONGEST_REASON = 300
Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NonNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]


class CurveKey(BaseModel):
    """How a curve of a list is known: by its names and by where it stands (a row may hold two curves)."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    sheet: str
    row: int
    line: str = ""
    track: str = ""
    curve: str = ""

    @classmethod
    def of(cls, curves: CurveList, index: int) -> CurveKey:
        """Give the key of a curve."""
        return cls(
            sheet=curves.sheet[index],
            row=int(curves.row[index]),
            line=curves.line[index],
            track=curves.track[index],
            curve=curves.curve[index],
        )


class _Change(BaseModel):
    """A change on one curve."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    on: CurveKey


class ClassSpeed(_Change):
    """A class runs here at another speed."""

    what: Literal["class speed"] = "class speed"
    class_name: str
    speed_kmh: NonNegative


class ExcessWaived(_Change):
    """The excess of a class is shown here and does not bind, with approval."""

    what: Literal["excess waived"] = "excess waived"
    class_name: str


class ExceptionalValues(_Change):
    """Exceptional values may be used here, with approval."""

    what: Literal["exceptional values"] = "exceptional values"


class TransitionLength(_Change):
    """A transition gets another length, its middle staying where it is; the cant ramp takes all of it."""

    what: Literal["transition length"] = "transition length"
    end: Literal["in", "out"]
    length_m: Positive


class SharedLength(_Change):
    """The transition shared with the next curve of the list of chainages gets another length.

    Its middle stays where it is, so both arcs give half of what is added; ``on`` is the curve at the smaller
    chainage, ``next`` the other one.
    """

    what: Literal["shared transition length"] = "shared transition length"
    next: CurveKey
    length_m: Positive


class Flatter(_Change):
    """The arc gets another radius between the same tangents, transitions as they are."""

    what: Literal["radius"] = "radius"
    radius_m: Positive


class SiteBounds(_Change):
    """What the site demands of the cant is taken back or moved; None: no bound."""

    what: Literal["site bounds"] = "site bounds"
    cant_fixed: bool = False
    cant_at_most_mm: float | None = None
    cant_at_least_mm: float | None = None


class CantHeld(_Change):
    """The engineer sets the cant himself: it is held, and what shares transitions with it planned around it.

    It takes the place of a cant held before.
    """

    what: Literal["cant held"] = "cant held"
    cant_mm: Annotated[float, Field(ge=0, le=LARGEST_CANT_MM, allow_inf_nan=False)]
    because: Annotated[str, Field(max_length=LONGEST_REASON)] = ""


Change = Annotated[
    CantHeld
    | ClassSpeed
    | ExcessWaived
    | ExceptionalValues
    | TransitionLength
    | SharedLength
    | Flatter
    | SiteBounds,
    Field(discriminator="what"),
]


class Decision(BaseModel):
    """Changes that are taken together.

    Attributes
    ----------
    changes : tuple of Change
        At least one.
    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    changes: Annotated[tuple[Change, ...], Field(min_length=1)]

    def as_json(self) -> dict[str, Any]:
        """Give the decision as JSON has it; ``Decision.model_validate`` reads it back."""
        return self.model_dump(mode="json")


def read_decision(data: Mapping[str, Any]) -> Decision:
    """Read a decision as JSON has it.

    Parameters
    ----------
    data : mapping
        As :meth:`Decision.as_json` gives it, and as an option of a plan holds it.

    Raises
    ------
    InputError
        It is no decision; says where it is wrong.
    """
    try:
        return Decision.model_validate(data)
    except ValidationError as error:
        first = error.errors()[0]
        where = ".".join(str(part) for part in first["loc"]) or "the whole"
        message = f"this is no decision of a plan: {where}: {first['msg']}"
        raise InputError(message) from error


@dataclass(frozen=True)
class Inputs:
    """The tables of a plan."""

    curves: CurveList
    traffic: Traffic
    limits: LimitSet
    settings: Settings
    turnouts: tuple[Turnout, ...] = ()


def apply(decision: Decision, inputs: Inputs) -> Inputs:
    """Give the tables with a decision taken; those given stay as they are.

    Parameters
    ----------
    decision : Decision
    inputs : Inputs

    Raises
    ------
    InputError
        A change names a curve that the list does not have.
    """
    curves = inputs.curves
    position = {CurveKey.of(curves, i): i for i in range(len(curves))}
    placed = []
    for change in decision.changes:
        if change.on not in position:
            message = (
                f"the list has no curve '{change.on.curve}' in row {change.on.row} on sheet "
                f"'{change.on.sheet}': "
                "the decision is of another list"
            )
            raise InputError(message)
        placed.append((position[change.on], change))
    changed = curves.take(np.arange(len(curves)))
    settings = inputs.settings
    if any(isinstance(change, ExceptionalValues) for _, change in placed):
        settings = open_exceptional(changed, settings)
    make_changes(changed, placed, position)
    return replace(inputs, curves=changed, settings=settings)


def open_exceptional(curves: CurveList, settings: Settings) -> Settings:
    """Give settings that know the exceptional tier, curves being left to the one that they had."""
    if not settings.allows_exceptional:
        curves.exceptional_allowed = np.zeros(len(curves), dtype=np.bool_)
        return settings.model_copy(update={"tiers": (NORMAL_TIER, EXCEPTIONAL_TIER)})
    if curves.exceptional_allowed is None:
        curves.exceptional_allowed = np.ones(len(curves), dtype=np.bool_)
    return settings


def make_changes(
    curves: CurveList, placed: Iterable[tuple[int, Change]], position: Mapping[CurveKey, int]
) -> None:
    """Make changes in a list, in place.

    Parameters
    ----------
    curves : CurveList
    placed : iterable of (int, Change)
        Each with the index of its curve. Exceptional values need :func:`open_exceptional` first.
    position : mapping of CurveKey to int
        Index of a curve, for the second one of a shared transition.
    """
    for index, change in placed:
        match change:
            case CantHeld():
                curves.hold(index, change.cant_mm, change.because)
            case ClassSpeed():
                _column(curves, change.class_name)[index] = change.speed_kmh
            case ExcessWaived():
                flags = curves.excess_waived.setdefault(
                    change.class_name, np.zeros(len(curves), dtype=np.bool_)
                )
                flags[index] = True
            case ExceptionalValues():
                if curves.exceptional_allowed is not None:
                    curves.exceptional_allowed[index] = True
            case TransitionLength():
                _lengthen(curves, index, change)
            case SharedLength():
                _lengthen_shared(curves, index, position[change.next], change.length_m)
            case Flatter():
                _flatten(curves, index, change.radius_m)
            case SiteBounds():
                curves.cant_fixed[index] = change.cant_fixed
                curves.cant_at_most_mm[index] = _or_nan(change.cant_at_most_mm)
                curves.cant_at_least_mm[index] = _or_nan(change.cant_at_least_mm)


def _or_nan(value: float | None) -> float:
    return np.nan if value is None else value


def _column(curves: CurveList, name: str) -> FloatArray:
    return curves.class_speeds.setdefault(name, np.full(len(curves), np.nan))


def _lengthen(curves: CurveList, i: int, change: TransitionLength) -> None:
    """Set a transition's length; half of what is added comes out of the arc."""
    into = change.end == "in"
    lengths = curves.transition_in_m if into else curves.transition_out_m
    ramps = curves.ramp_in_m if into else curves.ramp_out_m
    from_arc = (change.length_m - np.nan_to_num(lengths[i])) / 2
    lengths[i], ramps[i] = change.length_m, np.nan
    way = 1.0 if curves.end_km[i] >= curves.start_km[i] else -1.0
    if into:
        curves.start_km[i] += way * from_arc / 1000
    else:
        curves.end_km[i] -= way * from_arc / 1000
    curves.length_m[i] -= from_arc


def _lengthen_shared(curves: CurveList, first: int, second: int, length_m: float) -> None:
    """Set the length of a transition between two arcs, ``first`` at the smaller chainage."""
    way = 1.0 if curves.end_km[first] >= curves.start_km[first] else -1.0
    if way > 0:
        near, far, ends = curves.end_km, curves.start_km, ("out", "in")
    else:
        near, far, ends = curves.start_km, curves.end_km, ("in", "out")
    from_each = (length_m - (far[second] - near[first]) * 1000) / 2
    near[first] -= from_each / 1000
    far[second] += from_each / 1000
    for i, end in zip((first, second), ends, strict=True):
        curves.length_m[i] -= from_each
        lengths = curves.transition_in_m if end == "in" else curves.transition_out_m
        ramps = curves.ramp_in_m if end == "in" else curves.ramp_out_m
        lengths[i], ramps[i] = length_m, np.nan


def _flatten(curves: CurveList, i: int, radius_m: float) -> None:
    """Set a radius; the arc grows about its middle so that the whole turn stays what it is."""
    ends = np.nan_to_num([curves.transition_in_m[i], curves.transition_out_m[i]])
    by_chainage = abs(curves.end_km[i] - curves.start_km[i]) * 1000
    arc = by_chainage if np.isnan(curves.length_m[i]) else curves.length_m[i]
    turn = float(turn_of_curve(arc, curves.radius_m[i], ends[0], ends[1]))
    grown = turn * radius_m - ends.sum() / 2 - arc
    curves.radius_m[i] = radius_m
    curves.length_m[i] += grown
    way = 1.0 if curves.end_km[i] >= curves.start_km[i] else -1.0
    curves.start_km[i] -= way * grown / 2000
    curves.end_km[i] += way * grown / 2000
