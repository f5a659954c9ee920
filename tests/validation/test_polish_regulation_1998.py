"""Polish regulation of 10 September 1998 (Dz.U. 1998 nr 151 poz. 987, as amended 2014), par. 33."""

from __future__ import annotations

from typing import Any

import pytest
from governing import strictest
from published import Row, one, rows

from cant import limit_sets
from cant.quantities.kinematics import cant_from_acceleration, unbalanced_acceleration

SET = limit_sets.load("pl-1998")
CASES: dict[str, dict[str, Any]] = {
    "PL-33-a0": {"radius_m": 251},
    "PL-33-a2": {"category": "freight"},
    "PL-33-a3": {"situation": "siding", "speed_kmh": 40},
    "PL-33-a4": {"radius_m": 250},
    "PL-33-a5": {"radius_m": 200},
    "PL-33-a6": {"situation": "turnout", "speed_kmh": 160},
    "PL-33-a7": {"situation": "turnout", "speed_kmh": 161},
}


@rows("PL-33-a")
def test_acceleration_is_cant_deficiency(row: Row) -> None:
    """Table 3.9; the mm beside it are for 1500 mm and g = 9.81."""
    acceleration = row.printed["lateral_acceleration_max_m_s2"]
    deficiency = cant_from_acceleration(acceleration, 1500)
    row.check(cant_deficiency_equiv_mm_1500=deficiency)
    assert unbalanced_acceleration(deficiency, 0, 1500) == pytest.approx(acceleration, rel=1e-12)


@pytest.mark.parametrize("identity", CASES)
def test_table_3_9_in_the_limit_set(identity: str) -> None:
    value = strictest(SET, "cant deficiency", **CASES[identity])
    one(identity).check(cant_deficiency_equiv_mm_1500=value or 0)


def test_nothing_looser_above_the_printed_speed_of_turnouts() -> None:
    for speed in (161, 200, 250):
        value = strictest(SET, "cant deficiency", situation="turnout", speed_kmh=speed)
        one("PL-33-a7").check(cant_deficiency_equiv_mm_1500=value or 0)


def test_largest_and_smallest_cant() -> None:
    one("PL-33-h").check(
        cant_max_mm=strictest(SET, "cant") or 0, cant_min_mm=strictest(SET, "minimum cant") or 0
    )
