"""Wheel loads against moments about the rails, and what the gang is given along a ramp."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.errors import InputError
from cant.quantities.lifting import lateral_shift, ramp_ordinates, rise_of_centre, stations
from cant.quantities.loads import wheel_load_shift, wheel_load_shift_at_rest


def test_wheel_load_shift_by_hand() -> None:
    """100 mm, 1.8 m, 1500 mm: 16 %; the same cant at rest goes the other way."""
    assert wheel_load_shift(100, 1.8, 1500) == pytest.approx(0.16)
    assert wheel_load_shift_at_rest(100, 1.8, 1500) == pytest.approx(-0.16)


@given(st.floats(0, 0.12), st.floats(0.5, 2.5), st.floats(1000, 1750))
def test_wheel_load_shift_against_moments(share: float, height: float, spacing: float) -> None:
    """Moments about the inner rail of a rigid body on an inclined plane at rest, to first order."""
    cant = share * spacing
    angle = math.asin(share)
    outer = math.cos(angle) / 2 - math.sin(angle) * height * 1000 / spacing
    shift = 2 * outer - 1
    assert wheel_load_shift_at_rest(cant, height, spacing) == pytest.approx(shift, abs=0.01)


def test_nothing_shifts_at_equilibrium() -> None:
    assert wheel_load_shift(0, 2.0, 1500) == 0


def test_stations_are_round_and_keep_both_ends() -> None:
    assert stations(1003, 1031.5, 10).tolist() == [1003, 1010, 1020, 1030, 1031.5]
    assert stations(1031.5, 1003, 10).tolist() == [1031.5, 1030, 1020, 1010, 1003]
    assert stations(1000, 1020, 10).tolist() == [1000, 1010, 1020]
    assert stations(1000.0004, 1020, 10).tolist() == [1000.0004, 1010, 1020]
    assert stations(1004, 1004, 5).tolist() == [1004]
    assert stations(-7, 6, 5).tolist() == [-7, -5, 0, 5, 6]


@pytest.mark.parametrize("spacing", [0.0, -5.0, math.nan])
def test_stations_need_a_distance(spacing: float) -> None:
    with pytest.raises(InputError, match="must be more than 0 m"):
        stations(0, 10, spacing)


def test_ordinates_of_a_reverse_ramp_pass_zero() -> None:
    points = stations(1000, 1060, 10)
    cant = ramp_ordinates(points, 1000, 1060, -60, 60, "linear")
    np.testing.assert_allclose(cant, [-60, -40, -20, 0, 20, 40, 60])


@pytest.mark.parametrize("shape", ["linear", "bloss", "cosine", "helmert", "sine"])
def test_ordinates_do_not_depend_on_the_direction(shape: str) -> None:
    points = np.linspace(990, 1070, 41)
    forth = ramp_ordinates(points, 1000, 1060, 0, 90, shape)
    back = ramp_ordinates(points, 1060, 1000, 90, 0, shape)
    np.testing.assert_allclose(forth, back, atol=1e-9)
    assert forth[0] == 0
    assert forth[-1] == pytest.approx(90)


def test_a_ramp_without_length_jumps() -> None:
    np.testing.assert_array_equal(ramp_ordinates([9, 10, 11], 10, 10, 0, 50, "linear"), [0, 0, 50])


def test_what_moves_with_a_lift() -> None:
    """10 mm of cant: 33 mm at a contact wire 5 m up, 5 mm at the centre line, up or down."""
    assert lateral_shift(10, 5.0, 1500) == pytest.approx(33.33, abs=0.01)
    np.testing.assert_array_equal(rise_of_centre([10, -10]), [5, 5])
