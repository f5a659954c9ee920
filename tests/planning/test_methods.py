"""The six methods against closed forms on simple cases, through the whole planner."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from cant.errors import InputError
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import METHODS, Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line

C = 11.8
RADIUS = 1000.0


def train(name: str, category: str, speed: float, trains: float, mass: float, **more: Any) -> TrainClass:
    return TrainClass(
        name=name, category=category, speed_kmh=speed, trains_per_day=trains, mass_t=mass, **more
    )


FAST = train("Fast", "passenger", 120, 30, 400)
SLOW = train("Slow", "freight", 80, 20, 1800)
LIMITS = LimitSet(
    name="invented",
    rows=(
        LimitRow(quantity="cant", normal=160, unit="mm"),
        LimitRow(quantity="cant step", normal=1, unit="mm"),
        LimitRow(quantity="cant deficiency", normal=130, unit="mm"),
        LimitRow(quantity="cant excess", normal=70, unit="mm"),
    ),
)


def balance(speed: float, radius: float = RADIUS) -> float:
    return C * speed**2 / radius


def planned(method: str, trains: tuple[TrainClass, ...] = (FAST, SLOW), **more: Any) -> Plan:
    row: dict[str, Any] = {"radius_m": RADIUS, "hand": "L", **more.pop("row", {})}
    settings = Settings(equilibrium_constant=C, method=method, **more)
    return plan_line(CurveList.from_rows([row]), Traffic.of(trains), LIMITS, settings)


def target(method: str, trains: tuple[TrainClass, ...] = (FAST, SLOW), **more: Any) -> float:
    plan = planned(method, trains, **more)
    value = float(plan.record(0)["target_cant_mm"])
    low, high = plan.record(0)["lower_mm"], plan.record(0)["upper_mm"]
    inside = min(max(value, np.ceil(max(low, 0.0))), np.floor(high))
    assert abs(plan.proposed_mm[0] - inside) <= 0.5 + 1e-9
    return value


def test_rms() -> None:
    square = (30 * 400 * 120**2 + 20 * 1800 * 80**2) / (30 * 400 + 20 * 1800)
    assert target("rms") == pytest.approx(C * square / RADIUS)


@pytest.mark.parametrize("fraction", [0.6, 0.65, 2 / 3, 0.7, 1.0])
def test_fraction_of_the_fastest(fraction: float) -> None:
    assert target("fraction", fraction_of_fastest=fraction) == pytest.approx(fraction * balance(120))


def test_balanced_shares_of_deficiency_and_excess_are_equal() -> None:
    cant = target("balanced")
    assert cant == pytest.approx((70 * balance(120) + 130 * balance(80)) / 200)
    assert (balance(120) - cant) / 130 == pytest.approx((cant - balance(80)) / 70)


def test_balanced_has_the_smallest_greatest_share_of_all_cants() -> None:
    """Three classes, the middle one with limits of its own: compared with trying every cant."""
    trains = (FAST, SLOW, train("Middle", "freight", 100, 5, 500), train("Stands", "freight", 0, 1, 500))
    cants = np.linspace(0, 200, 200_001)
    shares = [(balance(t.speed_kmh or 0) - cants) / 130 for t in trains]
    shares += [(cants - balance(t.speed_kmh or 0)) / 70 for t in trains]
    best = cants[np.max(shares, axis=0).argmin()]
    value = planned("balanced", trains).record(0)["target_cant_mm"]
    assert value == pytest.approx(best, abs=2e-3)


def test_balanced_leaves_an_occasional_trains_excess_out() -> None:
    rare = train("Rare", "freight", 40, 1, 500, regular=False)
    assert target("balanced", (FAST, SLOW, rare)) == pytest.approx(target("balanced"))


def test_balanced_without_a_regular_class_is_rms() -> None:
    rare = tuple(t.model_copy(update={"regular": False}) for t in (FAST, SLOW))
    limits = planned("balanced", rare).record(0)
    assert limits["target_cant_mm"] == pytest.approx(planned("rms", rare).record(0)["target_cant_mm"])


def test_least_cant_meets_the_deficiency_of_the_fastest() -> None:
    plan = planned("least")
    assert plan.proposed_mm[0] == np.ceil(balance(120) - 130)


def test_under_the_balance_of_the_class_with_most_tonnes() -> None:
    assert target("underbalance") == pytest.approx(balance(80) - 25)
    assert target("underbalance", underbalance_mm=40) == pytest.approx(balance(80) - 40)
    heavy = FAST.model_copy(update={"mass_t": 4000.0})
    assert target("underbalance", (heavy, SLOW)) == pytest.approx(balance(120) - 25)


def test_under_the_balance_by_trains_where_a_mass_is_not_known() -> None:
    assert target("underbalance", (FAST, SLOW.model_copy(update={"mass_t": None}))) == pytest.approx(
        balance(120) - 25
    )


def test_todays_cant_where_it_is_close() -> None:
    rms = target("rms")
    assert target("today", row={"cant_mm": 110.0}) == 110.0
    assert target("today", row={"cant_mm": 60.0}) == pytest.approx(rms)
    assert target("today", row={"cant_mm": 60.0}, today_within_mm=50.0) == 60.0
    assert target("today") == pytest.approx(rms)


@pytest.mark.parametrize("method", METHODS)
def test_every_method_plans_a_line_without_moving_trains(method: str) -> None:
    assert planned(method, (train("Stands", "freight", 0, 1, 500),)).proposed_mm[0] <= 70


def test_an_unknown_method_is_refused_with_the_known_ones() -> None:
    with pytest.raises(InputError, match="rms, fraction, balanced"):
        planned("best")
