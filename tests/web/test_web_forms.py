"""Forms: what is typed becomes exact values, what cannot be used is told beside its field."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from web_tools import TRAINS

from cant import limit_sets
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from webapp import limits_form, settings_form, trains_form
from webapp.measures import measures

METRIC, US = measures("metric"), measures("us")
TRAFFIC = Traffic.of(
    [
        TrainClass(name="Express", category="passenger", speed_kmh=160, mass_t=412.3, roll_coefficient=0.25),
        TrainClass(name="Goods", category="freight", speed_kmh=85, trains_per_day=0.5, regular=False),
    ]
)


def sent(rows: list[dict[str, str]], units: str) -> dict[str, str]:
    """Give a form as a browser sends it when nothing was changed."""
    fields = {f"{n}-{key}": value for n, row in enumerate(rows) for key, value in row.items() if value}
    return {"rows": str(len(rows)), "units": units, **fields}


@pytest.mark.parametrize("system", [METRIC, US])
def test_unchanged_trains_come_back_exact(system: object) -> None:
    assert system in (METRIC, US)
    shown_in = US if system == US else METRIC
    form = sent(trains_form.shown_rows(TRAFFIC, shown_in), shown_in.system)
    traffic, problems = trains_form.parse(form, shown_in, TRAFFIC)
    assert problems == {}
    assert traffic == TRAFFIC


@given(st.floats(min_value=0, max_value=400), st.floats(min_value=0, max_value=1e5))
def test_any_train_comes_back_exact_in_us_units(speed: float, mass: float) -> None:
    before = Traffic.of([TrainClass(name="A", category="freight", speed_kmh=speed, mass_t=mass)])
    traffic, _ = trains_form.parse(sent(trains_form.shown_rows(before, US), "us"), US, before)
    assert traffic == before


def test_typed_trains_are_taken_in_the_units_of_the_form() -> None:
    traffic, problems = trains_form.parse(TRAINS, METRIC, None)
    assert problems == {}
    assert traffic is not None
    assert [(row.name, row.category, row.mass_t) for row in traffic.rows] == [
        ("Express", "passenger", 400.0),
        ("Goods", "freight", 1500.5),
    ]
    traffic, _ = trains_form.parse({**TRAINS, "0-speed_kmh": "100"}, US, None)
    assert traffic is not None
    assert traffic.rows[0].speed_kmh == pytest.approx(160.9344)


@pytest.mark.parametrize(
    ("field", "text", "words"),
    [
        ("0-speed_kmh", "fast", "not a number"),
        ("0-speed_kmh", "-5", "below 0"),
        ("0-mass_t", "nan", "not a number"),
        ("0-mass_t", "1e999", "not a number"),
        ("0-name", "", "missing"),
        ("0-category", "", "missing"),
        ("1-name", "express", "twice"),
        ("0-name", "x" * 400, "at most"),
    ],
)
def test_bad_train_is_told_beside_its_field(field: str, text: str, words: str) -> None:
    traffic, problems = trains_form.parse({**TRAINS, field: text}, METRIC, None)
    assert traffic is None
    assert words in problems[field]


def test_no_train_at_all_is_told() -> None:
    traffic, problems = trains_form.parse({"rows": "2"}, METRIC, None)
    assert traffic is None
    assert "at least one class" in problems["0-name"]
    removed = {**TRAINS, "0-remove": "yes", "1-remove": "yes"}
    assert trains_form.parse(removed, METRIC, None)[0] is None


@pytest.mark.parametrize("name", limit_sets.names())
def test_unchanged_limits_are_not_edited(name: str) -> None:
    before = limit_sets.load(name)
    form = {
        f"{n}-{key}": row[key]
        for n, row in enumerate(limits_form.shown_rows(before, METRIC))
        for key in ("normal", "exceptional", "clause", "note")
    }
    limits, problems = limits_form.parse(form, METRIC, before)
    assert problems == {}
    assert limits is not None
    for row, was in zip(limits.rows, before.rows, strict=True):
        assert row.normal == was.normal
        assert row.exceptional == was.exceptional
    assert limits.edited is False


def test_edited_limit_and_added_one() -> None:
    before = LimitSet(
        name="own",
        rows=(
            LimitRow(quantity="cant", normal=150, exceptional=160, unit="mm", clause="7.1"),
            LimitRow(quantity="cant excess", normal=110, unit="mm"),
        ),
    )
    form = {
        "0-normal": "140,5",
        "0-exceptional": "none",
        "0-clause": "7.1 a",
        "1-remove": "yes",
        "new-0-quantity": "cant deficiency",
        "new-0-normal": "0.65",
        "new-0-unit": "m/s2",
        "new-0-category": "Freight",
        "new-0-speed_over_kmh": "50",
    }
    limits, problems = limits_form.parse(form, US, before)
    assert problems == {}
    assert limits is not None
    assert limits.edited
    changed, added = limits.rows
    assert (changed.normal, changed.exceptional, changed.clause) == (140.5, math.inf, "7.1 a")
    assert (added.quantity, added.normal, added.unit, added.category) == (
        "cant deficiency",
        0.65,
        "m/s2",
        "freight",
    )
    assert added.speed_over_kmh == pytest.approx(80.4672)


@pytest.mark.parametrize(
    ("form", "field", "words"),
    [
        ({"0-normal": ""}, "0-normal", "needed"),
        ({"0-normal": "much"}, "0-normal", "not a number"),
        ({"0-normal": "-3"}, "0-normal", "below 0"),
        ({"new-0-normal": "3", "new-0-quantity": "cant", "new-0-unit": "km/h"}, "new-0-unit", "stated in"),
        ({"new-0-normal": "3", "new-0-quantity": "colour"}, "new-0-quantity", "choose one of"),
    ],
)
def test_bad_limit_is_told_beside_its_field(form: dict[str, str], field: str, words: str) -> None:
    before = LimitSet(name="own", rows=(LimitRow(quantity="cant", normal=150, unit="mm"),))
    limits, problems = limits_form.parse(form, METRIC, before)
    assert limits is None
    assert words in problems[field]


def test_settings_of_a_form() -> None:
    before = Settings(rail_spacing_mm=1500.0, keep_within_mm=10.0)
    shown = settings_form.shown(before, US)
    same, problems = settings_form.parse(shown, US, before)
    assert problems == {}
    assert same == before
    changed, _ = settings_form.parse({**shown, "keep_within_mm": "0.5", "tiers": "exceptional"}, US, before)
    assert changed is not None
    assert changed.keep_within_mm == pytest.approx(12.7)
    assert changed.allows_exceptional
    refused, problems = settings_form.parse({**shown, "rail_spacing_mm": "0"}, US, before)
    assert refused is None
    assert "above 0" in problems["rail_spacing_mm"]


def test_form_holds_every_number_of_the_settings() -> None:
    """A setting that is added to the model must be added to the form."""
    held = {item.key for item in settings_form.NUMBERS} | {"method", "tiers", "units"}
    assert held == set(Settings.model_fields)


def test_blank_setting_is_the_usual_value() -> None:
    given = {**settings_form.shown(Settings(underbalance_mm=40.0), METRIC), "underbalance_mm": ""}
    found, problems = settings_form.parse(given, METRIC, Settings(underbalance_mm=40.0))
    assert problems == {}
    assert found is not None
    assert found.underbalance_mm == Settings().underbalance_mm
    refused, problems = settings_form.parse({**given, "fraction_of_fastest": "1.5"}, METRIC, Settings())
    assert refused is None
    assert "fraction_of_fastest" in problems
