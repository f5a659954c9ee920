"""Indian Railways Permanent Way Manual, para 401: radius by degree, versine by chord."""

from __future__ import annotations

import pytest
from published import Row, rows

from cant.quantities.geometry import radius_from_degree, radius_from_versine, versine_from_radius


@rows("IN-401-")
def test_radius_by_degree(row: Row) -> None:
    """The degree is the angle at the centre of a chord of 30.5 m, rounded to 1750 / D."""
    degree = row.given["degree_of_curve"]
    row.check(radius_m=radius_from_degree(degree, "30.5 m chord"))
    assert radius_from_degree(degree, "1750/D") == pytest.approx(row.printed["radius_m"], rel=1e-12)


@rows("IN-401v-")
def test_versine(row: Row) -> None:
    """R = C^2 / 8V on a chord of 20 m."""
    radius, chord = row.given["radius_m"], row.given["chord_m"]
    row.check(versine_mm=versine_from_radius(radius, chord))
    assert radius_from_versine(versine_from_radius(radius, chord), chord) == pytest.approx(radius, rel=1e-12)
