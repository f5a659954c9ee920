"""Figures beside the planner's own: each against its formula by hand."""

from __future__ import annotations

import math
from typing import Any

import pandas as pd
import pytest

import cant
from cant.service import PlannedLine

E, G, C = 1500.0, 9.81, 1500 / (12.96 * 9.81)
RADIUS, FAST, SLOW, LENGTH = 800.0, 120.0, 60.0, 100.0


@pytest.fixture(scope="module")
def planned() -> PlannedLine:
    curves = pd.DataFrame(
        {
            "Curve": ["1"],
            "Start (km)": [1.0],
            "End (km)": [1.4],
            "Radius (m)": [RADIUS],
            "Hand": ["L"],
            "Transition in (m)": [LENGTH],
            "Transition out (m)": [None],
            "Cant (mm)": [60],
            "Speed (km/h)": [FAST],
        }
    )
    traffic = pd.DataFrame(
        {
            "Class": ["Fast", "Slow"],
            "Category": ["passenger", "freight"],
            "Speed (km/h)": [FAST, SLOW],
            "Centre of gravity (m)": [1.6, None],
        }
    )
    limits = pd.DataFrame({"Quantity": ["cant deficiency"], "Normal": [130], "Unit": ["mm"]})
    return cant.plan(curves, traffic, limits)


@pytest.fixture
def record(planned: PlannedLine) -> dict[str, Any]:
    return planned.record(0)


def by_class(entries: list[dict[str, Any]]) -> dict[str, dict[str, Any]]:
    return {entry["class"]: entry for entry in entries}


def test_exact_forms_of_the_inclined_plane(record: dict[str, Any]) -> None:
    fast = by_class(record["classes"])["Fast"]
    a = (FAST / 3.6) ** 2 / RADIUS
    phi = math.asin(record["recommended_cant_mm"] / E)
    assert fast["centripetal_acceleration_ms2"] == pytest.approx(a)
    assert fast["equilibrium_cant_exact_mm"] == pytest.approx(E * math.sin(math.atan(a / G)))
    assert fast["equilibrium_cant_exact_mm"] < fast["equilibrium_cant_mm"]
    expected = a * math.cos(phi) - G * math.sin(phi)
    assert fast["unbalanced_acceleration_exact_ms2"] == pytest.approx(expected)


def test_wheel_load_shift_of_a_rigid_body(record: dict[str, Any]) -> None:
    """Moments about the middle of the track: shift of one rail's load = 2 h (D_EQ - D) / e2, h in mm."""
    for view, cant_mm in (("classes", record["recommended_cant_mm"]), ("today", 60.0)):
        entries = record["classes"] if view == "classes" else record["today"]["classes"]
        fast = by_class(entries)["Fast"]
        unbalanced = C * fast["run_speed_kmh"] ** 2 / RADIUS - cant_mm
        assert fast["wheel_load_shift"] == pytest.approx(2 * 1600 * unbalanced / E**2)
        assert fast["wheel_load_shift_at_rest"] == pytest.approx(-2 * 1600 * cant_mm / E**2)
        assert by_class(entries)["Slow"]["wheel_load_shift"] is None


def test_at_the_smallest_radius_the_deficiency_limit_is_just_used(record: dict[str, Any]) -> None:
    for entry in record["classes"]:
        balance = C * entry["run_speed_kmh"] ** 2 / entry["smallest_radius_m"]
        assert balance - record["recommended_cant_mm"] == pytest.approx(130)


def test_jerk_and_roll_rate_over_the_transition(record: dict[str, Any]) -> None:
    fast = by_class(record["transitions"]["in"]["classes"])["Fast"]
    seconds = LENGTH / (FAST / 3.6)
    cant_mm = record["recommended_cant_mm"]
    deficiency = C * FAST**2 / RADIUS - cant_mm
    assert fast["jerk_ms3"] == pytest.approx(G * deficiency / E / seconds)
    assert fast["roll_rate_deg_s"] == pytest.approx(math.degrees(cant_mm / E) / seconds)
    unknown = by_class(record["transitions"]["out"]["classes"])["Fast"]
    assert unknown["jerk_ms3"] is None
    assert unknown["roll_rate_deg_s"] is None


def test_one_record_and_many_are_the_same(planned: PlannedLine) -> None:
    assert list(planned.records()) == [planned.record(0)]
