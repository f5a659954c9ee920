"""Notations of single values: numbers, chainages, degrees, versines, against pint and published tables."""

from __future__ import annotations

import numpy as np
import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cant.quantities.geometry import DEGREE_KINDS
from cant.reading.chainages import STATION, miles_chains, miles_yards, take_location
from cant.reading.degrees import radius_of_degree, radius_of_versine, take_degree
from cant.reading.numbers import decimal_mark, parse_number, parse_quantity
from cant.reading.takers import take_cant, take_radius, take_speed, take_transition
from cant.units import UNITS

PINT = pint.UnitRegistry()


@pytest.mark.parametrize(
    ("text", "decimal", "value"),
    [
        ("650", "", 650),
        ("1.200", ",", 1200),
        ("1.200", "", 1.2),
        ("1,200", "", 1200),
        ("1,200", ",", 1.2),
        ("1 200", "", 1200),
        ("1\u00a0200,5", "", 1200.5),
        ("1'200.5", "", 1200.5),
        ("1.234.567", "", 1234567),
        ("1.234,5", "", 1234.5),
        ("1,234.5", "", 1234.5),
        ("312,5", "", 312.5),
        ("-20", "", -20),
        ("− 20", "", -20),
        ("+15", "", 15),
        (".5", "", 0.5),
        ("3 1/2", "", 3.5),
        ("3-1/2", "", 3.5),
        ("1½", "", 1.5),
        ("¾", "", 0.75),
        ("-1 1/4", "", -1.25),
    ],
)
def test_numbers_as_people_type_them(text: str, decimal: str, value: float) -> None:
    assert parse_number(text, decimal) == pytest.approx(value)


@pytest.mark.parametrize(
    "text", ["", "abc", "1/3/4", "12+345", "1.2.3", "1,2,3", "5/4", "2°15'", "100/80", "--5"]
)
def test_what_is_no_number_is_none(text: str) -> None:
    assert parse_number(text) is None


@given(st.floats(-1e6, 1e6).map(lambda x: round(x, 3)))
def test_a_number_written_with_either_mark_is_read_back(value: float) -> None:
    text = f"{value:.4f}"
    assert parse_number(text, ".") == pytest.approx(value)
    assert parse_number(text.replace(".", ","), ",") == pytest.approx(value)
    grouped = f"{value:,.4f}"
    assert parse_number(grouped, ".") == pytest.approx(value)
    assert parse_number(grouped.translate(str.maketrans(",.", ".,")), ",") == pytest.approx(value)


@given(st.integers(0, 40), st.integers(0, 15))
def test_inches_and_sixteenths_are_read_back(whole: int, sixteenths: int) -> None:
    text = f'{whole} {sixteenths}/16"'
    taken = take_cant(text)
    assert taken.unit == "in"
    assert taken.value == pytest.approx(whole + sixteenths / 16)


_PINT_NAMES = {
    "mm": "millimeter", "cm": "centimeter", "m": "meter", "km": "kilometer", "in": "inch", "ft": "foot",
    "yd": "yard", "ch": "chain", "mi": "mile",
    "km/h": "kilometer/hour", "mph": "mile/hour", "m/s": "meter/second",
}  # fmt: skip


@given(st.sampled_from(sorted(_PINT_NAMES)), st.floats(0.5, 5000).map(lambda x: round(x, 3)))
def test_a_value_with_its_unit_agrees_with_pint(unit: str, value: float) -> None:
    found = parse_quantity(f"{value} {unit}")
    assert found is not None
    assert found[1] is not None
    assert found[1].symbol == unit
    base = "kilometer/hour" if UNITS[unit].dimension == "speed" else "meter"
    expected = (value * PINT(_PINT_NAMES[unit])).to(base).magnitude
    # pint's chain and mile rest on the US survey foot (2e-6 longer than the international one of our table)
    assert found[0] * found[1].factor == pytest.approx(expected, rel=5e-6)


@pytest.mark.parametrize(
    ("texts", "mark"), [(["12,5", "1.200"], ","), (["12.5"], "."), (["1.200"], ""), (["650"], "")]
)
def test_a_sheet_shows_its_decimal_mark(texts: list[str], mark: str) -> None:
    assert decimal_mark(texts) == mark


@pytest.mark.parametrize(
    ("text", "km"),
    [
        ("12+345", 12.345),
        ("12+345.50", 12.3455),
        ("km 12+345", 12.345),
        ("km 12.345", 12.345),
        ("km 12,345", 12.345),
        ("PK 12/345", 12.345),
        ("PK 102+345", 102.345),
        ("K12+345", 12.345),
        ("12k345m", 12.345),
        ("45,3+20", 45.320),
        ("45.9+64", 45.964),
        ("12.345 km", 12.345),
        ("12345 m", 12.345),
        ("12m 34ch", 12 * 1.609344 + 34 * 0.0201168),
        ("12 mi 34.5 ch", 12 * 1.609344 + 34.5 * 0.0201168),
        ("12m 748yd", 12 * 1.609344 + 748 * 0.0009144),
        ("0+012", 0.012),
    ],
)
def test_chainages_that_carry_their_notation(text: str, km: float) -> None:
    taken = take_location(text)
    assert not taken.problem
    unit_km = {"km": 1.0, "m": 0.001, "": 1.0}[taken.unit]
    assert taken.value * unit_km == pytest.approx(km)


def test_a_station_leaves_its_unit_open() -> None:
    taken = take_location("1234+56.78")
    assert (taken.value, taken.unit) == (pytest.approx(123456.78), STATION)


@pytest.mark.parametrize("text", ["231/4", "1234/5-7", "see plan", "12+34+56"])
def test_what_is_no_distance_is_refused(text: str) -> None:
    assert take_location(text).problem


@given(st.integers(0, 300), st.integers(0, 79))
def test_miles_and_chains_against_pint(miles: int, chains: int) -> None:
    # A chain is 66 international feet (NIST SP 811, appendix B.6 note on the foot).
    expected = (
        miles * PINT.international_mile if hasattr(PINT, "international_mile") else miles * PINT.mile
    ).to("km")
    expected = expected.magnitude + (chains * 66 * PINT.foot).to("km").magnitude
    assert miles_chains(miles, chains) == pytest.approx(expected, rel=3e-6, abs=1e-9)


@given(st.integers(0, 300), st.integers(0, 1759))
def test_miles_and_yards_against_pint(miles: int, yards: int) -> None:
    expected = (miles * 1760 * PINT.yard + yards * PINT.yard).to("km").magnitude
    assert miles_yards(miles, yards) == pytest.approx(expected)


@pytest.mark.parametrize(
    ("text", "degrees"),
    [
        ("2.5", 2.5),
        ("2°15'", 2.25),
        ("3°15'00\"", 3.25),
        ("2-15-00", 2.25),
        ("1° 30' 36\"", 1.51),
        ("45'", 0.75),
        ("2°", 2.0),
        ("2 deg 15 min", 2.25),
        ("3°30", 3.5),
        ("4d30m", 4.5),
    ],
)
def test_degrees_in_all_notations(text: str, degrees: float) -> None:
    assert take_degree(text).value == pytest.approx(degrees)


@pytest.mark.parametrize("text", ["2°75'", "x", "2/15"])
def test_what_is_no_degree_is_refused(text: str) -> None:
    assert take_degree(text).problem


def test_one_degree_of_each_kind_is_the_printed_radius() -> None:
    """Radii of one degree as handbooks print them: 5729.58 ft (arc), 5729.65 ft (chord of 100 ft), 1145.9 m.

    Common practice of route surveying; the 1750 / degree of Indian practice rounds that of 30.5 m chords.
    """
    one = np.array([1.0])
    assert radius_of_degree(one, "100 ft arc")[0] / 0.3048 == pytest.approx(5729.578, abs=0.001)
    assert radius_of_degree(one, "100 ft chord")[0] / 0.3048 == pytest.approx(5729.651, abs=0.001)
    assert radius_of_degree(one, "20 m chord")[0] == pytest.approx(1145.9, abs=0.1)
    assert radius_of_degree(one, "30.5 m chord")[0] == pytest.approx(1750, rel=0.002)


@given(st.sampled_from(sorted(DEGREE_KINDS)), st.floats(0.1, 20))
def test_a_degree_is_the_angle_that_its_chord_or_arc_spans(kind: str, degrees: float) -> None:
    radius = radius_of_degree(np.array([degrees]), kind)[0]
    length, is_chord = DEGREE_KINDS[kind].length_m, DEGREE_KINDS[kind].chord
    angle = 2 * np.arcsin(length / 2 / radius) if is_chord else length / radius
    assert np.degrees(angle) == pytest.approx(degrees)


def test_versines_give_the_radii_of_the_manuals() -> None:
    """50000 / v for a 20 m chord, 12500 / v for 10 m (v in mm), as track maintenance manuals print them."""
    versines = np.array([50.0, 83.3333333, 100.0]) / 1000
    assert radius_of_versine(versines, 20.0) == pytest.approx([1000.0, 600.0, 500.0])
    assert radius_of_versine(np.array([0.0125]), 10.0) == pytest.approx([1000.0])
    # 49 CFR 213 practice: on a chord of 62 ft one inch of mid-ordinate is one degree of curve.
    one_inch = radius_of_versine(np.array([0.0254]), 62 * 0.3048)[0]
    assert one_inch == pytest.approx(radius_of_degree(np.array([1.0]), "100 ft arc")[0], rel=0.01)


@pytest.mark.parametrize(
    ("text", "value", "unit", "hand"),
    [
        ("650", 650, "", 0),
        ("R=650", 650, "", 0),
        ("R 650", 650, "", 0),
        ("650 m", 650, "m", 0),
        ("-650", -650, "", 0),
        ("52 ch", 52, "ch", 0),
        ("1 763 ft", 1763, "ft", 0),
        ("650 L", 650, "", 1),
        ("R 650 R", 650, "", -1),
        ("L 800", 800, "", 1),
        ("800 m RH", 800, "m", -1),
        ("~650", 650, "", 0),
    ],
)
def test_radii(text: str, value: float, unit: str, hand: int) -> None:
    taken = take_radius(text)
    assert not taken.problem
    assert (taken.value, taken.unit, taken.hand) == (value, unit, hand)


@pytest.mark.parametrize(
    "text", ["∞", "oo", "straight", "Gerade", "recta", "rettifilo", "tangent", "prosta", "přímá"]
)
def test_straight_track_in_many_words(text: str) -> None:
    assert take_radius(text).state == "straight"


def test_pairs_are_kept_as_two_values() -> None:
    assert (take_transition("80/70").value, take_transition("80/70").second) == (80, 70)
    assert (take_transition("60/60 m").value, take_transition("60/60 m").unit) == (60, "m")
    assert (take_speed("100/80").value, take_speed("100/80").second) == (100, 80)
    assert take_radius("650/720").state == "pair"


def test_words_for_nothing() -> None:
    assert take_transition("none").value == 0
    assert take_cant("nil").value == 0
    assert take_speed("none").state == "none"
    assert np.isnan(take_speed("none").value)
