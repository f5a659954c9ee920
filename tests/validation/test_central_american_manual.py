"""Central American harmonised railway manual, vol. I p. 71: 0.4 m/s2 is 61 mm."""

from __future__ import annotations

from published import one

from cant.quantities.kinematics import cant_from_acceleration


def test_acceleration_in_mm() -> None:
    row = one("CA-04")
    deficiency = cant_from_acceleration(row.given["lateral_acceleration_m_s2"], row.given["rail_spacing_mm"])
    row.check(cant_deficiency_mm=deficiency)
