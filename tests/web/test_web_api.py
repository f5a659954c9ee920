"""The JSON interface: the steps of a program, and its description held against what it does."""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path
from typing import Any

import psycopg
import pytest
import schemathesis
from flask import Flask
from flask.testing import FlaskClient
from hypothesis import HealthCheck, given, settings
from schemathesis import GenerationMode
from schemathesis.checks import CHECKS
from schemathesis.core.parameters import ParameterLocation
from web_tools import CURVES, Browser
from werkzeug.test import TestResponse

from cant import limit_sets
from cant.model.limits import LimitRow
from cant.model.settings import Settings
from cant.model.traffic import TrainClass
from webapp.api import describe
from webapp.api.models import LimitBody, SettingsBody, TrainBody
from webapp.api.operations import OPERATIONS, Operation
from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.guarding.bounds import Bounds

BASE = "/api/v1"
TRAFFIC = {
    "rows": [
        {"name": "Express", "category": "passenger", "speed_kmh": 140.0, "trains_per_day": 20, "mass_t": 400},
        {"name": "Goods", "category": "freight", "speed_kmh": 80, "trains_per_day": 30, "mass_t": 1500},
    ]
}


class Program:
    """A program without cookies that sends the key it was given."""

    def __init__(self, app: Flask) -> None:
        self.client: FlaskClient = app.test_client(use_cookies=False)
        self.headers: dict[str, str] = {}

    def call(self, method: str, path: str, **given: Any) -> TestResponse:
        """Call an operation."""
        return self.client.open(BASE + path, method=method, headers=self.headers, buffered=True, **given)

    def bring(self, data: bytes = CURVES.encode(), **files: tuple[io.BytesIO, str]) -> dict[str, Any]:
        """Make a plan and keep the key that comes with it."""
        answer = self.call("POST", "/plans", data={"file": (io.BytesIO(data), "aldmere.csv"), **files})
        assert answer.status_code == 201, answer.text
        found: dict[str, Any] = answer.json
        if found["key"]:
            self.headers = {"Authorization": f"Bearer {found['key']}"}
        return found


@pytest.fixture
def program(start: Callable[..., Flask], database_url: str) -> Program:
    return Program(start(database_url))


def test_a_program_goes_the_whole_way(program: Program) -> None:
    plan = program.bring()
    path = f"/plans/{plan['address']}"
    assert plan["expires"] > plan["created"]
    assert program.call("GET", f"{path}/result").status_code == 422
    assert program.call("PUT", f"{path}/traffic", json=TRAFFIC).status_code == 200
    refused = program.call("PUT", f"{path}/limits", json={"name": "no-such-set"})
    assert refused.status_code == 422
    assert "typical" in refused.json["error"]["message"]
    assert program.call("PUT", f"{path}/limits", json={"name": "typical"}).status_code == 200
    chosen = {"tiers": "normal, exceptional", "keep_within_mm": 10}
    assert program.call("PUT", f"{path}/settings", json=chosen).status_code == 200
    result: dict[str, Any] = program.call("GET", f"{path}/result").json
    assert [c["curve"] for c in result["curves"]] == ["A1", "A2", "A3"]
    assert result["settings"]["keep_within_mm"] == 10
    page: dict[str, Any] = program.call("GET", f"{path}/curves?sort=radius&size=25").json
    assert [c["curve"] for c in page["curves"]] == ["A2", "A1", "A3"]
    one: dict[str, Any] = program.call("GET", f"{path}/curves/2").json
    assert one["recommended_cant_mm"] == result["curves"][1]["recommended_cant_mm"]
    book = program.call("GET", f"{path}/workbook")
    assert book.data[:2] == b"PK"
    assert program.call("DELETE", path).status_code == 204
    assert program.call("GET", path).status_code == 404


def test_a_program_decides_and_takes_back(program: Program) -> None:
    path = f"/plans/{program.bring()['address']}"
    program.call("PUT", f"{path}/traffic", json=TRAFFIC)
    program.call("PUT", f"{path}/limits", json={"name": "typical"})
    before: dict[str, Any] = program.call("GET", f"{path}/curves/2").json
    held = before["recommended_cant_mm"] - 10
    body = {"cant_mm": held, "because": "drains under the high rail", "who": "A. Brenn"}
    assert program.call("PUT", f"{path}/curves/2/cant", json=body).status_code == 200
    assert program.call("GET", f"{path}/curves/2").json["recommended_cant_mm"] == held
    told: dict[str, Any] = program.call("GET", f"{path}/history").json
    assert told["steps"][-1]["reason"] == "drains under the high rail"
    assert told["steps"][-1]["who"] == "A. Brenn"
    (change,) = told["changes"]
    assert program.call("DELETE", f"{path}/changes/{change['key']}").status_code == 200
    assert program.call("GET", f"{path}/curves/2").json["recommended_cant_mm"] == held + 10
    assert program.call("DELETE", f"{path}/changes/{change['key']}").status_code == 404
    assert program.call("PUT", f"{path}/curves/9/cant", json=body).status_code == 404
    assert program.call("PUT", f"{path}/curves/2/cant", json={**body, "cant_mm": 400}).status_code == 422


def test_a_program_takes_an_option(program: Program) -> None:
    file = Path(__file__).resolve().parents[2] / "sample_data" / "dunmarrow_keldrith.xlsx"
    path = f"/plans/{program.bring(file.read_bytes())['address']}"
    curves = program.call("GET", f"{path}/curves?size=250").json["curves"]
    troubled = next(c for c in curves if c["options"])
    asked = f"{path}/curves/{troubled['number']}/options"
    because = {"because": "agreed with the operator"}
    assert program.call("POST", f"{asked}/99", json=because).status_code == 422
    assert program.call("POST", f"{asked}/1", json=because).status_code == 200
    told: dict[str, Any] = program.call("GET", f"{path}/history").json
    assert told["steps"][-1]["words"].endswith(troubled["options"][0]["text"])
    after = program.call("GET", f"{path}/curves/{troubled['number']}").json
    assert after["status"] != troubled["status"] or after["options"] != troubled["options"]


def test_tables_may_come_with_the_list(program: Program) -> None:
    traffic = b"Class,Category,Speed\nExpress,passenger,120\nGoods,freight,70\n"
    limits = b"Quantity,Normal,Unit\ncant,150,mm\ncant deficiency,130,mm\ncant excess,110,mm\n"
    plan = program.bring(traffic=(io.BytesIO(traffic), "t.csv"), limits=(io.BytesIO(limits), "l.csv"))
    result: dict[str, Any] = program.call("GET", f"/plans/{plan['address']}/result").json
    assert result["limits"]["rows"][0]["Normal"] == 150
    assert len(result["curves"]) == 3


def test_rules_sent_are_used_and_units_checked(program: Program) -> None:
    path = f"/plans/{program.bring()['address']}"
    program.call("PUT", f"{path}/traffic", json=TRAFFIC)
    rows = [
        {"quantity": "cant", "normal": 60.0, "unit": "mm", "clause": "1"},
        {"quantity": "cant deficiency", "normal": "none", "unit": "mm"},
    ]
    assert program.call("PUT", f"{path}/limits", json={"name": "own", "rows": rows}).status_code == 200
    result: dict[str, Any] = program.call("GET", f"{path}/result").json
    assert max(c["recommended_cant_mm"] for c in result["curves"]) == 60
    wrong = [{"quantity": "cant", "normal": 60.0, "unit": "km/h"}]
    answer = program.call("PUT", f"{path}/limits", json={"name": "own", "rows": wrong})
    assert answer.status_code == 422
    assert "cannot be stated in km/h" in answer.json["error"]["message"]


def test_without_key_and_with_the_key_of_another(program: Program, app: Flask) -> None:
    path = f"/plans/{program.bring()['address']}"
    stranger = Program(app)
    assert stranger.call("GET", path).status_code == 401
    nobody = Program(program.client.application)
    assert nobody.call("GET", path).status_code == 401
    nobody.bring()
    for method, address in (
        ("GET", path),
        ("DELETE", path),
        ("GET", f"{path}/result"),
        ("GET", f"{path}/workbook"),
    ):
        assert nobody.call(method, address).status_code == 404
    assert nobody.call("PUT", f"{path}/traffic", json=TRAFFIC).status_code == 404
    nobody.headers = {"Authorization": "Bearer made.up"}
    assert nobody.call("GET", path).status_code == 403
    assert len(program.call("GET", "/plans").json["plans"]) == 1


def test_a_browsers_plan_is_reached_by_its_cookie_and_gives_no_key(browser: Browser) -> None:
    plan = browser.sample()
    assert browser.client.get(f"{BASE}{plan}").json["key"] is None
    answer = browser.client.post(f"{BASE}/plans", data={"file": (io.BytesIO(CURVES.encode()), "a.csv")})
    assert answer.json["key"] is None


@pytest.mark.parametrize(
    ("body", "kind", "code"),
    [
        (b"{", "application/json", 400),
        (b"{}", "text/plain", 415),
        (b"[]", "application/json", 422),
        (b'{"rows": []}', "application/json", 422),
        (b'{"rows": [{"name": "A", "category": "x", "speed_kmh": "80"}]}', "application/json", 422),
        (b'{"rows": [{"name": "A", "category": "x", "colour": "red"}]}', "application/json", 422),
    ],
)
def test_bad_body_is_refused(program: Program, body: bytes, kind: str, code: int) -> None:
    path = f"/plans/{program.bring()['address']}"
    answer = program.call("PUT", f"{path}/traffic", data=body, content_type=kind)
    assert answer.status_code == code
    assert answer.json["error"]["message"]


@pytest.mark.parametrize(
    ("body", "model"), [(SettingsBody, Settings), (TrainBody, TrainClass), (LimitBody, LimitRow)]
)
def test_bodies_have_the_fields_and_defaults_of_the_models(body: Any, model: Any) -> None:
    own = {name: field for name, field in model.model_fields.items() if name != "place"}
    assert set(body.model_fields) == set(own)
    for name, field in own.items():
        if name != "tiers":
            assert body.model_fields[name].get_default() == field.get_default(), name


def test_limit_sets_are_listed_and_shown(program: Program) -> None:
    listed = program.call("GET", "/limits").json["sets"]
    assert [s["name"] for s in listed] == list(limit_sets.names())
    one: dict[str, Any] = program.call("GET", "/limits/typical").json
    assert len(one["rows"]) == len(limit_sets.load("typical").rows)
    assert program.call("GET", "/limits/none").status_code == 404


def test_description_names_every_address(app: Flask) -> None:
    described = {(method.upper(), path) for path, item in describe()["paths"].items() for method in item}
    served = {
        (method, rule.rule.replace("<int:", "<").replace("<", "{").replace(">", "}"))
        for rule in app.url_map.iter_rules()
        if rule.endpoint.startswith("api.") and rule.endpoint != "api.description"
        for method in (rule.methods or set()) - {"HEAD", "OPTIONS"}
    }
    assert described == served


@pytest.fixture(scope="module", params=["sqlite", pytest.param("postgresql", marks=pytest.mark.postgresql)])
def fuzzed(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Any:
    """Give the description of a service that keeps one plan, whose address and key every call carries."""
    url = ""
    if request.param == "postgresql":
        place = request.getfixturevalue("postgresql")
        with psycopg.connect(f"host={place} user=cant dbname=postgres", autocommit=True) as connection:
            connection.execute("CREATE DATABASE fuzz")
        url = f"postgresql://cant@/fuzz?host={place}"
    many = 1_000_000
    bounds = Bounds(
        requests_per_minute=many, wrong_plans_per_minute=many, uploads_per_minute=many, plans_per_person=many
    )
    config = Config(tmp_path_factory.mktemp("fuzz"), url, bounds=bounds)
    app = create_app({"CANT": config, "PROPAGATE_EXCEPTIONS": False})
    program = Program(app)
    file = Path(__file__).resolve().parents[2] / "sample_data" / "dunmarrow_keldrith.xlsx"
    plan = program.bring(file.read_bytes())
    schema = schemathesis.openapi.from_wsgi(f"{BASE}/openapi.json", app)
    yield schema, plan["address"], program
    app.extensions[EXTENSION].database.close()


LEFT_OUT = {"positive_data_acceptance", "ignored_auth", "use_after_free", "ensure_resource_availability"}
"""What a description alone cannot say: a unit must fit its quantity; every call here carries a good key."""


@pytest.mark.parametrize("mode", list(GenerationMode), ids=lambda mode: mode.value)
@pytest.mark.parametrize("what", OPERATIONS, ids=lambda what: what.name)
def test_interface_keeps_its_description(
    what: Operation, mode: GenerationMode, fuzzed: tuple[Any, str, Program]
) -> None:
    """Calls that the description allows, and calls that it forbids, get what it promises."""
    if mode is GenerationMode.NEGATIVE and not (what.body or what.query or what.upload):
        return  # such a call has nothing but its address that could be wrong
    schema, address, program = fuzzed
    checks = [check for check in CHECKS.get_all() if check.__name__ not in LEFT_OUT]
    described = schema[f"{BASE}{what.path}"][what.method]

    @given(case=described.as_strategy(generation_mode=mode))
    @settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
    def call(case: schemathesis.Case) -> None:
        broken = {place for place, part in case.meta.components.items() if part.mode.is_negative}
        if broken and not broken & {ParameterLocation.QUERY, ParameterLocation.BODY}:
            return  # only what is put right here was made wrong: address and key
        if "address" in case.path_parameters and what.name != "delete_plan":
            case.path_parameters["address"] = address
        case.call_and_validate(checks=checks, headers=program.headers)

    call()
