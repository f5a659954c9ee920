"""Small invented lines on which planners are compared: many kinds of trouble, few cants to choose from.

One builder, two sources of chance: a seeded plain generator (thousands of cases, each named by its number)
and a hypothesis strategy (which shrinks). Lines are short and cant steps coarse, so that trying every
combination of cants along a chain stays cheap: :data:`MOST_COMBINATIONS` bounds their number.
"""

from __future__ import annotations

import random
from collections.abc import Sequence
from typing import Any, NamedTuple, Protocol, TypeVar

from hypothesis import strategies as st

from cant.model.curves import DOES_NOT_RUN, CurveList
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from reference.cases_limits import DrawnLimits, draw_limits

T = TypeVar("T")
MOST_COMBINATIONS = 1500
EQUILIBRIUM_CONSTANT = 11.798


class Case(NamedTuple):
    """What a planner is given."""

    curves: CurveList
    traffic: Traffic
    limits: LimitSet
    settings: Settings


class Draw(Protocol):
    """A source of chance."""

    def integer(self, low: int, high: int) -> int:
        """Give a whole number, both ends included."""

    def choice(self, options: Sequence[T]) -> T:
        """Give one of some things."""

    def chance(self, percent: int) -> bool:
        """Give True that often."""


class SeededDraw:
    """Chance from a seed."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)

    def integer(self, low: int, high: int) -> int:
        """Give a whole number, both ends included."""
        return self.random.randint(low, high)

    def choice(self, options: Sequence[T]) -> T:
        """Give one of some things."""
        return options[self.random.randrange(len(options))]

    def chance(self, percent: int) -> bool:
        """Give True that often."""
        return self.random.randrange(100) < percent


class HypothesisDraw:
    """Chance from hypothesis; False, the first option and the low end are the simplest."""

    def __init__(self, draw: Any) -> None:
        self.draw = draw

    def integer(self, low: int, high: int) -> int:
        """Give a whole number, both ends included."""
        return int(self.draw(st.integers(low, high)))

    def choice(self, options: Sequence[T]) -> T:
        """Give one of some things."""
        return options[int(self.draw(st.integers(0, len(options) - 1)))]

    def chance(self, percent: int) -> bool:
        """Give True that often."""
        return bool(self.draw(st.integers(0, 99)) >= 100 - percent)


def random_case(seed: int) -> Case:
    """Give the case of a seed."""
    return build(SeededDraw(seed))


@st.composite
def cases(draw: Any) -> Case:
    """Give a hypothesis strategy of cases."""
    return build(HypothesisDraw(draw))


def build(draw: Draw) -> Case:
    """Invent a line, its traffic, its limits and the settings."""
    limits = draw_limits(draw)
    tracks = draw.choice((("up",), ("up",), ("up", "down")))
    trains = _trains(draw, tracks, limits)
    rows: list[dict[str, Any]] = []
    for track in tracks:
        rows += _track(draw, track, trains, limits)
    if draw.chance(30):
        rows = _shuffled(draw, rows)
    settings = Settings(
        rail_spacing_mm=draw.choice((None, None, 1500.0, 1120.0)),
        equilibrium_constant=draw.choice((None, None, None, 11.8)),
        tiers=draw.choice((("normal",), ("normal", "exceptional"), ("normal", "exceptional"))),
        keep_within_mm=draw.choice((0.0, 0.0, 8.0, 15.0, 40.0)),
        maintenance_allowance_mm=draw.choice((None, 10.0)),
    )
    return Case(
        CurveList.from_rows(rows), Traffic.of(trains), LimitSet(name="drawn", rows=limits.rows), settings
    )


def _shuffled(draw: Draw, rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    left, result = list(rows), []
    while left:
        result.append(left.pop(draw.integer(0, len(left) - 1)))
    return result


# -- traffic -----------------------------------------------------------------------------------------------


def _trains(draw: Draw, tracks: Sequence[str], limits: DrawnLimits) -> list[TrainClass]:
    fast = limits.speed_unit * limits.speed_multiple * draw.integer(8, 18)
    count = draw.integer(1, 4)
    rows = []
    for k, (name, category) in enumerate(
        (("Express", "passenger"), ("Goods", "freight"), ("Stopping", "passenger"), ("Ore", "freight"))[
            :count
        ]
    ):
        share = (100, draw.integer(30, 90), draw.integer(60, 100), draw.integer(20, 60))[k]
        rows.append(_train(draw, name, category, round(fast * share / 100, draw.choice((0, 0, 1)))))
    if len(tracks) > 1 and draw.chance(40):
        row = rows[draw.integer(0, count - 1)]
        other = {"speed_kmh": round((row.speed_kmh or 0) * 0.8), "track": tracks[1], "trains_per_day": 3.0}
        rows.append(row.model_copy(update=other))
    return rows


def _train(draw: Draw, name: str, category: str, speed: float) -> TrainClass:
    if name != "Express" and draw.chance(6):
        speed = 0.0
    return TrainClass(
        name=name,
        category=category,
        speed_kmh=speed,
        trains_per_day=draw.choice((10.0, 40.0, 2.0, 25.0, 60.0, 7.0, 12.0, 0.0, None)),
        mass_t=draw.choice((400.0, 900.0, 1800.0, 250.0, 600.0, 3000.0, 1200.0, 500.0, None)),
        roll_coefficient=draw.choice((0.2, 0.0, 0.4)),
        regular=not (name != "Express" and draw.chance(12)),
    )


# -- curves ------------------------------------------------------------------------------------------------


def _track(draw: Draw, track: str, trains: list[TrainClass], limits: DrawnLimits) -> list[dict[str, Any]]:
    longest = max(n for n in range(1, 6) if n == 1 or limits.levels**n <= MOST_COMBINATIONS)
    rows: list[dict[str, Any]] = []
    place_mm = 1_000_000
    chained, hand = 0, "L"
    for k in range(draw.integer(1, 5)):
        row = _curve(draw, track, k, trains, limits)
        hand = row["hand"] = draw.choice((hand, "R" if hand == "L" else "L"))
        if rows:
            distance, sharing = _distance_mm(draw, rows[-1], row, chained < longest)
            chained = chained + 1 if sharing else 1
            place_mm += distance
        else:
            chained = 1
        arc_mm = draw.integer(40, 400) * 1000
        row["start_km"] = place_mm / 1e6
        place_mm += arc_mm
        row["end_km"] = place_mm / 1e6
        if draw.chance(70):
            row["length_m"] = arc_mm / 1000 + draw.choice((0, 0, 0, 7))
        rows.append(row)
    return rows


def _distance_mm(
    draw: Draw, first: dict[str, Any], second: dict[str, Any], may_share: bool
) -> tuple[int, bool]:
    """Give the distance between two arcs [mm], and whether they share a transition."""
    one, two = first.get("transition_out_m") or 0, second.get("transition_in_m") or 0
    larger, total = max(one, two), one + two
    kinds = ["shared", "shared", "shared", "touching", "short"] if may_share else []
    kinds += ["apart", "meeting", "overlap"]
    if draw.chance(3):
        return -draw.integer(600, 30_000), False
    kind = draw.choice(kinds)
    if kind == "shared":
        return int(larger * 1000) + draw.choice((0, 0, 400, -400 if larger else 0)), True
    if kind == "touching":
        first["transition_out_m"] = draw.choice((0.0, 0.0, None))
        second["transition_in_m"] = draw.choice((0.0, 0.0, None))
        return draw.choice((0, 0, 300)), True
    if kind == "short" and larger > 20:
        return int(larger * draw.choice((0.5, 0.8)) * 1000), True
    if kind == "meeting" and total > larger + 1:
        return int(total * 1000), False
    if kind == "overlap" and total > larger + 2:
        return int((larger + (total - larger) * 0.6) * 1000), False
    return int(total * 1000) + draw.integer(1, 200) * 1000, False


def _curve(draw: Draw, track: str, k: int, trains: list[TrainClass], limits: DrawnLimits) -> dict[str, Any]:
    fastest = max(train.speed_kmh or 0 for train in trains)
    wanted = draw.choice((60, 30, 45, 80, 95, 110, 125, 140, 160, 180, 210, 260))
    radius = max(120, round(EQUILIBRIUM_CONSTANT * fastest**2 / (wanted + draw.integer(0, 20))))
    row: dict[str, Any] = {
        "line": "North",
        "track": track,
        "curve": f"{track}-{k + 1}",
        "row": k + 2,
        "rejected": draw.chance(4),
        "radius_m": radius,
        "transition_in_m": _transition(draw, fastest),
        "transition_out_m": _transition(draw, fastest),
        "ramp_in_m": float(draw.integer(2, 150)) if draw.chance(12) else None,
        "ramp_out_m": float(draw.integer(2, 150)) if draw.chance(12) else None,
        "shape": draw.choice(("linear", "linear", "linear", "linear", "bloss", "cosine", "helmert", "sine")),
        "situations": draw.choice((None, None, None, None, ("platform",), ("bridge", "turnout"))),
    }
    if draw.chance(25):
        row["speed_kmh"] = round(fastest * draw.choice((0.9, 0.7, 0.5)))
    row["class_speeds"] = _class_speeds(draw, trains)
    _site(draw, row, limits)
    return row


def _class_speeds(draw: Draw, trains: list[TrainClass]) -> dict[str, float]:
    speeds = {}
    for train in trains:
        if draw.chance(8):
            speeds[train.name] = DOES_NOT_RUN
        elif draw.chance(10):
            speeds[train.name] = float(round((train.speed_kmh or 40) * draw.choice((0.6, 0.8, 1.1))))
    return speeds


def _transition(draw: Draw, fastest: float) -> float | None:
    if draw.chance(10):
        return None
    if draw.chance(9):
        return 0.0
    if draw.chance(3):
        return draw.choice((3.0, 10.0))
    return float(round(fastest * draw.choice((1.0, 0.4, 0.6, 0.8, 1.2, 1.5))))


def _site(draw: Draw, row: dict[str, Any], limits: DrawnLimits) -> None:
    """Give a curve today's cant and the bounds of its site."""
    top = limits.levels - 1
    step = limits.step_mm
    on_grid = draw.integer(0, min(top + 1, 12)) * step
    row["cant_mm"] = draw.choice((on_grid, on_grid + 3.0, on_grid + draw.integer(0, 9), None))
    if row["cant_mm"] is not None and draw.chance(9):
        row["cant_fixed"] = True
    if draw.chance(9):
        row["cant_at_most_mm"] = draw.choice((on_grid, on_grid + 4.0, 0.3 * top * step))
    if draw.chance(7):
        row["cant_at_least_mm"] = draw.choice((on_grid, 0.5 * top * step, 0.9 * top * step))
