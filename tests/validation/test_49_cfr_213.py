"""49 CFR Part 213, Track Safety Standards (United States): Appendix A table 1, and the limit set."""

from __future__ import annotations

import pytest
from governing import strictest
from published import Row, one, rows

from cant import limit_sets
from cant.quantities.constants import constant_from_us
from cant.quantities.geometry import radius_from_degree
from cant.quantities.speeds import permissible_speed
from cant.units import INCH_MM, MILE_KM

SET = limit_sets.load("us-49-cfr-213")
RUN_OFF_MM_PER_M = INCH_MM / (31 * 0.3048)


def speed_mph(row: Row, kind: str) -> float:
    given = row.given
    radius = radius_from_degree(given["degree_of_curve"], kind)
    cant, unbalance = given["cant_in"] * INCH_MM, given["unbalance_in"] * INCH_MM
    return float(permissible_speed(cant, unbalance, radius, constant_from_us(0.0007))) / MILE_KM


@rows("CFR213-A1-")
def test_appendix_a_table_1(row: Row) -> None:
    """The table rounds to the nearest mile per hour; the formula is in degrees, so by the arc definition."""
    speed = speed_mph(row, "100 ft arc")
    row.check(speed_mph=speed)
    assert round(speed) == row.printed["speed_mph"]


def test_all_351_cells_are_here() -> None:
    degrees = {row.given["degree_of_curve"] for row in _table()}
    assert (len(_table()), len(degrees)) == (351, 27)


def _table() -> list[Row]:
    return list(rows("CFR213-A1-").args[1])


@rows("CFR213-A1-")
def test_chord_definition_stays_within_a_tenth_of_a_mile_per_hour_more(row: Row) -> None:
    """Degrees on a 100 ft chord give at most 0.1 mph more: 12 degrees, where the two radii part most."""
    difference = speed_mph(row, "100 ft chord") - speed_mph(row, "100 ft arc")
    assert 0 <= difference < 0.1


@rows("CFR213-57a-")
def test_largest_crosslevel(row: Row) -> None:
    """213.57(a): Classes 3 to 5 as printed; for 1 and 2 the set keeps the stricter value and says so."""
    value = strictest(SET, "cant")
    assert value is not None
    if row.given["track_class"] >= 3:
        row.check(cant_max_mm=value)
    else:
        assert value < row.printed["cant_max_mm"]
        assert "8 in of Classes 1 and 2" in SET.completeness


def test_unbalance_open_to_every_vehicle() -> None:
    value = strictest(SET, "cant deficiency")
    assert value is not None
    one("CFR213-57b-Eu").check(unbalance_max_mm=value, unbalance_max_in=value / INCH_MM)


@rows("CFR213-63-runoff-")
@pytest.mark.parametrize("category", ["freight", "passenger"])
def test_run_off_at_the_class_speed(row: Row, category: str) -> None:
    """213.63(a) at the largest speed of the class of track, 213.9(a)."""
    speeds = one(f"CFR213-9-C{row.given['track_class']}").printed
    value = strictest(
        SET, "cant gradient", category=category, speed_kmh=speeds[f"{category}_speed_max_mph"] * MILE_KM
    )
    assert value is not None
    row.check(limit_in=value / RUN_OFF_MM_PER_M)


@rows("CFR213-9-")
def test_run_off_gets_stricter_above_the_class_speed(row: Row) -> None:
    for category in ("freight", "passenger"):
        speed = row.printed[f"{category}_speed_max_mph"] * MILE_KM
        at = strictest(SET, "cant gradient", category=category, speed_kmh=speed)
        above = strictest(SET, "cant gradient", category=category, speed_kmh=speed + 0.01)
        assert at is not None
        if row.given["track_class"] == 5:
            assert above is None, "Class 6 and higher is a gap"
        else:
            assert above is not None
            assert above < at


def test_constant_and_units_of_the_set() -> None:
    assert SET.equilibrium_constant == pytest.approx(float(constant_from_us(0.0007)), rel=1e-12)
    assert SET.units == "us"
    assert strictest(SET, "speed step") == pytest.approx(5 * MILE_KM)
    assert SET.of("cant step") == []
