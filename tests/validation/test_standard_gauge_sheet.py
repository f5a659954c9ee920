"""A standard-gauge curve sheet found in public (low authority): 22 cells, rail spacing 1505 mm."""

from __future__ import annotations

import pytest
from published import Row, rows

from cant.quantities.kinematics import equilibrium_cant


@rows("SHEET-")
def test_equilibrium_cant(row: Row) -> None:
    """Only the constant 1505 / 127 = 11.85 gives all cells, each rounded to 0.1 mm."""
    constant = row.given["rail_spacing_mm"] / 127
    assert constant == pytest.approx(11.85, abs=0.001)
    row.check(equilibrium_cant_mm=equilibrium_cant(row.given["speed_kmh"], row.given["radius_m"], constant))
