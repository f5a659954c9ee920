"""The JSON of a plan: the contract's keys, streamed, metric, and without anything that JSON does not know."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from cant.model.plan import PlanDocument
from cant.service import PlannedLine, make_plan, read_curves

ROOT = Path(__file__).resolve().parents[2]
CURVE_KEYS = [
    "sheet",
    "row",
    "line",
    "track",
    "curve",
    "radius_m",
    "hand",
    "existing_cant_mm",
    "recommended_cant_mm",
    "status",
    "lower_mm",
    "upper_mm",
    "lower_by",
    "upper_by",
    "rms_speed_kmh",
    "equilibrium_speed_kmh",
    "shares_transition_with_next",
    "classes",
    "today",
    "findings",
    "options",
    "as_read",
    "reason",
]
CLASS_KEYS = [
    "class",
    "speed_kmh",
    "run_speed_kmh",
    "equilibrium_cant_mm",
    "deficiency_mm",
    "excess_mm",
    "unbalanced_acceleration_ms2",
    "felt_acceleration_ms2",
    "permissible_speed_kmh",
    "permissible_by",
    "permissible_speed_normal_kmh",
    "lowest_speed_kmh",
    "equilibrium_cant_exact_mm",
    "centripetal_acceleration_ms2",
    "wheel_load_shift",
    "wheel_load_shift_at_rest",
    "smallest_radius_m",
]
AS_READ_KEYS = [
    "radius_m",
    "hand",
    "length_m",
    "start_km",
    "end_km",
    "transition_in_m",
    "transition_out_m",
    "cant_mm",
    "speed_kmh",
    "situation",
]


def planned(name: str) -> PlannedLine:
    path = ROOT / "sample_data" / name
    return make_plan(read_curves(path.read_bytes(), path.name))


@pytest.fixture(scope="module")
def line() -> PlannedLine:
    return planned("dunmarrow_keldrith.xlsx")


@pytest.fixture(scope="module")
def document(line: PlannedLine) -> dict[str, Any]:
    loaded: dict[str, Any] = json.loads(b"".join(line.json_chunks()))
    return loaded


def test_the_stream_is_the_document(line: PlannedLine, document: dict[str, Any]) -> None:
    assert document == json.loads(json.dumps(line.document(), allow_nan=False))


def test_every_key_of_the_contract_is_there(document: dict[str, Any]) -> None:
    assert list(document)[:6] == ["curves", "rejected", "questions", "limits", "settings", "findings"]
    PlanDocument.model_validate(document)
    for curve in document["curves"]:
        assert set(CURVE_KEYS) <= set(curve)
        assert set(AS_READ_KEYS) == set(curve["as_read"])
        assert set(curve["today"]) >= {"status", "breaks", "classes"}
        for entry in [*curve["classes"], *curve["today"]["classes"]]:
            assert set(CLASS_KEYS) <= set(entry)
        for by in (curve["lower_by"], curve["upper_by"]):
            assert by is None or set(by) >= {"quantity", "clause", "class"}
    for row in document["rejected"]:
        assert set(row) >= {"sheet", "row", "column", "value", "problem"}


def test_curves_stand_in_input_order_and_none_is_lost(document: dict[str, Any]) -> None:
    rows = [curve["row"] for curve in document["curves"]]
    assert rows == sorted(rows)
    assert sorted(rows + [row["row"] for row in document["rejected"]]) == list(range(2, 43))


def test_limits_and_settings_as_used(document: dict[str, Any]) -> None:
    limits = document["limits"]
    assert limits["name"] == "dunmarrow_keldrith.xlsx"
    assert limits["edited"] is False
    assert limits["rows"][0]["Clause"] == "DK-12 3.1"
    assert document["settings"]["tiers"] == ["normal", "exceptional"]
    assert document["settings"]["rail_spacing_used_mm"] == 1500
    assert document["settings"]["equilibrium_constant_used"] == pytest.approx(11.798, abs=5e-4)
    assert any("no authority" in text for text in document["cautions"])
    assert len(document["input"]["sha256"]) == 64


def test_us_units_stay_at_the_edge() -> None:
    us = planned("tarrow_us_units.xlsx")
    assert us.display.units == "us"
    record = us.record(0)
    assert record["radius_m"] == pytest.approx(1910 * 0.3048)
    assert record["existing_cant_mm"] == pytest.approx(2.5 * 25.4)
    for entry in us.records():
        steps = entry["recommended_cant_mm"] / 25.4 / 0.25
        assert steps == pytest.approx(round(steps), abs=1e-9)
    assert " in" in record["reason"]
    assert " mm" not in record["reason"]


def test_the_sample_line_shows_what_it_promises(document: dict[str, Any]) -> None:
    status = {curve["curve"]: curve["status"] for curve in document["curves"]}
    assert status["111"] == "exceptional"
    assert status["112"] == "restrict"
    assert status["114"] == status["115"] == "not assessed"
    assert status["104"] == "kept"
    assert {row["row"] for row in document["rejected"]} == {14, 42}
    assert set(status.values()) == {"exceptional", "restrict", "not assessed", "kept", "change"}
    freight = [
        entry
        for curve in document["curves"]
        for entry in curve["classes"]
        if entry["class"] == "Heavy freight"
    ]
    assert max(entry["excess_mm"] for entry in freight) > 50
    shares = {curve["curve"] for curve in document["curves"] if curve["shares_transition_with_next"]}
    assert shares == {"102", "105", "202", "205", "206"}
