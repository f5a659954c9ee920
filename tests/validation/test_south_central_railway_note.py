"""South Central Railway (India), note on the calculation of safe speed on curves."""

from __future__ import annotations

from published import Row, equilibrium, one, rows

from cant.quantities.geometry import radius_from_degree
from cant.quantities.speeds import permissible_speed, speed_on_step

RULE_027 = 1 / 0.27**2


def speed(row: Row) -> float:
    given = row.given
    return float(
        permissible_speed(given["cant_mm"], given["cant_deficiency_mm"], given["radius_m"], RULE_027)
    )


def test_curve_07() -> None:
    radius = one("IN-SCR-07a")
    radius.check(radius_m=radius_from_degree(radius.given["degree_of_curve"], "1750/D"))
    one("IN-SCR-07b").check(speed_kmh=speed(one("IN-SCR-07b")))
    one("IN-SCR-07c").check(equilibrium_cant_mm=equilibrium(one("IN-SCR-07c")))


@rows("IN-SCR-2-")
def test_posted_speed_two_degrees(row: Row) -> None:
    row.check(speed_kmh_posted=speed_on_step(speed(row), 5))


@rows("IN-SCR-3-")
def test_posted_speed_three_degrees(row: Row) -> None:
    """Speeds are rounded down to 5 km/h, never to the nearest."""
    row.check(speed_kmh_posted=speed_on_step(speed(row), 5))


@rows("IN-SCR-4-")
def test_posted_speed_four_degrees(row: Row) -> None:
    row.check(speed_kmh_posted=speed_on_step(speed(row), 5))
