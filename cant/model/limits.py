"""Limits as data: one row a rule, with its conditions, its unit as stated, its clause and its kind."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

from cant.errors import Place
from cant.units import GRAVITY_MS2, UNITS

Quantity = Literal[
    "cant",
    "minimum cant",
    "cant step",
    "cant deficiency",
    "cant excess",
    "cant gradient",
    "rate of change of cant",
    "rate of change of cant deficiency",
    "abrupt change of cant deficiency",
    "felt acceleration",
    "speed step",
    "curve length",
]


@dataclass(frozen=True, slots=True)
class QuantityInfo:
    """What is fixed about a limited quantity.

    Attributes
    ----------
    canonical : str
        Unit in which the program computes it.
    dimensions : tuple of str
        Dimensions of the units in which a limit of it may be stated.
    larger_is_stricter : bool
        True for a minimum.
    bounds : bool
        False for what only sets a grid or makes a finding: it has no gaps and no exceptional value.
    words : str
        One line for people.
    """

    canonical: str
    dimensions: tuple[str, ...]
    larger_is_stricter: bool
    bounds: bool
    words: str


QUANTITIES: dict[str, QuantityInfo] = {
    "cant": QuantityInfo("mm", ("length",), False, True, "largest cant"),
    "minimum cant": QuantityInfo("mm", ("length",), True, False, "smallest cant other than 0"),
    "cant step": QuantityInfo("mm", ("length",), False, False, "cants are multiples of this"),
    "cant deficiency": QuantityInfo("mm", ("length", "acceleration"), False, True, "largest cant deficiency"),
    "cant excess": QuantityInfo("mm", ("length", "acceleration"), False, True, "largest cant excess"),
    "cant gradient": QuantityInfo("mm/m", ("gradient",), False, True, "steepest cant ramp"),
    "rate of change of cant": QuantityInfo(
        "mm/s", ("rate",), False, True, "fastest change of cant with time"
    ),
    "rate of change of cant deficiency": QuantityInfo(
        "mm/s", ("rate",), False, True, "fastest change of cant deficiency with time"
    ),
    "abrupt change of cant deficiency": QuantityInfo(
        "mm",
        ("length", "acceleration"),
        False,
        True,
        "largest jump of cant deficiency where there is no transition",
    ),
    "felt acceleration": QuantityInfo(
        "m/s2", ("acceleration",), False, True, "largest lateral acceleration felt on the vehicle floor"
    ),
    "speed step": QuantityInfo("km/h", ("speed",), False, False, "permissible speeds are multiples of this"),
    "curve length": QuantityInfo(
        "s", ("time",), True, False, "shortest travel time over the arc (a finding)"
    ),
}

Condition = Annotated[float, Field(ge=0, allow_inf_nan=False)] | None

TOLERANCE = 0.001
"""A limit is kept when it is passed by no more than this, in the limit's own unit."""


class LimitRow(BaseModel):
    """One rule of a railway's standard, as stated there.

    Attributes
    ----------
    quantity : str
        One of :data:`QUANTITIES`.
    normal : float
        Value in ``unit``; ``inf`` where the row says ``none`` (not limited there).
    exceptional : float or None
        Value in ``unit`` that needs approval; None means the same as ``normal``.
    unit : str
        A symbol of :data:`cant.units.UNITS`.
    category, situation : str
        Conditions, lower case; "" holds always.
    speed_over_kmh, speed_up_to_kmh, radius_over_m, radius_up_to_m : float or None
        Conditions: ``over`` exclusive, ``up to`` inclusive [km/h, m]; None holds always.
    per_metre_of_radius : float
        Slope: limit = value + slope x R, in ``unit`` per metre.
    kind : str
        ``design``, or ``ceiling``: a value that track in service may not pass.
    clause, note : str
        Where it is printed, and what else is to be said.
    place : Place
        Where the row stands in the user's file.
    """

    model_config = ConfigDict(frozen=True)

    quantity: Quantity
    normal: float
    exceptional: float | None = None
    unit: str
    category: str = ""
    situation: str = ""
    speed_over_kmh: Condition = None
    speed_up_to_kmh: Condition = None
    radius_over_m: Condition = None
    radius_up_to_m: Condition = None
    per_metre_of_radius: float = 0.0
    kind: Literal["design", "ceiling"] = "design"
    clause: str = ""
    note: str = ""
    place: Place = Field(default=Place(), exclude=True, repr=False)

    def stated(self, exceptional: bool) -> float:
        """Give the value of a tier as stated; an empty exceptional value is the normal one."""
        return self.exceptional if exceptional and self.exceptional is not None else self.normal

    def unit_size(self, rail_spacing_mm: float) -> float:
        """Give how many canonical units one stated unit is (nan for ``1 in n``, which is not linear).

        An acceleration stated for a quantity in mm is I = a e / g.
        """
        info = QUANTITIES[self.quantity]
        stated, canonical = UNITS[self.unit], UNITS[info.canonical]
        if stated.dimension == canonical.dimension:
            return stated.factor / canonical.factor
        return stated.factor * rail_spacing_mm / GRAVITY_MS2

    def canonical(self, value: float, rail_spacing_mm: float) -> float:
        """Turn a stated value into the quantity's canonical unit."""
        if math.isinf(value):
            return value
        if self.unit == "1 in n":
            return 1000.0 / value if value > 0 else math.inf
        return value * self.unit_size(rail_spacing_mm)


class LimitSet(BaseModel):
    """The limits of a plan: the rows and where they come from.

    Attributes
    ----------
    name : str
        Short name, as ``--limits`` takes it; for a user's own table the file's name.
    title, edition, document : str
        What it is, for people and on every output.
    completeness : str
        What the set holds and what it lacks.
    verified : bool
        False for typical values that carry no standard's name: every output says "unverified".
    edited : bool
        True where the user changed a value of a set.
    rail_spacing_mm, equilibrium_constant : float or None
        What the document itself lays down; settings given by the user rule.
    rows : tuple of LimitRow
    situations : tuple of str
        Further situation words that the set knows although no row names them.
    units : str
        ``metric`` or ``us``.
    """

    model_config = ConfigDict(frozen=True)

    name: str
    title: str = ""
    edition: str = ""
    document: str = ""
    completeness: str = ""
    verified: bool = True
    edited: bool = False
    rail_spacing_mm: float | None = None
    equilibrium_constant: float | None = None
    rows: tuple[LimitRow, ...] = ()
    situations: tuple[str, ...] = ()
    units: str = "metric"

    def of(self, quantity: str) -> list[LimitRow]:
        """Give the rows of one quantity, in order."""
        return [row for row in self.rows if row.quantity == quantity]
