"""Two school physics problems on 1524 mm with g = 10: one keeps the true angle, one takes it as small."""

from __future__ import annotations

from published import equilibrium, one

from cant.quantities.inclined_plane import equilibrium_cant_exact


def test_true_angle() -> None:
    """The linear form gives 114.30 mm, the inclined plane the printed 113.98 mm."""
    row = one("RU-114")
    given = row.given
    exact = equilibrium_cant_exact(
        given["speed_kmh"], given["radius_m"], given["rail_spacing_mm"], given["g_m_s2"]
    )
    row.check(equilibrium_cant_mm=exact)
    assert abs(equilibrium(row, given["g_m_s2"]) - 114.30) < 0.005


def test_small_angle() -> None:
    row = one("UA-86")
    row.check(equilibrium_cant_mm=equilibrium(row, row.given["g_m_s2"]))
