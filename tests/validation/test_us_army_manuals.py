"""US Army TR 0671 (constant 0.00066) and TM 5-628 (one inch on a chord of 62 ft is one degree)."""

from __future__ import annotations

from published import Row, one, rows

from cant.quantities.bounds import least_cant_for_deficiency
from cant.quantities.constants import constant_from_us
from cant.quantities.geometry import radius_from_degree, versine_of_circle
from cant.quantities.kinematics import equilibrium_cant
from cant.units import FOOT_M, INCH_MM


def needed_in(row: Row) -> float:
    radius = radius_from_degree(row.given["degree_of_curve"], "100 ft arc")
    speed_kmh = row.given["speed_mph"] * 1.609344
    return float(equilibrium_cant(speed_kmh, radius, constant_from_us(0.00066))) / INCH_MM


def test_problem_of_two_degrees_at_55_mph() -> None:
    one("US-ARMY-1").check(equilibrium_cant_in=needed_in(one("US-ARMY-1")))
    row = one("US-ARMY-2")
    row.check(cant_in=least_cant_for_deficiency(needed_in(row), row.given["unbalance_in"]))


@rows("CHORD62-")
def test_one_inch_is_one_degree(row: Row) -> None:
    radius = radius_from_degree(row.given["degree_of_curve"], "100 ft chord")
    versine = versine_of_circle(radius, row.given["chord_ft"] * FOOT_M)
    row.check(mid_ordinate_in=versine / INCH_MM)
