"""Turnouts in curves, in signed curvature: hand calculations, and mirrored curves give the same."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.quantities.turnouts import (
    branch_cant,
    branch_curvature,
    branch_deficiency,
    curvature,
    main_cant_range,
)

C = 11.8


def test_similar_flexure() -> None:
    """R 600 left with a turnout of 300 m to the left: 1 / (1/600 + 1/300) = 200 m."""
    branch = branch_curvature(curvature(600, 1), curvature(300, 1))
    assert 1 / branch == pytest.approx(200)
    assert branch_deficiency(40, branch, 60, C) == pytest.approx(11.8 * 1600 / 200 - 60)


def test_contrary_flexure_on_a_flat_main_line() -> None:
    """R 1000 left, 300 m to the right: 1 / (1/300 - 1/1000) = 428.57 m right; cant 40 is -40 for it."""
    branch = branch_curvature(curvature(1000, 1), curvature(300, -1))
    assert 1 / branch == pytest.approx(-428.5714)
    assert branch_cant(branch, 40) == -40
    assert branch_deficiency(40, branch, 40, C) == pytest.approx(11.8 * 1600 / 428.5714 + 40)


def test_contrary_turnout_on_a_sharp_main_line_still_curves_with_it() -> None:
    """R 250 left, 500 m to the right: the branch is 500 m left, so the cant is no negative cant there."""
    branch = branch_curvature(curvature(250, 1), curvature(500, -1))
    assert 1 / branch == pytest.approx(500)
    assert branch_cant(branch, 90) == 90
    assert branch_deficiency(40, branch, 90, C) == pytest.approx(11.8 * 1600 / 500 - 90)
    least, most = main_cant_range(40, curvature(250, 1), branch, 100, 75, C)
    assert (least, most) == pytest.approx((37.76 - 100, 37.76 + 75))


def test_straight_branch_has_all_the_cant_as_excess() -> None:
    assert branch_deficiency(60, 0.0, -35, C) == -35
    least, most = main_cant_range(60, curvature(500, 1), 0.0, 100, 75, C)
    assert (least, most) == (-75, 75)
    assert main_cant_range(60, curvature(500, 1), 0.0, 100, math.inf, C) == (-100, 100)


curvatures = st.floats(1e-4, 0.006).flatmap(lambda size: st.sampled_from([size, -size]))


@given(st.floats(5, 100), curvatures, curvatures, st.floats(20, 150), st.floats(20, 150))
def test_ends_of_the_range_just_keep_a_limit(
    speed: float, main: float, branch: float, deficiency: float, excess: float
) -> None:
    hand = math.copysign(1, main)
    ends = main_cant_range(speed, main, branch, deficiency, excess, C)
    unbalanced = sorted(float(branch_deficiency(speed, branch, hand * end, C)) for end in ends)
    assert unbalanced == pytest.approx([-excess, deficiency], abs=1e-9)


@given(st.floats(5, 100), curvatures, curvatures, st.floats(-150, 150))
def test_mirrored_curves_are_alike(speed: float, main: float, turnout: float, cant: float) -> None:
    branch, mirrored = branch_curvature(main, turnout), branch_curvature(-main, -turnout)
    assert branch_deficiency(speed, branch, cant, C) == branch_deficiency(speed, mirrored, -cant, C)
    assert main_cant_range(speed, main, branch, 100, 75, C) == main_cant_range(
        speed, -main, mirrored, 100, 75, C
    )
