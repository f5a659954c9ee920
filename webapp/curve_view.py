"""From the record of a curve to its page: rows of classes and transitions, and the drawing of the section."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from markupsafe import Markup

from cant.model.limits import QUANTITIES
from webapp import words
from webapp.computing import Computed
from webapp.drawings.section import acting, draw_section
from webapp.measures import Measures
from webapp.words import PLACE_WORDS

Record = Mapping[str, Any]
KIND_OF_UNIT = {
    "mm": "cant exact",
    "mm/m": "gradient",
    "mm/s": "rate",
    "m/s2": "acceleration",
    "km/h": "speed",
}
SHOWN_OF_CLASS = frozenset(
    (
        "speed_kmh",
        "run_speed_kmh",
        "permissible_speed_kmh",
        "permissible_by",
        "lowest_speed_kmh",
        "equilibrium_cant_mm",
        "deficiency_mm",
        "excess_mm",
        "unbalanced_acceleration_ms2",
        "felt_acceleration_ms2",
        "deficiency_limit_mm",
        "excess_limit_mm",
        "felt_limit_ms2",
        "share_of_limit",
        "share_of",
        "share_clause",
        "regular",
    )
)
SHOWN = frozenset(
    (
        "sheet",
        "row",
        "line",
        "track",
        "curve",
        "radius_m",
        "hand",
        "existing_cant_mm",
        "recommended_cant_mm",
        "status",
        "tier",
        "lower_mm",
        "upper_mm",
        "target_cant_mm",
        "rms_speed_kmh",
        "equilibrium_speed_kmh",
        "shares_transition_with_next",
        "reason",
        "methods_verdict",
    )
)
"""What the page of a curve shows in its own places; all else follows as it is named in the JSON."""


def class_rows(record: Record) -> list[tuple[Record, Record | None]]:
    """Pair the figures of each class with the proposed cant and with today's (None where not known)."""
    today = {figures["class"]: figures for figures in (record["today"] or {}).get("classes", ())}
    return [(figures, today.get(figures["class"])) for figures in record["classes"]]


def further_classes(record: Record) -> list[dict[str, Any]]:
    """Give the figures of each class that the first table does not show."""
    return [{k: v for k, v in figures.items() if k not in SHOWN_OF_CLASS} for figures in record["classes"]]


def further(record: Record) -> dict[str, Any]:
    """Give the single values of a record that the page does not show elsewhere."""
    return {
        key: value
        for key, value in record.items()
        if key not in SHOWN and value is not None and isinstance(value, (str, int, float, bool))
    }


def limit_rows(found: Sequence[Record], measures: Measures) -> list[dict[str, Any]]:
    """Give limits passed as rows of words: value and limit in the units of the page."""
    rows = []
    for item in found:
        kind = _kind_of(str(item.get("quantity", "")))
        row = dict(item)
        for key in ("value", "limit", "exceptional_limit"):
            if kind is not None and isinstance(row.get(key), (int, float)):
                row[key] = measures.with_unit(kind, row[key])
        if "place" in row:
            row["place"] = PLACE_WORDS.get(row["place"], row["place"])
        rows.append(row)
    return rows


def _kind_of(quantity: str) -> str | None:
    """Give the kind of number of a limited quantity; what a site says of its cant is a cant."""
    if quantity in QUANTITIES:
        return KIND_OF_UNIT.get(QUANTITIES[quantity].canonical)
    return "cant exact" if quantity.startswith("cant") else None


def bound_rows(record: Record, measures: Measures) -> list[dict[str, str]]:
    """Give the bounds of the cant as rows of words, the governing one first on each side."""
    because = record.get("because") or {}
    rows = []
    for side, label in (("lower", "at least"), ("upper", "at most")):
        for bound in limit_rows(because.get(side) or [], measures):
            rows.append(
                {
                    "bound": f"{label} {measures.with_unit('cant exact', bound['mm'])}",
                    "from": bound["quantity"],
                    "class": bound.get("class") or "",
                    "limit": bound.get("limit") or "",
                    "place": bound.get("place") or "",
                    "clause": bound.get("clause") or "",
                }
            )
    return rows


def mix_facts(record: Record, measures: Measures) -> list[tuple[str, str]]:
    """Give what the bounds leave: room or shortfall, and the radius below which no cant serves the mix."""
    because = record.get("because") or {}
    facts = []
    if because.get("shortfall_mm") is not None:
        facts.append(("Shortfall", measures.with_unit("cant exact", because["shortfall_mm"])))
    elif because.get("room_mm") is not None:
        facts.append(("Room between the bounds", measures.with_unit("cant exact", because["room_mm"])))
    if because.get("smallest_radius_for_mix_m") is not None:
        classes = " and ".join(because.get("classes_of_mix") or ())
        radius = measures.with_unit("radius", because["smallest_radius_for_mix_m"])
        facts.append(("Smallest radius that any cant serves", f"{radius}, for {classes}"))
    return facts


def transition_rows(record: Record) -> list[tuple[str, Record]]:
    """Give the transitions in and out, as far as the record has them."""
    known = record.get("transitions") or {}
    return [
        (words.sentence(PLACE_WORDS[place]), known[end])
        for place, end in (("before", "in"), ("after", "out"))
        if known.get(end)
    ]


def section(computed: Computed, record: Record, measures: Measures, *, today: bool = False) -> Markup | None:
    """Draw the section with the proposed cant or with today's; None where cant or radius is not known."""
    cant = record["existing_cant_mm" if today else "recommended_cant_mm"]
    radius = record["radius_m"]
    if cant is None or not radius:
        return None
    plan = computed.planned.plan
    trains = plan.traffic.on(record["line"], record["track"])
    figures = record["today"]["classes"] if today else record["classes"]
    spacing = plan.settings.spacing_mm
    classes = [
        acting(
            f["class"],
            f["run_speed_kmh"],
            trains[f["class"]].centre_of_gravity_m if f["class"] in trains else None,
            radius,
            cant,
            spacing,
        )
        for f in figures
    ]
    return draw_section(cant, spacing, -1 if record["hand"] == "R" else 1, classes, measures)


def heights_assumed(computed: Computed, record: Record) -> list[str]:
    """Give the classes that are drawn with a usual height of the centre of gravity, as none is known."""
    trains = computed.planned.plan.traffic.on(record["line"], record["track"])
    return [
        f["class"]
        for f in record["classes"]
        if f["class"] not in trains or trains[f["class"]].centre_of_gravity_m is None
    ]
