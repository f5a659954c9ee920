"""Commission Regulation (EU) No 1299/2014, annex: limit set for standard gauge, freight or mixed traffic."""

from __future__ import annotations

from governing import strictest
from published import Row, one, rows

from cant import limit_sets

SET = limit_sets.load("eu-1299-2014")


def test_largest_cant_of_mixed_traffic_on_ballast() -> None:
    """4.2.4.2(1), table 7."""
    one("TSI-D-frei-bal").check(cant_max_mm=strictest(SET, "cant") or 0)


def test_largest_cant_at_a_platform() -> None:
    """4.2.4.2(2)."""
    one("TSI-D-plat").check(cant_max_mm=strictest(SET, "cant", situation="platform") or 0)


@rows("TSI-D-R50-")
def test_largest_cant_of_small_radius(row: Row) -> None:
    """4.2.4.2(3): (R - 50) / 1.5; above R 290 the 160 mm of mixed traffic are the stricter."""
    radius = row.given["radius_m"]
    value = strictest(SET, "cant", radius_m=radius)
    assert value is not None
    if radius <= 290:
        row.check(cant_max_mm=value)
    else:
        assert value == 160


def test_cant_in_service() -> None:
    """4.2.8.5."""
    one("TSI-Dserv-1435-all").check(cant_max_in_service_mm=strictest(SET, "cant", kind="ceiling") or 0)


@rows("TSI-I-Loc-")
def test_cant_deficiency_of_passenger_stock(row: Row) -> None:
    """4.2.4.3, table 8."""
    row.check(cant_deficiency_max_mm=strictest(SET, "cant deficiency", speed_kmh=row.given["speed_kmh"]) or 0)


@rows("TSI-I-fre-")
def test_cant_deficiency_of_freight_wagons(row: Row) -> None:
    """4.2.4.3, table 8: nothing is printed above 160 km/h, which is a gap."""
    speed = row.given["speed_kmh"]
    value = strictest(SET, "cant deficiency", category="freight", speed_kmh=speed)
    row.check(cant_deficiency_max_mm=value or 0)
    assert strictest(SET, "cant deficiency", category="freight", speed_kmh=speed + 1) is None


@rows("TSI-dI-")
def test_abrupt_change_of_cant_deficiency(row: Row) -> None:
    """4.2.4.4(1), whatever the category."""
    for category in ("passenger", "freight", "another"):
        value = strictest(
            SET, "abrupt change of cant deficiency", category=category, speed_kmh=row.given["speed_kmh"]
        )
        row.check(abrupt_change_cant_deficiency_max_mm=value or 0)
