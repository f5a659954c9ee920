"""An Indian curve sheet, curve no. 1 (R 1200).

The sheet takes 5.6 m as the longest of 5.6, 2.4 and 14.4 m: its own error, not checked here.
"""

from __future__ import annotations

from published import equilibrium, one

from cant.quantities.geometry import degree_from_radius
from cant.quantities.kinematics import cant_deficiency
from cant.quantities.lengths import length_for_gradient, length_for_rate
from cant.quantities.speeds import permissible_speed
from cant.quantities.transitions import cant_gradient


def test_equilibrium_deficiency_and_speed() -> None:
    one("IN-C1a").check(equilibrium_cant_mm=equilibrium(one("IN-C1a")))
    given = one("IN-C1b").given
    one("IN-C1b").check(cant_deficiency_mm=cant_deficiency(given["equilibrium_cant_mm"], given["cant_mm"]))
    given = one("IN-C1c").given
    speed = permissible_speed(given["cant_mm"], given["cant_deficiency_mm"], given["radius_m"], 1 / 0.27**2)
    one("IN-C1c").check(speed_kmh=speed)


def test_transition() -> None:
    """0.0056 C V is 49.6 mm/s, 0.72 C is 1 in 720."""
    row = one("IN-C1d")
    cant, deficiency, speed = (row.given[key] for key in ("cant_mm", "cant_deficiency_mm", "speed_kmh"))
    rate = 1 / (3.6 * 0.0056)
    lengths = {
        "L_0.0056CaV_m": length_for_rate(cant, speed, rate),
        "L_0.0056CdV_m": length_for_rate(deficiency, speed, rate),
        "L_0.72Ca_m": length_for_gradient(cant, 1000 / 720),
    }
    row.check(**lengths)
    row = one("IN-C1e")
    gradient = cant_gradient(row.given["cant_mm"], row.given["transition_length_m"])
    row.check(cant_gradient_1_in=1000 / gradient)


def test_degree() -> None:
    row = one("IN-C1f")
    row.check(degree_of_curve=degree_from_radius(row.given["radius_m"], "1750/D"))
