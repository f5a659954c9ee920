"""Indonesian practice (PM 60/2012, 1067 mm gauge) and a worked design on it, R 780, 112.5 km/h, L 120."""

from __future__ import annotations

import math

from ordinates import ordinates
from published import equilibrium, one

from cant.quantities.bounds import least_cant_for_deficiency
from cant.quantities.geometry import turn_of_curve
from cant.quantities.kinematics import cant_from_acceleration, equilibrium_cant
from cant.quantities.shapes import shift_of_arc
from cant.quantities.speeds import smallest_radius


def test_equilibrium_and_least_cant() -> None:
    """8.8 V^2 / R with 1120 mm; a deficiency of 0.0478 g is 53.54 mm."""
    one("ID-88").check(equilibrium_cant_mm=equilibrium(one("ID-88")))
    row = one("ID-5354")
    acceleration = row.given["lateral_acceleration_g"] * 9.81
    row.check(cant_deficiency_mm=cant_from_acceleration(acceleration, row.given["rail_spacing_mm"]))
    row = one("ID-780a")
    needed = equilibrium_cant(row.given["speed_kmh"], row.given["radius_m"], 8.8)
    row.check(cant_min_mm=least_cant_for_deficiency(needed, 53.54))


def test_normal_cant() -> None:
    """5.95 V^2 / R."""
    row = one("ID-780b")
    row.check(cant_normal_mm=equilibrium_cant(row.given["speed_kmh"], row.given["radius_m"], 5.95))


def test_transition() -> None:
    given = one("ID-780c").given
    radius, length = given["radius_m"], given["transition_length_m"]
    angle = math.degrees(float(turn_of_curve(0, radius, length, 0)))
    one("ID-780c").check(spiral_angle_deg=angle)
    x, y = ordinates(length, radius, "linear")
    one("ID-780d").check(spiral_x_m=x, spiral_y_m=y)
    turned = math.radians(angle)
    one("ID-780e").check(shift_m=shift_of_arc(length, radius), k_m=x - radius * math.sin(turned))


def test_smallest_radius() -> None:
    """0.08 V^2 is 8.8 V^2 over the largest cant of 110 mm."""
    row = one("ID-1152")
    row.check(radius_min_m=smallest_radius(row.given["speed_kmh"], 110, 0, 8.8))
