"""From the record of a curve to its page: rows of classes and transitions, and the drawing of the section."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from markupsafe import Markup

from webapp.computing import Computed
from webapp.drawings.section import acting, draw_section
from webapp.measures import Measures

Record = Mapping[str, Any]


def class_rows(record: Record) -> list[tuple[Record, Record | None]]:
    """Pair the figures of each class with the proposed cant and with today's (None where not known)."""
    today = {figures["class"]: figures for figures in (record["today"] or {}).get("classes", ())}
    return [(figures, today.get(figures["class"])) for figures in record["classes"]]


def transition_rows(record: Record) -> list[tuple[str, Record]]:
    """Give the transitions in and out, as far as the record has them."""
    known = record.get("transitions") or {}
    words = {"in": "Transition in", "out": "Transition out"}
    return [(words[end], known[end]) for end in ("in", "out") if known.get(end)]


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
