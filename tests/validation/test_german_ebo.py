"""German railway construction and operation regulation (EBO), par. 6 and 40(7)."""

from __future__ import annotations

from governing import strictest
from published import Row, one, rows

from cant import limit_sets
from cant.quantities.speeds import permissible_speed

SET = limit_sets.load("de-ebo")


@rows("EBO-40-7-")
def test_speed_formula(row: Row) -> None:
    """Par. 40(7): v = sqrt(r / 11.8 (u + u_f))."""
    given = row.given
    assert SET.equilibrium_constant == 11.8
    speed = permissible_speed(
        given["cant_mm"], given["cant_deficiency_mm"], given["radius_m"], SET.equilibrium_constant
    )
    row.check(speed_kmh=speed)


def test_limits() -> None:
    one("EBO-6-3").check(cant_max_in_service_mm=strictest(SET, "cant", kind="ceiling") or 0)
    one("EBO-6-4a").check(cant_gradient_max_mm_per_m=strictest(SET, "cant gradient") or 0)
    assert strictest(SET, "cant", kind="design") is None


def test_cant_deficiency() -> None:
    """Par. 40(7): should not exceed 150 mm, whatever the class and speed."""
    for category in ("passenger", "freight", "another"):
        value = strictest(SET, "cant deficiency", category=category, speed_kmh=230)
        one("EBO-40-7").check(cant_deficiency_max_mm=value or 0)
