"""A curve at a cant that the engineer looks at: what its panel shows, and the cants that a slider offers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

from cant.explaining import CurveDifference, chain_around, records_at
from cant.planning import levels_of
from webapp import curve_view, words
from webapp.computing import Computed, Slider
from webapp.difference_view import pair_words
from webapp.drawings.cant_scale import Mark, draw_scale
from webapp.drawings.section import acting, draw_section
from webapp.measures import Measures

LARGEST_MM = 300.0
BEYOND_STEPS = 8

Record = Mapping[str, Any]


def _levels(computed: Computed, index: int, record: Record) -> list[float]:
    """Give the cants of a slider [mm]: the grid as far as anything of the curve lies, and some steps more."""
    grid = levels_of(computed.planned.plan, index).tolist()
    keys = ("upper_mm", "lower_mm", "recommended_cant_mm", "existing_cant_mm", "target_cant_mm")
    known = [*(record[key] for key in keys), *(entry["cant_mm"] for entry in record["methods"])]
    furthest = max((value for value in known if value is not None), default=0.0)
    beyond = [level for level in grid if level > furthest][:BEYOND_STEPS]
    end = beyond[-1] if beyond else LARGEST_MM
    off_grid = [v for v in (record["recommended_cant_mm"],) if 0 <= v <= end]
    return sorted({round(level, 6) for level in (*(g for g in grid if g <= end), *off_grid)})


@dataclass(frozen=True)
class Moved:
    """A curve at a cant: its record there, metric, and what its panel shows beside the record.

    Attributes
    ----------
    record : dict
    as_planned_mm : float
    passed : list of dict
        Limits passed, as rows of words.
    range_words : str
        The permitted range at planned speeds, and what bounds it.
    scale, section : Markup
    transitions : list of (str, dict)
    """

    record: dict[str, Any]
    as_planned_mm: float
    passed: list[dict[str, Any]]
    range_words: str
    scale: Markup
    section: Markup
    transitions: list[tuple[str, Record]]


def slider(computed: Computed, index: int) -> Slider:
    """Give a curve at every cant of its slider."""

    def make() -> Slider:
        plan = computed.planned.plan
        record = computed.record(index, plan.settings.units)
        offered = _levels(computed, index, record)
        return Slider(record, dict(zip(offered, records_at(plan, index, offered), strict=True)))

    return computed.slider(index, make)


def moved(computed: Computed, index: int, cant_mm: float, measures: Measures) -> Moved:
    """Look at a curve at a cant, the neighbours as they are."""
    found = slider(computed, index)
    record = found.record
    at = found.at.get(cant_mm) or records_at(computed.planned.plan, index, [cant_mm])[0]
    largest = max(found.levels[-1], cant_mm)
    bounds = (record["lower_mm"], record["upper_mm"])
    return Moved(
        record=at,
        as_planned_mm=record["recommended_cant_mm"],
        passed=curve_view.limit_rows(at["limits_passed"], measures),
        range_words=_range_words(record, measures),
        scale=draw_scale(largest, cant_mm, bounds, _marks(record), measures),
        section=_section(computed, at, cant_mm, measures),
        transitions=curve_view.transition_rows(at),
    )


@dataclass(frozen=True)
class Around:
    """What the chain of a curve would do: its curves before and after, and how two values are shown."""

    rows: list[CurveDifference]
    index: int
    measures: Measures

    def pair(self, values: tuple[float | None, float | None], kind: str) -> str:
        """Give two values as text."""
        return pair_words(values, kind, self.measures)


def around(computed: Computed, index: int, cant_mm: float, measures: Measures) -> Around:
    """Plan the chain of a curve with a cant held."""
    return Around(chain_around(computed.planned.plan, index, cant_mm), index, measures)


def _marks(record: Record) -> list[Mark]:
    marks = []
    for key, label in (("lower_mm", "at least"), ("upper_mm", "at most"), ("existing_cant_mm", "today")):
        if record[key] is not None:
            marks.append(Mark(record[key], label))
    by_cant: dict[float, list[str]] = {}
    for entry in record["methods"]:
        by_cant.setdefault(entry["cant_mm"], []).append(entry["method"])
    if not record.get("cant_held"):  # held, all methods give the same
        marks += [Mark(cant, ", ".join(names)) for cant, names in sorted(by_cant.items())]
    return marks


def _range_words(record: Record, measures: Measures) -> str:
    """Say the permitted range of the curve by itself, and what bounds it."""
    parts = []
    for key, label in (("lower", "at least"), ("upper", "at most")):
        value = record[f"{key}_mm"]
        if value is not None:
            by = words.governing(record[f"{key}_by"])
            parts.append(f"{label} {measures.with_unit('cant exact', value)}" + (f", by {by}" if by else ""))
    return "; ".join(parts)


def _section(computed: Computed, at: Record, cant_mm: float, measures: Measures) -> Markup:
    plan = computed.planned.plan
    trains = plan.traffic.on(at["line"], at["track"])
    spacing = plan.settings.spacing_mm
    classes = [
        acting(
            f["class"],
            f["run_speed_kmh"],
            trains[f["class"]].centre_of_gravity_m if f["class"] in trains else None,
            at["radius_m"],
            cant_mm,
            spacing,
        )
        for f in at["classes"]
    ]
    return draw_section(cant_mm, spacing, -1 if at["hand"] == "R" else 1, classes, measures)
