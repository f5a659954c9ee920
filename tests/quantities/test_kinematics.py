"""Speed, radius and cant: limiting cases, signs, arrays, units against pint, and the exact inclined plane."""

from __future__ import annotations

import math

import numpy as np
import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.quantities.constants import CONSTANTS, constant_from_rail_spacing, constant_from_us
from cant.quantities.inclined_plane import (
    equilibrium_cant_exact,
    linear_form_overstatement,
    unbalanced_acceleration_exact,
)
from cant.quantities.kinematics import (
    cant_deficiency,
    cant_excess,
    cant_from_acceleration,
    centripetal_acceleration,
    equilibrium_cant,
    felt_acceleration,
    unbalanced_acceleration,
)

UNITS = pint.UnitRegistry()
speeds = st.floats(1, 400)
radii = st.floats(100, 50_000)
cants = st.floats(0, 300)
spacings = st.floats(900, 1800)


def test_straight_track_needs_no_cant() -> None:
    assert equilibrium_cant(160, math.inf, 11.8) == 0
    assert equilibrium_cant_exact(160, math.inf, 1500) == 0
    assert centripetal_acceleration(160, math.inf) == 0


def test_standing_train_has_all_its_cant_as_excess() -> None:
    standing = equilibrium_cant(0, 500, 11.8)
    assert cant_excess(standing, 120) == 120
    assert cant_deficiency(standing, 120) == 0


def test_sign_of_the_radius_goes_over() -> None:
    assert equilibrium_cant(100, -1000, 11.8) == -equilibrium_cant(100, 1000, 11.8) == -118


def test_nothing_warns_where_there_is_no_answer() -> None:
    assert equilibrium_cant(100, 0, 11.8) == math.inf
    assert math.isnan(equilibrium_cant(0, 0, 11.8))
    assert math.isnan(unbalanced_acceleration_exact(100, 500, 1600, 1500))


def test_nan_passes_through_and_scalars_stay_scalars() -> None:
    result = equilibrium_cant([100, math.nan, 50], [1000, 500, math.nan], 11.8)
    np.testing.assert_array_equal(np.isnan(result), [False, True, True])
    assert np.ndim(equilibrium_cant(100, 1000, 11.8)) == 0
    assert math.isnan(cant_deficiency(math.nan, 100))
    assert math.isnan(cant_excess(100, math.nan))


def test_curves_and_classes_broadcast() -> None:
    speed = np.array([160.0, 100.0, 80.0])
    radius = np.array([600.0, 900.0, 1200.0, math.inf])
    table = equilibrium_cant(speed[None, :], radius[:, None], 11.8)
    assert table.shape == (4, 3)
    for i, r in enumerate(radius):
        for j, v in enumerate(speed):
            assert table[i, j] == equilibrium_cant(v, r, 11.8)


def test_equilibrium_cant_against_pint() -> None:
    """Units carried by pint from km/h, m and mm to the cant: e v^2 / (g R)."""
    speed, radius = 137 * UNITS.km / UNITS.hour, 843 * UNITS.m
    spacing, gravity = 1750 * UNITS.mm, 9.81 * UNITS.m / UNITS.s**2
    cant = (spacing * speed**2 / (gravity * radius)).to("mm").magnitude
    assert equilibrium_cant(137, 843, constant_from_rail_spacing(1750)) == pytest.approx(cant, rel=1e-12)
    acceleration = (speed**2 / radius).to("m/s^2").magnitude
    assert centripetal_acceleration(137, 843) == pytest.approx(acceleration, rel=1e-12)


def test_us_constant_against_pint() -> None:
    """0.0007 in / (mph^2 deg), a degree being a turn of 1 degree in an arc of 100 ft."""
    printed = 0.0007 * UNITS.inch / (UNITS.mile / UNITS.hour) ** 2 / UNITS.degree
    turned = printed * (1 * UNITS.radian) * (100 * UNITS.foot)
    expected = turned.to("mm * m / (km / hour)**2").magnitude
    assert constant_from_us(0.0007) == pytest.approx(expected, rel=1e-12)


def test_constants_against_pint() -> None:
    values = {each.symbol: each.value for each in CONSTANTS}
    assert values["g_n"] == UNITS.Quantity(1, "standard_gravity").to("m/s^2").magnitude
    assert values["in"] == pytest.approx(UNITS.Quantity(1, "inch").to("mm").magnitude, rel=1e-15)
    assert values["ft"] == pytest.approx(UNITS.Quantity(1, "foot").to("m").magnitude, rel=1e-15)
    assert values["mi"] == pytest.approx(UNITS.Quantity(1, "mile").to("km").magnitude, rel=1e-15)


@given(speeds, radii, cants)
def test_deficiency_and_excess_are_two_sides_of_one_number(speed: float, radius: float, cant: float) -> None:
    needed = equilibrium_cant(speed, radius, 11.8)
    deficiency, excess = cant_deficiency(needed, cant), cant_excess(needed, cant)
    assert min(deficiency, excess) == 0
    assert deficiency - excess == pytest.approx(needed - cant)


@given(cants, cants, spacings)
def test_acceleration_and_cant_are_inverse(needed: float, cant: float, spacing: float) -> None:
    acceleration = unbalanced_acceleration(needed, cant, spacing)
    assert cant_from_acceleration(acceleration, spacing) == pytest.approx(needed - cant, abs=1e-9)
    assert (acceleration >= 0) == (needed >= cant)


@given(speeds, radii, spacings)
def test_exact_cant_leaves_no_acceleration(speed: float, radius: float, spacing: float) -> None:
    cant = equilibrium_cant_exact(speed, radius, spacing)
    assert 0 < cant < spacing
    assert unbalanced_acceleration_exact(speed, radius, cant, spacing) == pytest.approx(0, abs=1e-9)


@given(speeds, radii, spacings)
def test_linear_form_lies_above_by_what_it_says(speed: float, radius: float, spacing: float) -> None:
    linear = equilibrium_cant(speed, radius, constant_from_rail_spacing(spacing))
    exact = equilibrium_cant_exact(speed, radius, spacing)
    assert linear >= exact
    assert linear_form_overstatement(linear, spacing) == pytest.approx(linear - exact, abs=1e-9 * linear)


@pytest.mark.parametrize(("cant", "apart"), [(60, 0.05), (160, 0.90), (180, 1.28), (300, 5.83)])
def test_how_far_the_forms_part(cant: float, apart: float) -> None:
    """The figures of the docstring, on 1500 mm."""
    assert linear_form_overstatement(cant, 1500) == pytest.approx(apart, abs=0.005)


def test_felt_acceleration_of_a_rolling_rigid_and_tilting_body() -> None:
    np.testing.assert_allclose(felt_acceleration([1.0, -0.5, 1.0], [0.4, 0.0, -1.0]), [1.4, -0.5, 0.0])
