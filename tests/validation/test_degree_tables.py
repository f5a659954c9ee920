"""Radii by degree of curve: a handbook table (p. 46), an encyclopaedia page, MIL-HDBK-1005/6.

Left out of the handbook's table are 1 1/4 and 6 1/2 degrees, which are misprinted there.
"""

from __future__ import annotations

import pytest
from published import Row, one, rows

from cant.quantities.geometry import degree_from_radius, radius_from_degree
from cant.units import FOOT_M


@rows("US-CHORD-")
def test_handbook_radius(row: Row) -> None:
    """Degrees on a chord of 100 ft; printed to the foot, the last to a tenth."""
    degree = row.given["degree_of_curve"]
    radius = radius_from_degree(degree, "100 ft chord") / FOOT_M
    row.check(radius_ft=radius)
    rounding = 0.5 if row.printed["radius_ft"] >= 1000 else 0.05
    assert abs(radius - row.printed["radius_ft"]) <= rounding
    assert degree_from_radius(radius * FOOT_M, "100 ft chord") == pytest.approx(degree, rel=1e-12)


def test_one_degree_on_a_chord() -> None:
    radius = radius_from_degree(1, "100 ft chord")
    one("US-deg-1").check(radius_m=radius, radius_ft=radius / FOOT_M)


def test_arc_definition() -> None:
    row = one("US-MIL")
    row.check(radius_ft=radius_from_degree(row.given["degree_of_curve"], "100 ft arc") / FOOT_M)


@pytest.mark.parametrize(
    ("kind", "radius"), [("100 ft arc", 1746.4), ("20 m chord", 1145.9), ("20 m arc", 1145.9)]
)
def test_one_degree_of_other_kinds(kind: str, radius: float) -> None:
    """A Brazilian railway engineering manual page gives 20 m chords: a factor of 1.5 between countries."""
    assert radius_from_degree(1, kind) == pytest.approx(radius, abs=0.05)
