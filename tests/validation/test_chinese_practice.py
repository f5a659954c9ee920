"""Chinese practice pages: 11.8 V^2 / R, 7.6 V^2 / R on new lines, versine on a chord of 20 m."""

from __future__ import annotations

from published import Row, equilibrium, one, rows

from cant.quantities.geometry import versine_from_radius
from cant.quantities.kinematics import equilibrium_cant


def test_equilibrium_cant() -> None:
    for identity in ("CN-4000", "CN-5000"):
        one(identity).check(equilibrium_cant_mm=equilibrium(one(identity)))


def test_versine() -> None:
    row = one("CN-vers")
    row.check(versine_mm=versine_from_radius(row.given["radius_m"], row.given["chord_m"]))


@rows("CN-76-")
def test_new_lines(row: Row) -> None:
    """Cant is set at 7.6 / 11.8 of the equilibrium at the highest speed."""
    full = equilibrium_cant(row.given["speed_max_kmh"], row.given["radius_m"], 11.8)
    row.check(cant_mm=7.6 / 11.8 * full)
