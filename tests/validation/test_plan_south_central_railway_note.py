"""South Central Railway (India), note on safe speeds on curves: its posted speeds through the whole planner.

The note's rule 0.27 sqrt(R (Ca + Cd)) is the constant 1 / 0.27^2; speeds go down to a multiple of 5 km/h.
"""

from __future__ import annotations

import pytest
from published import one

from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import plan_line


@pytest.mark.parametrize("identity", ["2-85", "3-110", "3-120", "3-140", "4-110"])
def test_posted_speed(identity: str) -> None:
    row = one(f"IN-SCR-{identity}")
    given = row.given
    curve = {"radius_m": given["radius_m"], "hand": "L", "cant_mm": given["cant_mm"], "cant_fixed": True}
    limits = LimitSet(
        name="note",
        rows=(
            LimitRow(quantity="cant deficiency", normal=given["cant_deficiency_mm"], unit="mm"),
            LimitRow(quantity="speed step", normal=5, unit="km/h"),
        ),
    )
    fast = TrainClass(name="Fast", category="passenger", speed_kmh=200)
    plan = plan_line(
        CurveList.from_rows([curve]),
        Traffic.of([fast]),
        limits,
        Settings(equilibrium_constant=1 / 0.27**2),
    )
    (figures,) = plan.record(0)["classes"]
    row.check(speed_kmh_posted=figures["permissible_speed_kmh"])
    assert figures["permissible_by"]["quantity"] == "cant deficiency"
