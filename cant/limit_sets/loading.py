"""Where the limit sets lie, and how a data file becomes a validated :class:`cant.model.limits.LimitSet`.

Apart from the model because the model must not know where limits come from: the user's own table is as good.
"""

from __future__ import annotations

import math
import tomllib
from functools import cache
from importlib import resources
from importlib.resources.abc import Traversable
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError, field_validator, model_validator

from cant.errors import FileError, InputError, Place
from cant.model.limits import QUANTITIES, LimitRow, LimitSet, Quantity
from cant.quantities.constants import constant_from_us
from cant.units import UNITS, ratio

US_CONSTANT_UNIT = "in/(mph2 deg)"
METRIC_CONSTANT_UNIT = "mm m/(km/h)2"
NOT_LIMITED = "none"


class _FileRow(BaseModel):
    """A row as the data file has it: conditions in the units that the document prints."""

    model_config = ConfigDict(extra="forbid")

    quantity: Quantity
    normal: float | Literal["none"]
    exceptional: float | Literal["none"] | None = None
    unit: str
    category: str = ""
    situation: str = ""
    speed_over: float | None = Field(default=None, ge=0)
    speed_up_to: float | None = Field(default=None, gt=0)
    speed_unit: str = "km/h"
    radius_over_m: float | None = Field(default=None, ge=0)
    radius_up_to_m: float | None = Field(default=None, gt=0)
    per_metre_of_radius: float = 0.0
    kind: Literal["design", "ceiling"] = "design"
    clause: str
    note: str = ""

    @field_validator("category", "situation")
    @classmethod
    def _lower_case(cls, word: str) -> str:
        if word != word.strip().lower():
            message = f"'{word}' should be written in lower case without blanks at its ends"
            raise ValueError(message)
        return word

    @field_validator("speed_unit")
    @classmethod
    def _is_speed(cls, symbol: str) -> str:
        if symbol not in UNITS or UNITS[symbol].dimension != "speed":
            message = f"'{symbol}' is no unit of speed"
            raise ValueError(message)
        return symbol

    @model_validator(mode="after")
    def _unit_fits(self) -> _FileRow:
        info = QUANTITIES[self.quantity]
        if self.unit not in UNITS or UNITS[self.unit].dimension not in info.dimensions:
            message = (
                f"'{self.unit}' is no unit of {self.quantity}, which is a {' or '.join(info.dimensions)}"
            )
            raise ValueError(message)
        if (
            self.speed_over is not None
            and self.speed_up_to is not None
            and self.speed_over >= self.speed_up_to
        ):
            message = f"no speed is over {self.speed_over:g} and up to {self.speed_up_to:g}"
            raise ValueError(message)
        if (self.radius_over_m or 0.0) >= (self.radius_up_to_m or math.inf):
            message = f"no radius is over {self.radius_over_m:g} and up to {self.radius_up_to_m:g}"
            raise ValueError(message)
        return self

    def as_row(self, place: Place) -> LimitRow:
        """Turn the conditions into canonical units."""
        size = ratio(self.speed_unit, "km/h")
        return LimitRow(
            quantity=self.quantity,
            normal=math.inf if self.normal == NOT_LIMITED else float(self.normal),
            exceptional=_value(self.exceptional),
            unit=self.unit,
            category=self.category,
            situation=self.situation,
            speed_over_kmh=None if self.speed_over is None else self.speed_over * size,
            speed_up_to_kmh=None if self.speed_up_to is None else self.speed_up_to * size,
            radius_over_m=self.radius_over_m,
            radius_up_to_m=self.radius_up_to_m,
            per_metre_of_radius=self.per_metre_of_radius,
            kind=self.kind,
            clause=self.clause,
            note=self.note,
            place=place,
        )


class _File(BaseModel):
    """A data file as a whole."""

    model_config = ConfigDict(extra="forbid")

    title: str = Field(min_length=1)
    edition: str = Field(min_length=1)
    document: str = Field(min_length=1)
    completeness: str = Field(min_length=1)
    verified: bool
    units: Literal["metric", "us"]
    rail_spacing_mm: float | None = Field(default=None, gt=0)
    equilibrium_constant: float | None = Field(default=None, gt=0)
    equilibrium_constant_unit: Literal["in/(mph2 deg)", "mm m/(km/h)2"] = "mm m/(km/h)2"
    situations: list[str] = []
    rows: list[_FileRow] = Field(min_length=1)


def _value(stated: float | str | None) -> float | None:
    """Give a stated value as a number: ``none`` is infinite, a blank stays None."""
    if stated is None:
        return None
    return math.inf if stated == NOT_LIMITED else float(stated)


def _folder() -> Traversable:
    """Give the folder of the data files."""
    return resources.files("cant.limit_sets") / "data"


def names() -> list[str]:
    """Give the names of the limit sets, as ``--limits`` takes them, in alphabetical order."""
    files = (entry.name for entry in _folder().iterdir())
    return sorted(name.removesuffix(".toml") for name in files if name.endswith(".toml"))


@cache
def load(name: str) -> LimitSet:
    """Load a limit set by its name.

    Parameters
    ----------
    name : str
        One of :func:`names`.

    Returns
    -------
    LimitSet
        Rows in the order of the data file; values in the units stated, conditions in km/h and m.

    Raises
    ------
    InputError
        Where there is no set of that name; the message lists those there are.
    FileError
        Where the data file is damaged.
    """
    known = names()
    if name not in known:
        message = f"there is no limit set '{name}'; there are {', '.join(known)}"
        raise InputError(message)
    file = f"{name}.toml"
    return parse((_folder() / file).read_text(encoding="utf-8"), name, file)


def parse(text: str, name: str, file: str) -> LimitSet:
    """Make a limit set from the text of a data file.

    Parameters
    ----------
    text : str
        TOML: the keys of a set, and ``[[rows]]``, each with its clause.
    name : str
        Name that the set gets.
    file : str
        Name of the file, for messages.

    Returns
    -------
    LimitSet
        Rows in the order of the text.

    Raises
    ------
    FileError
        Where the text is no TOML, or a key, unit or value is not what it should be: all faults in one line.
    """
    try:
        content = _File.model_validate(tomllib.loads(text))
    except tomllib.TOMLDecodeError as fault:
        message = f"not readable as TOML: {fault}"
        raise FileError(message, Place(file)) from fault
    except ValidationError as fault:
        raise FileError(_in_words(fault), Place(file)) from fault
    constant = content.equilibrium_constant
    if constant is not None and content.equilibrium_constant_unit == US_CONSTANT_UNIT:
        constant = float(constant_from_us(constant))
    return LimitSet(
        name=name,
        title=content.title,
        edition=content.edition,
        document=content.document,
        completeness=" ".join(content.completeness.split()),
        verified=content.verified,
        rail_spacing_mm=content.rail_spacing_mm,
        equilibrium_constant=constant,
        rows=tuple(row.as_row(Place(file, "rows", i)) for i, row in enumerate(content.rows, start=1)),
        situations=tuple(content.situations),
        units=content.units,
    )


def _in_words(fault: ValidationError) -> str:
    """Put what pydantic found into one line; rows are counted from 1."""

    def where(location: tuple[int | str, ...]) -> str:
        return " ".join(f"{part + 1}" if isinstance(part, int) else str(part) for part in location)

    return "; ".join(f"{where(error['loc'])}: {error['msg']}" for error in fault.errors())


def describe() -> list[dict[str, Any]]:
    """Describe every limit set that comes with the program, in the order of :func:`names`.

    Returns
    -------
    list of dict
        Keys ``name``, ``title``, ``edition``, ``document``, ``completeness``, ``verified``, ``units``,
        ``rows`` (their number).
    """
    keys = ("name", "title", "edition", "document", "completeness", "verified", "units")
    return [
        {**{key: getattr(limit_set, key) for key in keys}, "rows": len(limit_set.rows)}
        for limit_set in map(load, names())
    ]
