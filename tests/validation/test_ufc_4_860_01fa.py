"""UFC 4-860-01FA, table 6-2: spiral of 40 ft for each inch of cant."""

from __future__ import annotations

from published import one

from cant.quantities.lengths import length_for_gradient
from cant.units import FOOT_M, INCH_MM


def test_spiral_length() -> None:
    row = one("US-UFC")
    length = length_for_gradient(row.given["cant_in"] * INCH_MM, INCH_MM / (40 * FOOT_M))
    row.check(spiral_length_ft=length / FOOT_M)
