"""Rates and lengths: units against pint, each length and bound just keeps its limit, jumps and blanks."""

from __future__ import annotations

import math

import numpy as np
import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.quantities import bounds
from cant.quantities.kinematics import equilibrium_cant, felt_acceleration, unbalanced_acceleration
from cant.quantities.lengths import length_for_gradient, length_for_rate, needed_length, speed_for_rate
from cant.quantities.shapes import peak_factor, profile
from cant.quantities.transitions import (
    cant_gradient,
    jerk,
    rate_of_change_of_cant,
    rate_of_change_of_deficiency,
    roll_rate,
)

UNITS = pint.UnitRegistry()
changes = st.floats(-300, 300)
speeds = st.floats(5, 300)
lengths = st.floats(10, 300)
rates = st.floats(20, 100)
factors = st.sampled_from([1.0, 1.5, math.pi / 2, 2.0])


def test_rate_against_pint() -> None:
    rate = (110 * UNITS.mm / (90 * UNITS.m) * (140 * UNITS.km / UNITS.hour)).to("mm/s").magnitude
    assert rate_of_change_of_cant(110, 140, 90) == pytest.approx(rate, rel=1e-12)
    assert rate_of_change_of_deficiency(110, 140, 90) == pytest.approx(rate, rel=1e-12)
    change = (9.81 * UNITS.m / UNITS.s**2 / (1500 * UNITS.mm) * (rate * UNITS.mm / UNITS.s)).to("m/s^3")
    assert jerk(rate, 1500) == pytest.approx(change.magnitude, rel=1e-12)
    assert roll_rate(rate, 1500) == pytest.approx(rate / 1500)


@pytest.mark.parametrize("shape", ["linear", "bloss", "cosine", "helmert", "sine"])
def test_peak_rate_against_a_train_that_runs_over_the_ramp(shape: str) -> None:
    """Cant over time, differentiated numerically: 120 mm in 100 m at 108 km/h."""
    cant, length, speed = 120.0, 100.0, 108.0
    time = np.linspace(0, length / (speed / 3.6), 20_001)
    travelled = speed / 3.6 * time
    largest = np.max(np.gradient(cant * profile(travelled / length, shape), time))
    assert rate_of_change_of_cant(cant, speed, length, peak_factor(shape)) == pytest.approx(largest, rel=1e-3)


def test_jumps_and_blanks() -> None:
    np.testing.assert_array_equal(cant_gradient([0, 20, -20], 0), [0, math.inf, -math.inf])
    assert math.isnan(cant_gradient(20, math.nan))
    assert math.isnan(cant_gradient(0, math.nan))
    assert rate_of_change_of_cant(-150, 36, 100) == -15


@given(changes, changes, speeds, st.floats(0.5, 4), rates, rates, factors)
def test_needed_length_keeps_all_three_and_one_of_them_just(
    cant: float, deficiency: float, speed: float, steepest: float, fast_d: float, fast_i: float, factor: float
) -> None:
    length = needed_length(cant, deficiency, speed, steepest, fast_d, fast_i, factor)
    if length < 1e-3:
        return
    shares = [
        abs(cant_gradient(cant, length, factor)) / steepest,
        abs(rate_of_change_of_cant(cant, speed, length, factor)) / fast_d,
        abs(rate_of_change_of_deficiency(deficiency, speed, length, factor)) / fast_i,
    ]
    assert max(shares) == pytest.approx(1, rel=1e-9)


def test_no_limit_needs_no_length() -> None:
    assert length_for_gradient(150, math.inf) == 0
    assert length_for_rate(150, 160, math.inf) == 0


@given(st.floats(0, 160), st.floats(150, 5000), lengths, rates, factors)
def test_speed_for_rate_uses_the_whole_limit(
    cant: float, radius: float, length: float, limit: float, factor: float
) -> None:
    speed = speed_for_rate(cant, radius, length, limit, 11.8, factor)
    deficiency = equilibrium_cant(speed, radius, 11.8) - cant
    assert deficiency > 0
    rate = rate_of_change_of_deficiency(deficiency, speed, length, factor)
    assert rate == pytest.approx(limit, rel=1e-6)


def test_speed_for_rate_on_straight_track_and_unknown_length() -> None:
    assert speed_for_rate(0, math.inf, 80, 55, 11.8) == math.inf
    assert math.isnan(speed_for_rate(100, 500, math.nan, 55, 11.8))


@given(speeds, lengths, rates, factors, st.floats(0.5, 4))
def test_bounds_just_keep_their_limit(
    speed: float, length: float, limit: float, factor: float, steepest: float
) -> None:
    change = bounds.most_change_for_rate(limit, speed, length, factor)
    assert rate_of_change_of_cant(change, speed, length, factor) == pytest.approx(limit, rel=1e-9)
    cant = bounds.most_cant_for_gradient(steepest, length, factor)
    assert cant_gradient(cant, length, factor) == pytest.approx(steepest, rel=1e-9)


@given(st.floats(0.2, 1.5), st.floats(-0.5, 0.6), st.floats(900, 1800), st.floats(0, 300))
def test_bound_of_felt_acceleration(limit: float, roll: float, spacing: float, needed: float) -> None:
    unbalance = bounds.unbalance_for_felt_acceleration(limit, roll, spacing)
    for cant, felt in ((needed - unbalance, limit), (needed + unbalance, -limit)):
        acceleration = unbalanced_acceleration(needed, cant, spacing)
        assert felt_acceleration(acceleration, roll) == pytest.approx(felt, rel=1e-9)


def test_bounds_of_deficiency_and_excess_and_what_does_not_bound() -> None:
    assert bounds.least_cant_for_deficiency(180, 130) == 50
    assert bounds.most_cant_for_excess(40, 110) == 150
    assert bounds.most_cant_for_excess(40, math.inf) == math.inf
    assert bounds.most_change_for_rate(55, 0, 80) == math.inf
    assert bounds.unbalance_for_felt_acceleration(1.0, -1.0, 1500) == math.inf
    np.testing.assert_allclose(bounds.utilisation([65, 130], [130, math.inf]), [0.5, 0])
