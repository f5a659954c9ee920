"""Radius from degree and versine, the turn of a curve, a flatter radius: round trips, hand calculations."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.errors import InputError
from cant.quantities.geometry import (
    DEGREE_KINDS,
    apex_offset,
    degree_from_radius,
    radius_from_degree,
    radius_from_versine,
    turn_of_curve,
    versine_from_radius,
    versine_of_circle,
)

kinds = pytest.mark.parametrize("kind", DEGREE_KINDS)


@kinds
def test_degree_and_back(kind: str) -> None:
    degrees = np.array([0.25, 1, 2.5, 10, 15])
    np.testing.assert_allclose(
        degree_from_radius(radius_from_degree(degrees, kind), kind), degrees, rtol=1e-12
    )


@kinds
def test_straight_and_signed_degrees(kind: str) -> None:
    assert radius_from_degree(0, kind) == math.inf
    assert degree_from_radius(math.inf, kind) == 0
    assert radius_from_degree(-2, kind) == -radius_from_degree(2, kind)


def test_radius_below_half_the_chord_has_no_degree() -> None:
    assert math.isnan(degree_from_radius(9, "20 m chord"))


def test_unknown_kind_lists_the_known() -> None:
    with pytest.raises(InputError, match="unknown kind '10 m chord' of degree of curve: it is one of 100 ft"):
        radius_from_degree(1, "10 m chord")


@given(st.floats(100, 10_000), st.floats(5, 30))
def test_versine_of_the_trade_is_that_of_the_circle_but_for_half_the_versine(
    radius: float, chord: float
) -> None:
    circle = versine_of_circle(radius, chord)
    from_trade = radius_from_versine(circle, chord)
    assert radius - from_trade == pytest.approx(circle / 2000, abs=1e-6)
    assert radius_from_versine(versine_from_radius(radius, chord), chord) == pytest.approx(radius, rel=1e-12)


def test_versine_table() -> None:
    """50000 / R on a chord of 20 m, 12500 / R on 10 m; 0 is straight."""
    radius = np.array([150.0, 300.0, 600.0, 1000.0, 5000.0, math.inf])
    np.testing.assert_allclose(versine_from_radius(radius, 20), 50_000 / radius)
    np.testing.assert_allclose(versine_from_radius(radius, 10), 12_500 / radius)
    assert radius_from_versine(0, 20) == math.inf
    assert radius_from_versine(83.33, 20) == pytest.approx(600, abs=0.03)


def test_flatter_radius_by_hand() -> None:
    """A turn of 60 degrees: R (2 / sqrt(3) - 1), so 100 m more of radius move the middle by 15.47 m."""
    turn = turn_of_curve(600 * math.pi / 3 - 80, 600, 60, 100)
    assert turn == pytest.approx(math.pi / 3)
    assert apex_offset(600, 700, turn) == pytest.approx(100 * (2 / math.sqrt(3) - 1))
    assert apex_offset(600, 600, turn) == 0
