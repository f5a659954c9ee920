"""Limit sets: each says what it lacks, leaves no accidental gap, and a damaged file is told in one line."""

from __future__ import annotations

import math

import pytest

from cant import limit_sets
from cant.errors import FileError, InputError
from cant.limit_sets.loading import parse
from cant.model.limits import QUANTITIES, LimitSet
from cant.quantities.constants import rail_spacing_from_constant
from cant.units import UNITS

NAMED = ["de-ebo", "eu-1299-2014", "in-bg-1676", "jp-1067", "pl-1998", "us-49-cfr-213"]
SITES = ["plain", "platform", "level crossing", "turnout", "bridge", "tunnel"]
SPEEDS = [0.0, 5.0, 40.0, 60.0, 100.0, 120.0, 160.0, 200.0, 230.0, 300.0, 400.0]
RADII = [100.0, 200.0, 250.0, 300.0, 305.0, 1000.0, 10000.0]
HEAD = """
title = "A set"
edition = "first"
document = "a document"
completeness = "all"
verified = true
units = "metric"
"""

every_set = pytest.mark.parametrize("name", [*NAMED, "typical"])


def test_names() -> None:
    assert limit_sets.names() == sorted([*NAMED, "typical"])


@every_set
def test_a_set_says_what_it_is_and_what_it_lacks(name: str) -> None:
    limit_set = limit_sets.load(name)
    assert limit_set.name == name
    assert limit_set.title
    assert limit_set.edition
    assert limit_set.document
    assert not limit_set.edited
    assert all(row.clause for row in limit_set.rows), "a value without its clause"
    held = {row.quantity for row in limit_set.rows}
    for quantity in set(QUANTITIES) - held:
        assert quantity in limit_set.completeness, f"{name} does not say that it lacks {quantity}"
    assert held - {"speed step", "cant step", "minimum cant", "curve length"}, "nothing that bounds a plan"


@every_set
def test_units_fit_the_quantity(name: str) -> None:
    for row in limit_sets.load(name).rows:
        assert UNITS[row.unit].dimension in QUANTITIES[row.quantity].dimensions
        assert math.isfinite(row.canonical(row.normal, 1500.0))


def test_only_sets_from_a_standard_itself_are_verified() -> None:
    unverified = [name for name in limit_sets.names() if not limit_sets.load(name).verified]
    assert unverified == ["in-bg-1676", "jp-1067", "typical"]
    for name in unverified:
        limit_set = limit_sets.load(name)
        assert "unverified" in limit_set.title
        assert limit_set.completeness.startswith("Unverified")


def test_no_named_set_has_exceptional_values_of_its_own() -> None:
    for name in NAMED:
        assert all(row.exceptional is None for row in limit_sets.load(name).rows)


def matching(limit_set: LimitSet, quantity: str, category: str, site: str) -> list[tuple[float, float]]:
    """Speed bands of the rows whose category and site fit, whatever the radius."""
    return [
        (row.speed_over_kmh or -1.0, row.speed_up_to_kmh or math.inf)
        for row in limit_set.of(quantity)
        if row.category in ("", category)
        and row.situation in ("", site)
        and row.radius_over_m is None
        and row.radius_up_to_m is None
    ]


DELIBERATE = {
    ("eu-1299-2014", "cant deficiency", "freight"): 160.0,
    ("eu-1299-2014", "cant deficiency", "of my own"): 160.0,
    ("us-49-cfr-213", "cant gradient", "freight"): 80 * 1.609344,
    ("us-49-cfr-213", "cant gradient", "passenger"): 90 * 1.609344,
}
"""Gaps that the documents leave, and the sets tell: nothing above this speed."""


@every_set
@pytest.mark.parametrize("category", ["passenger", "freight", "of my own"])
def test_no_class_and_speed_falls_through_by_accident(name: str, category: str) -> None:
    limit_set = limit_sets.load(name)
    for quantity in {row.quantity for row in limit_set.rows}:
        highest = DELIBERATE.get((name, quantity, category), math.inf)
        for site in SITES:
            bands = matching(limit_set, quantity, category, site)
            for speed in SPEEDS if bands else []:
                held = any(over < speed <= up_to for over, up_to in bands)
                assert held == (speed <= highest), f"{name}, {quantity}, {category}, {site}, {speed}"


def test_the_typical_set_serves_a_plan_of_mixed_traffic() -> None:
    limit_set = limit_sets.load("typical")
    assert {row.quantity for row in limit_set.rows} == set(QUANTITIES) - {"felt acceleration"}
    assert {row.situation for row in limit_set.rows} >= {"platform", "level crossing", "turnout"}
    assert "freight" in {row.category for row in limit_set.rows}
    for row in limit_set.rows:
        if row.exceptional is not None:
            assert row.exceptional > row.normal
            assert QUANTITIES[row.quantity].bounds
    small = next(row for row in limit_set.of("cant") if row.radius_up_to_m == 305)
    for radius in RADII:
        assert small.normal + small.per_metre_of_radius * radius == pytest.approx((radius - 50) / 1.5)


def test_constants_and_rail_spacing() -> None:
    """Each gauge has its own: 8.4 is the gauge of 1067 itself, 13.76 about 1750 mm, 0.0007 about 60 in."""
    spacing = {
        name: round(float(rail_spacing_from_constant(limit_sets.load(name).equilibrium_constant or 0)))
        for name in NAMED
    }
    assert spacing == {
        "de-ebo": 1500,
        "eu-1299-2014": 0,
        "in-bg-1676": 1749,
        "jp-1067": 1068,
        "pl-1998": 0,
        "us-49-cfr-213": 1524,
    }


def test_describe_tells_every_set() -> None:
    told = limit_sets.describe()
    assert [entry["name"] for entry in told] == limit_sets.names()
    assert all(entry["rows"] == len(limit_sets.load(entry["name"]).rows) for entry in told)


def test_unknown_name_lists_those_there_are() -> None:
    with pytest.raises(InputError, match=r"no limit set 'nowhere'; there are de-ebo, eu-1299-2014"):
        limit_sets.load("nowhere")
    with pytest.raises(InputError, match="no limit set"):
        limit_sets.load("../loading")


@pytest.mark.parametrize(
    ("row", "problem"),
    [
        ('quantity = "camber"\nnormal = 1\nunit = "mm"\nclause = "1"', "rows 1 quantity: Input should be"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm/s"\nclause = "1"', "'mm/s' is no unit of cant"),
        ('quantity = "cant"\nnormal = 1\nunit = "furlong"\nclause = "1"', "'furlong' is no unit of cant"),
        ('quantity = "cant"\nnormal = "much"\nunit = "mm"\nclause = "1"', "rows 1 normal"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"', "rows 1 clause: Field required"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nspeed_over = -5', "rows 1 speed_over"),
        (
            'quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nspeed_over = 60\nspeed_up_to = 60',
            "no speed is over 60 and up to 60",
        ),
        (
            'quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nradius_over_m = 9\nradius_up_to_m = 5',
            "no radius is over 9 and up to 5",
        ),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\ncategory = "Freight"', "lower case"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nspeed_unit = "m"', "speed_unit"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nspeed_unit = "knot"', "speed_unit"),
        ('quantity = "cant"\nnormal = 1\nunit = "mm"\nclause = "1"\nremark = "x"', "rows 1 remark: Extra"),
    ],
)
def test_a_damaged_row_is_named(row: str, problem: str) -> None:
    with pytest.raises(FileError) as caught:
        parse(f"{HEAD}[[rows]]\n{row}\n", "mine", "mine.toml")
    assert str(caught.value).startswith("mine.toml: ")
    assert problem in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_damaged_file_is_named() -> None:
    with pytest.raises(FileError, match=r"mine.toml: not readable as TOML"):
        parse("title = ", "mine", "mine.toml")
    with pytest.raises(FileError, match="title: Field required; edition: Field required"):
        parse('rows = []\nunits = "metric"', "mine", "mine.toml")


def test_not_limited_and_units_of_conditions() -> None:
    text = f"""{HEAD}
[[rows]]
quantity = "cant excess"
normal = "none"
exceptional = "none"
unit = "mm"
speed_over = 25
speed_up_to = 40
speed_unit = "mph"
clause = "1"
"""
    (row,) = parse(text, "mine", "mine.toml").rows
    assert (row.normal, row.exceptional) == (math.inf, math.inf)
    assert (row.speed_over_kmh, row.speed_up_to_kmh) == pytest.approx((40.2336, 64.37376))
