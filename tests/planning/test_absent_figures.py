"""What a table may leave out: a figure that no rule asks for must not change the plan."""

from __future__ import annotations

import pytest

from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line

LIMITS = (
    LimitRow(quantity="cant", normal=150, unit="mm"),
    LimitRow(quantity="cant deficiency", normal=100, unit="mm"),
    LimitRow(quantity="cant excess", normal=90, unit="mm"),
)
FELT = LimitRow(quantity="felt acceleration", normal=0.8, exceptional=1.0, unit="m/s2", category="passenger")


def planned(*felt: LimitRow, goods_roll: float | None) -> Plan:
    trains = (
        TrainClass(
            name="Fast",
            category="passenger",
            speed_kmh=100,
            trains_per_day=20,
            mass_t=400,
            roll_coefficient=0.2,
        ),
        TrainClass(
            name="Goods",
            category="freight",
            speed_kmh=60,
            trains_per_day=10,
            mass_t=1500,
            roll_coefficient=goods_roll,
        ),
    )
    row = {"radius_m": 600.0, "hand": "L", "cant_mm": 100.0, "at_least_mm": 20.0}
    limits = LimitSet(name="invented", rows=(*LIMITS, *felt))
    return plan_line(CurveList.from_rows([row]), Traffic.of(trains), limits, Settings())


@pytest.mark.parametrize("felt", [(), (FELT,)], ids=["not limited", "limited for passenger trains"])
def test_a_class_whose_felt_acceleration_nothing_limits_needs_no_roll_coefficient(
    felt: tuple[LimitRow, ...],
) -> None:
    without, stated = planned(*felt, goods_roll=None), planned(*felt, goods_roll=0.2)
    assert without.record(0)["status"] == stated.record(0)["status"] == "change"
    assert without.proposed_mm[0] == stated.proposed_mm[0]
    goods = without.record(0)["classes"][1]
    assert goods["felt_acceleration_ms2"] is None
    assert goods["permissible_speed_kmh"] == stated.record(0)["classes"][1]["permissible_speed_kmh"]
    assert without.record(0)["today"]["breaks"] == []
