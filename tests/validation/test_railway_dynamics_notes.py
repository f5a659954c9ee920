"""Open notes on railway dynamics after the textbook by Pyrgidis: R 1500, 150 km/h, 130 mm of cant."""

from __future__ import annotations

from published import equilibrium, one

from cant.quantities.kinematics import unbalanced_acceleration


def test_lateral_acceleration() -> None:
    row = one("PYR-a")
    needed = equilibrium(row, row.given["g_m_s2"])
    row.check(
        lateral_acceleration_m_s2=unbalanced_acceleration(
            needed, row.given["cant_mm"], row.given["rail_spacing_mm"], row.given["g_m_s2"]
        )
    )
