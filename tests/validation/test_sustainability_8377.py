"""Sustainability 14(14), 8377 (2022), chart of cant for mixed speeds: R 7700, spacing 1500 and 1740 mm."""

from __future__ import annotations

from published import Row, equilibrium, rows


@rows("MDPI-")
def test_equilibrium_cant(row: Row) -> None:
    """The printed figures fit g = 9.8."""
    row.check(equilibrium_cant_mm=equilibrium(row, row.given["g_m_s2"]))
