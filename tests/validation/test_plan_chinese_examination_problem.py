"""A Chinese examination problem of mixed speeds through the whole planner.

R 600, mean 66.7, fastest 90, freight 45 km/h, limits 75 and 50 mm: the range is 84.3 to 89.8 mm, 85 is right,
90 fails by excess (50.2 mm). An examination problem, not a standard.
"""

from __future__ import annotations

import pytest
from published import one

from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line


def plan(**row: object) -> Plan:
    given = one("CN-600a").given
    fast = TrainClass(name="Fastest", category="passenger", speed_kmh=90)
    freight = TrainClass(name="Freight", category="freight", speed_kmh=45)
    limits = LimitSet(
        name="problem",
        rows=(
            LimitRow(quantity="cant deficiency", normal=75, unit="mm"),
            LimitRow(quantity="cant excess", normal=50, unit="mm"),
        ),
    )
    curves = CurveList.from_rows([{"radius_m": given["radius_m"], "hand": "L", **row}])
    return plan_line(curves, Traffic.of([fast, freight]), limits, Settings(equilibrium_constant=11.8))


def test_the_range_and_the_cant() -> None:
    record = plan().record(0)
    assert record["lower_mm"] == pytest.approx(84.3, abs=0.05)
    assert record["upper_mm"] == pytest.approx(89.8, abs=0.05)
    assert record["recommended_cant_mm"] == 85
    for identity, name, key in (
        ("CN-600b", "Fastest", "deficiency_mm"),
        ("CN-600c", "Freight", "excess_mm"),
    ):
        figures = next(entry for entry in record["classes"] if entry["class"] == name)
        (printed,) = one(identity).printed.values()
        assert figures[key] == pytest.approx(printed, abs=0.05)


def test_90_mm_fails_by_excess() -> None:
    today = plan(cant_mm=90.0).record(0)["today"]
    assert today["status"] == "breaks limits"
    assert [b["quantity"] for b in today["breaks"]] == ["cant excess"]
    assert today["breaks"][0]["value"] == pytest.approx(50.2, abs=0.05)
