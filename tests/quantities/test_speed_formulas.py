"""Speeds and radii: each inverts what it turns round, and the mix radius is the edge of the possible."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.quantities.kinematics import cant_deficiency, cant_excess, equilibrium_cant
from cant.quantities.speeds import (
    equilibrium_speed,
    lowest_speed,
    permissible_speed,
    rms_speed,
    smallest_radius,
    smallest_radius_for_mix,
    speed_on_step,
    time_over,
)

radii = st.floats(100, 50_000)
cants = st.floats(1, 300)
limits = st.floats(1, 160)
constants = st.floats(7, 14)


@given(cants, radii, constants)
def test_equilibrium_speed(cant: float, radius: float, constant: float) -> None:
    speed = equilibrium_speed(cant, radius, constant)
    assert equilibrium_cant(speed, radius, constant) == pytest.approx(cant, rel=1e-9)
    assert equilibrium_speed(cant, -radius, constant) == speed


@given(cants, limits, radii, constants)
def test_permissible_speed_uses_the_whole_limit(
    cant: float, limit: float, radius: float, constant: float
) -> None:
    speed = permissible_speed(cant, limit, radius, constant)
    assert cant_deficiency(equilibrium_cant(speed, radius, constant), cant) == pytest.approx(limit, abs=1e-6)
    assert smallest_radius(speed, cant, limit, constant) == pytest.approx(radius, rel=1e-9)


@given(cants, limits, radii, constants)
def test_lowest_speed_uses_the_whole_limit(cant: float, limit: float, radius: float, constant: float) -> None:
    speed = lowest_speed(cant, limit, radius, constant)
    excess = cant_excess(equilibrium_cant(speed, radius, constant), cant)
    assert excess == pytest.approx(min(cant, limit), abs=1e-6)
    assert (speed == 0) == (cant <= limit)


def test_limiting_cases() -> None:
    assert equilibrium_speed([0, -20, 100], [500, 500, math.inf], 11.8).tolist() == [0, 0, math.inf]
    assert equilibrium_speed(0, math.inf, 11.8) == 0
    assert permissible_speed(-80, 75, 300, 13.76) == 0
    assert permissible_speed(0, 75, math.inf, 13.76) == math.inf
    assert lowest_speed(120, math.inf, 600, 11.8) == 0
    assert lowest_speed(120, 100, math.inf, 11.8) == math.inf
    assert smallest_radius(100, -80, 75, 11.8) == math.inf
    assert smallest_radius(0, 100, 75, 11.8) == 0
    assert smallest_radius_for_mix(80, 160, 130, 110, 11.8) == 0


def test_nan_passes_through() -> None:
    for unknown in ((math.nan, 500, 11.8), (-5, math.nan, 11.8), (0, 500, math.nan)):
        assert math.isnan(equilibrium_speed(*unknown))


def test_radius_of_a_mix_by_hand() -> None:
    """160 and 80 km/h with 130 and 110 mm: 11.8 (25600 - 6400) / 240 = 944 m."""
    assert smallest_radius_for_mix(160, 80, 130, 110, 11.8) == pytest.approx(944)


@given(st.floats(60, 300), st.floats(0, 1), limits, limits, constants)
def test_radius_of_a_mix_is_the_edge(
    fast: float, share: float, deficiency: float, excess: float, constant: float
) -> None:
    slow = share * fast
    radius = smallest_radius_for_mix(fast, slow, deficiency, excess, constant)
    if radius < 1:
        return
    for factor, possible in ((1.001, True), (0.999, False)):
        least = equilibrium_cant(fast, factor * radius, constant) - deficiency
        most = equilibrium_cant(slow, factor * radius, constant) + excess
        assert (least <= most) == possible


def test_rms_speed_by_hand_and_with_classes_that_do_not_run() -> None:
    """15, 10, 5 and 2 trains at 50, 60, 70 and 80 km/h."""
    by_hand = math.sqrt((15 * 2500 + 10 * 3600 + 5 * 4900 + 2 * 6400) / 32)
    assert rms_speed([50, 60, 70, 80], [15, 10, 5, 2]) == pytest.approx(by_hand, rel=1e-12)
    table = rms_speed([[100, math.nan], [100, 50], [math.nan, math.nan]], [1, 3])
    np.testing.assert_allclose(table, [100, math.sqrt((10_000 + 3 * 2500) / 4), math.nan])
    assert math.isnan(rms_speed([100, 50], [0, 0]))


@given(st.lists(st.tuples(st.floats(10, 300), st.floats(0.1, 1e4)), min_size=1, max_size=5), st.floats(-9, 9))
def test_cant_of_the_rms_speed_has_the_least_squares(mix: list[tuple[float, float]], step: float) -> None:
    speed, weight = np.array(mix).T
    needed = equilibrium_cant(speed, 1000, 11.8)
    best = equilibrium_cant(rms_speed(speed, weight), 1000, 11.8)

    def squares(cant: float) -> float:
        return float(np.sum(weight * (needed - cant) ** 2))

    assert squares(float(best)) <= squares(float(best) + step) * (1 + 1e-9) + 1e-6


@pytest.mark.parametrize(("speed", "posted"), [(88.8, 85), (90.0, 90), (89.9999999999999, 90), (4.9, 0)])
def test_speed_on_step(speed: float, posted: float) -> None:
    assert speed_on_step(speed, 5) == posted


def test_time_over() -> None:
    np.testing.assert_allclose(time_over(1000, [36, 72]), [100, 50])
    assert time_over(1000, 0) == math.inf
