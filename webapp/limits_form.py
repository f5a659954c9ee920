"""The limits as a form: each rule's values with its clause and note beside them, and new rules to add.

Values stay in the unit in which they are stated; only conditions follow the units of the page.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import get_args

from pydantic import ValidationError

from cant.model.limits import QUANTITIES, LimitRow, LimitSet, Quantity
from cant.units import UNITS
from webapp.forms import Fields
from webapp.measures import Measures

SPARE_ROWS = 2
QUANTITY_NAMES: tuple[str, ...] = get_args(Quantity)
KINDS = ("design", "ceiling")
CONDITIONS: tuple[tuple[str, str], ...] = (
    ("speed_over_kmh", "speed exact"),
    ("speed_up_to_kmh", "speed exact"),
    ("radius_over_m", "radius"),
    ("radius_up_to_m", "radius"),
)
UNIT_SYMBOLS: tuple[str, ...] = tuple(
    symbol
    for symbol, unit in UNITS.items()
    if any(unit.dimension in info.dimensions for info in QUANTITIES.values())
)


def shown_rows(limits: LimitSet, measures: Measures) -> list[dict[str, str]]:
    """Give each rule as the form shows it: values as fields, conditions as words."""
    fields = Fields({}, measures)
    return [
        {
            "quantity": row.quantity,
            "normal": fields.shown(row.normal),
            "exceptional": fields.shown(row.exceptional),
            "unit": row.unit,
            "holds": conditions(row, measures),
            "clause": row.clause,
            "note": row.note,
        }
        for row in limits.rows
    ]


def conditions(row: LimitRow, measures: Measures) -> str:
    """Give the conditions of a rule in words, "always" where there are none."""
    parts = [word for word in (row.category, row.situation) if word]
    if row.speed_over_kmh is not None:
        parts.append(f"over {measures.with_unit('speed', row.speed_over_kmh)}")
    if row.speed_up_to_kmh is not None:
        parts.append(f"up to {measures.with_unit('speed', row.speed_up_to_kmh)}")
    if row.radius_over_m is not None:
        parts.append(f"R over {measures.with_unit('radius', row.radius_over_m)}")
    if row.radius_up_to_m is not None:
        parts.append(f"R up to {measures.with_unit('radius', row.radius_up_to_m)}")
    if row.per_metre_of_radius:
        parts.append(f"plus {row.per_metre_of_radius:g} {row.unit} for each metre of radius")
    if row.kind == "ceiling":
        parts.append("ceiling: not to be passed in service")
    return ", ".join(parts) or "always"


def parse(
    given: Mapping[str, str], measures: Measures, before: LimitSet
) -> tuple[LimitSet | None, dict[str, str]]:
    """Give the limits of a form that was sent, and the problems by field.

    Parameters
    ----------
    given : mapping of str to str
        ``N-normal``, ``N-exceptional``, ``N-clause``, ``N-note``, ``N-remove`` of rule N of ``before``;
        ``new-N-...`` of rules to add.
    measures : Measures
        Units in which the conditions of new rules are given.
    before : LimitSet
        What the form was shown with.
    """
    fields = Fields(given, measures)
    rows = [
        changed
        for number, row in enumerate(before.rows)
        if not given.get(f"{number}-remove") and (changed := _changed(fields, number, row)) is not None
    ]
    rows += [
        added
        for number in range(SPARE_ROWS)
        if given.get(f"new-{number}-normal", "").strip() and (added := _added(fields, number)) is not None
    ]
    if fields.problems:
        return None, fields.problems
    if rows == list(before.rows):
        return before, {}
    return before.model_copy(update={"rows": tuple(rows), "edited": True}), {}


def _changed(fields: Fields, number: int, row: LimitRow) -> LimitRow | None:
    if f"{number}-normal" not in fields.given:
        return row
    lowest = None if row.per_metre_of_radius else 0.0
    normal = fields.number(f"{number}-normal", before=row.normal, lowest=lowest, unlimited=True)
    if normal is None:
        fields.problems.setdefault(f"{number}-normal", "a value is needed, or the word none")
        return None
    exceptional = fields.number(
        f"{number}-exceptional", before=row.exceptional, lowest=lowest, unlimited=True
    )
    update = {
        "normal": normal,
        "exceptional": exceptional,
        "clause": fields.text(f"{number}-clause"),
        "note": fields.text(f"{number}-note"),
    }
    return row.model_copy(update=update)


def _added(fields: Fields, number: int) -> LimitRow | None:
    name = f"new-{number}-"
    quantity = fields.choice(f"{name}quantity", QUANTITY_NAMES, "cant")
    unit = fields.choice(f"{name}unit", UNIT_SYMBOLS, "mm")
    if UNITS[unit].dimension not in QUANTITIES[quantity].dimensions:
        fits = [s for s in UNIT_SYMBOLS if UNITS[s].dimension in QUANTITIES[quantity].dimensions]
        fields.problems[f"{name}unit"] = f"{quantity} is stated in one of: {', '.join(fits)}"
    values: dict[str, object] = {
        "quantity": quantity,
        "unit": unit,
        "normal": fields.number(f"{name}normal", unlimited=True),
        "exceptional": fields.number(f"{name}exceptional", unlimited=True),
        "category": fields.text(f"{name}category").lower(),
        "situation": fields.text(f"{name}situation").lower(),
        "kind": fields.choice(f"{name}kind", KINDS, "design"),
        "clause": fields.text(f"{name}clause"),
        "note": fields.text(f"{name}note"),
    }
    values |= {key: fields.number(f"{name}{key}", kind) for key, kind in CONDITIONS}
    if fields.problems:
        return None
    try:
        return LimitRow.model_validate(values)
    except ValidationError as error:
        fields.problems[f"{name}normal"] = error.errors()[0]["msg"]
        return None
