"""Shapes of a transition: peaks against numerical differentiation, shifts against numerical integration."""

from __future__ import annotations

import math

import numpy as np
import pytest

from cant.errors import InputError
from cant.model.curves import SHAPES
from cant.quantities.shapes import SHIFT_FACTORS, peak_factor, profile, profile_slope, shift_of_arc

shapes = pytest.mark.parametrize("shape", SHAPES)
SHARE = np.linspace(0.0, 1.0, 20_001)


@shapes
def test_peak_factor_is_the_steepest_numerical_slope(shape: str) -> None:
    slope = np.gradient(profile(SHARE, shape), SHARE)
    assert np.max(slope) == pytest.approx(float(peak_factor(shape)), abs=2e-4)
    assert np.argmax(profile_slope(SHARE, shape)) in (0, len(SHARE) // 2)


@shapes
def test_slope_is_the_derivative(shape: str) -> None:
    inner = SHARE[1:-1]
    step = 1e-6
    by_difference = (profile(inner + step, shape) - profile(inner - step, shape)) / (2 * step)
    np.testing.assert_allclose(profile_slope(inner, shape), by_difference, atol=1e-5)


@shapes
def test_profile_runs_from_0_to_1_and_is_symmetric(shape: str) -> None:
    values = profile(SHARE, shape)
    assert values[0] == 0
    assert values[-1] == pytest.approx(1, abs=1e-15)
    assert np.all(np.diff(values) >= 0)
    np.testing.assert_allclose(values + values[::-1], 1, atol=1e-14)


@shapes
def test_outside_the_ramp_nothing_changes(shape: str) -> None:
    np.testing.assert_allclose(profile([-0.5, 1.5], shape), [0, 1], atol=1e-15)
    np.testing.assert_array_equal(profile_slope([-0.5, 1.5], shape), [0, 0])
    assert math.isnan(profile(math.nan, shape))
    assert math.isnan(profile_slope(math.nan, shape))


@shapes
def test_shift_factor_is_the_integral(shape: str) -> None:
    integral = np.trapezoid((1 - SHARE) * profile(SHARE, shape), SHARE) - 1 / 8
    assert integral == pytest.approx(SHIFT_FACTORS[shape], abs=1e-8)


@shapes
def test_shift_against_the_true_curve(shape: str) -> None:
    """L = R / 3: first order, within 0.2 % of the integrated curve."""
    radius, length = 300.0, 100.0
    step = length / (len(SHARE) - 1)
    bend = profile(SHARE, shape) / radius
    angle = np.concatenate(([0.0], np.cumsum((bend[1:] + bend[:-1]) / 2))) * step
    offset = np.trapezoid(np.sin(angle), dx=step) - radius * (1 - math.cos(angle[-1]))
    assert shift_of_arc(length, radius, shape) == pytest.approx(offset, rel=2e-3)


def test_arrays_of_shapes() -> None:
    words = [["linear", "bloss"], ["sine", "linear"]]
    np.testing.assert_array_equal(peak_factor(words), [[1, 1.5], [2, 1]])
    np.testing.assert_allclose(
        shift_of_arc(100, [600, math.inf], ["linear", "bloss"]), [100**2 / 24 / 600, 0]
    )


def test_unknown_shape_lists_the_known() -> None:
    with pytest.raises(
        InputError, match="unknown shape 'spline' of a transition: it is one of linear, bloss"
    ):
        profile(0.5, "spline")
    with pytest.raises(InputError, match="unknown shape 'spline'"):
        peak_factor(["linear", "spline"])
