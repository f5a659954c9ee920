"""The British constant 11.82 (NR/L2/TRK/2049, B.1) as a published article explains it."""

from __future__ import annotations

from published import Row, equilibrium, rows

from cant.quantities.constants import rail_spacing_from_constant


@rows("UK-1182-")
def test_equilibrium_cant(row: Row) -> None:
    """It implies a rail spacing of 1502 to 1503 mm."""
    row.check(equilibrium_cant_mm=equilibrium(row))
    assert 1502 < rail_spacing_from_constant(row.given["constant"]) < 1503
