"""MxV Rail technology digest on superelevation: a 6.2 degree curve balances at about 24 mph with 2.5 in."""

from __future__ import annotations

from published import one

from cant.quantities.constants import constant_from_us
from cant.quantities.geometry import radius_from_degree
from cant.quantities.kinematics import equilibrium_cant
from cant.quantities.speeds import equilibrium_speed
from cant.units import INCH_MM, MILE_KM


def test_balance_speed() -> None:
    row = one("US-MXV")
    radius, constant = (
        radius_from_degree(row.given["degree_of_curve"], "100 ft chord"),
        constant_from_us(0.0007),
    )
    cant = equilibrium_cant(row.given["speed_mph"] * MILE_KM, radius, constant)
    row.check(equilibrium_cant_in=cant / INCH_MM)
    assert abs(equilibrium_speed(2.5 * INCH_MM, radius, constant) / MILE_KM - 24) < 0.1
