"""How cants are chosen, as a form: method, limits allowed, tolerances, rail spacing."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import ValidationError

from cant.model.settings import EXCEPTIONAL_TIER, METHODS, NORMAL_TIER, Settings
from webapp.forms import Fields
from webapp.measures import Measures


@dataclass(frozen=True, slots=True)
class NumberField:
    """A number of the settings: key, label, kind of measure (None: as it stands), and unit where fixed."""

    key: str
    label: str
    kind: str | None = None
    unit: str = ""
    above: float | None = None


NUMBERS: tuple[NumberField, ...] = (
    NumberField("keep_within_mm", "Keep today's cant within", "cant"),
    NumberField("maintenance_allowance_mm", "Maintenance allowance", "cant"),
    NumberField("rail_spacing_mm", "Rail spacing", None, "mm", above=0.0),
    NumberField("equilibrium_constant", "Equilibrium constant C, as printed", None, "mm, km/h, m", above=0.0),
    NumberField(
        "fraction_of_fastest", "Method fraction: share of the fastest class", None, "0 to 1", above=0.0
    ),
    NumberField("underbalance_mm", "Method underbalance: less than balance by", "cant"),
    NumberField("today_within_mm", "Method today: today's cant within", "cant"),
)
"""Every number of :class:`cant.model.settings.Settings`; a blank field is the usual value."""


def shown(settings: Settings, measures: Measures) -> dict[str, str]:
    """Give the settings as fields show them."""
    fields = Fields({}, measures)
    numbers = {f.key: fields.shown(getattr(settings, f.key), f.kind) for f in NUMBERS}
    tiers = "exceptional" if settings.allows_exceptional else "normal"
    return {"method": settings.method, "tiers": tiers, **numbers}


def parse(
    given: Mapping[str, str], measures: Measures, before: Settings
) -> tuple[Settings | None, dict[str, str]]:
    """Give the settings of a form that was sent, and the problems by field.

    Parameters
    ----------
    given : mapping of str to str
    measures : Measures
        Units in which the form was shown.
    before : Settings
        What the form was shown with: a number that was not changed stays as exact as it was.
    """
    fields = Fields(given, measures)
    exceptional = given.get("tiers") == "exceptional"
    values: dict[str, Any] = {
        **before.model_dump(),
        "method": fields.choice("method", METHODS, before.method),
        "tiers": (NORMAL_TIER, EXCEPTIONAL_TIER) if exceptional else (NORMAL_TIER,),
    }
    for item in NUMBERS:
        was = getattr(before, item.key)
        found = fields.number(item.key, item.kind, before=was, above=item.above)
        values[item.key] = Settings.model_fields[item.key].default if found is None else found
    if fields.problems:
        return None, fields.problems
    try:
        return Settings.model_validate(values), {}
    except ValidationError as error:
        first = error.errors()[0]
        return None, {str(first["loc"][0]): first["msg"]}
