"""What must be refused, one test for each way in; on both databases where that could make a difference.

Slow requests and those refused by their header are in ``test_office_stopping.py``, for they need a process;
texts that are made to harm are in ``test_office_hostile_texts.py``.
"""

from __future__ import annotations

import io
import json
import re
import time
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any
from urllib.parse import quote

import pytest
from flask import Flask
from itsdangerous import URLSafeSerializer, URLSafeTimedSerializer
from refusing_tools import (
    MANY,
    ROWS,
    ask,
    book,
    bring,
    filled,
    planned,
    rules_of,
    table,
)
from web_tools import TRAINS, Browser

from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION

Start = Callable[..., Flask]


@pytest.fixture
def service(start: Start, database_url: str) -> Flask:
    """Give the service on each database, without bounds on guessing."""
    return start(database_url, bounds=MANY)


# Ways into what is not there, or not one's own.


@pytest.mark.parametrize(
    "path",
    [
        "/static/../security.py",
        "/static/..%2fsecurity.py",
        "/static/%2e%2e/%2e%2e/etc/passwd",
        "/static/....//....//etc/passwd",
        "/static//etc/passwd",
        "/static/..\\..\\security.py",
        "/help/limits/..%2f..%2fdata",
        "/help/limits/..",
        "/api/v1/limits/..%2f..%2f..%2fetc%2fpasswd",
        "/api/v1/limits/%00",
        "/plans/..%2f..%2fetc%2fpasswd/list",
        "/../../etc/passwd",
        "//etc/passwd",
    ],
)
def test_no_path_leads_out(browser: Browser, path: str) -> None:
    answer = browser.get(path)
    assert answer.status_code in (301, 302, 308, 400, 404), path
    assert "root:" not in answer.text
    assert "import" not in answer.text
    if answer.status_code < 400:
        assert answer.headers["Location"].startswith(("/", "http://localhost/"))
        assert not answer.headers["Location"].startswith("//")


@pytest.mark.parametrize(
    "name", ["../../../tmp/evil.csv", "..\\..\\evil.csv", "/etc/cron.d/evil.csv", "C:\\evil.csv"]
)
def test_no_file_name_leads_out(browser: Browser, name: str) -> None:
    plan = bring(browser, name=name)
    page = browser.get("/").text
    assert "evil.csv" in page
    assert ".." not in page
    assert browser.get(f"{plan}/original").headers["Content-Disposition"] == (
        "attachment; filename=\"evil.csv\"; filename*=UTF-8''evil.csv"
    )


def test_no_entry_of_an_archive_leads_out(browser: Browser, tmp_path: Any) -> None:
    data = io.BytesIO(book(("Curves", table(ROWS))))
    with zipfile.ZipFile(data, "a") as archive:
        archive.writestr("../../../../tmp/cant-evil.txt", "evil")
        archive.writestr("/tmp/cant-evil.txt", "evil")  # noqa: S108 - that is what must not happen
    answer = browser.post("/plans", {"file": (io.BytesIO(data.getvalue()), "a.xlsx")})
    assert answer.status_code in (303, 422)
    if answer.status_code == 303:
        plan = answer.headers["Location"].removesuffix("/list")
        browser.post(f"{plan}/trains", TRAINS)
        browser.post(f"{plan}/limits/choose", {"source": "set:typical"})
        browser.post(f"{plan}/confirm")
        made = browser.get(f"{plan}/workbook")
        assert made.status_code in (200, 422)

    assert not Path("/tmp/cant-evil.txt").exists()  # noqa: S108


def test_ids_that_are_guessed_or_forged_open_nothing(service: Flask) -> None:
    browser, other = Browser(service), Browser(service)
    own = bring(browser).split("/")[2]
    other.get("/")
    changed = own[:-1] + ("A" if own[-1] != "A" else "B")
    for guess in (
        own,
        changed,
        own.lower(),
        own[:-1],
        own + "A",
        f"{own}%00",
        f"%20{own}",
        "1",
        "0",
        "-1",
        "%",
    ):
        assert other.get(f"/plans/{guess}/list").status_code == 404, guess
        assert other.get(f"/api/v1/plans/{guess}").status_code == 404, guess
        if guess != own:
            assert browser.get(f"/plans/{guess}/list").status_code == 404, guess
    assert browser.get(f"/plans/{own}/list").status_code == 200
    for guess in ("' OR '1'='1", "x' UNION SELECT 1 --", "%27%20OR%201=1--", "1; DROP TABLE plans"):
        assert other.get(f"/plans/{quote(guess)}/list").status_code == 404, guess


def test_nobody_reaches_the_plan_of_another_by_any_route(service: Flask) -> None:
    browser, other = Browser(service), Browser(service)
    plan = planned(browser)
    bring(other)
    address = plan.split("/")[2]
    before = browser.get(f"/api/v1{plan}/history").json
    seen = 0
    for rule, method in rules_of(service):
        if "<address>" not in rule.rule:
            continue
        seen += 1
        answer = ask(other, method, filled(rule, address))
        assert answer.status_code in (404, 415, 422), (method, rule.rule, answer.status_code)
        if answer.status_code == 422:  # a body is looked at before the plan: it must say the same of any plan
            same = ask(other, method, filled(rule))
            assert (same.status_code, same.json) == (422, answer.json), rule.rule
        assert "Aldmere" not in answer.text
        assert address not in answer.text.replace(f"/plans/{address}", "")
    assert seen > 40
    assert browser.get(f"/api/v1{plan}/history").json == before
    assert browser.get(f"{plan}/cants").status_code == 200


# Too much, too deep, too large.


def test_what_is_too_large_is_refused(start: Start) -> None:
    app = start(upload_mb=1)
    browser = Browser(app)
    plan = bring(browser)
    form = {"content_type": "application/x-www-form-urlencoded"}
    answer = browser.client.post("/plans", data=b"token=" + b"x" * 1_100_000, **form)
    assert answer.status_code == 413
    part = b'--e\r\nContent-Disposition: form-data; name="f"\r\n\r\n\r\n'
    many = {"data": part * 20_100 + b"--e--\r\n", "content_type": "multipart/form-data; boundary=e"}
    assert browser.client.post(f"{plan}/trains", **many).status_code == 413
    token = f"token={browser.token}&".encode()
    for field in (b"name", b"0-name", b"label", b"because"):
        for path in ("name", "trains", "shares", "curves/1/hold"):
            data = token + field + b"=" + b"x" * 900_000
            answer = browser.client.post(f"{plan}/{path}", data=data, **form)
            assert answer.status_code in (302, 413, 422), (path, field)
    assert (
        browser.client.put(f"/api/v1{plan}/answers", json={"answers": {"a": "x" * 1_100_000}}).status_code
        == 413
    )
    assert len(browser.get("/api/v1/plans").json["plans"]) == 1


@pytest.mark.parametrize("table", ["traffic", "limits"])
def test_a_small_file_with_a_table_without_end_is_refused(service: Flask, table: str) -> None:
    """Trains and limits are read while the request waits, however many of them a file names."""
    head, row = {
        "traffic": ("Class,Category,Speed", "C%d,freight,80"),
        "limits": ("Quantity,Normal,Unit,Note", "cant,150,mm,%d"),
    }[table]
    data = "\n".join([head, *(row % n for n in range(6_000))]).encode()
    assert len(data) < 200_000
    browser = Browser(service)
    plan = bring(browser)
    sent = {"file": (io.BytesIO(ROWS.encode()), "a.csv"), table: (io.BytesIO(data), "b.csv")}
    answer = browser.client.post("/api/v1/plans", data=sent)
    assert answer.status_code == 422
    assert "more than 5000 rows" in answer.json["error"]["message"]
    page = "trains" if table == "traffic" else "limits"
    answer = browser.post(f"{plan}/{page}/file", {"file": (io.BytesIO(data), "b.csv")})
    assert answer.status_code == 422
    assert "more than 5000 rows" in answer.text


TRAIN = {"name": "Local", "category": "passenger", "speed_kmh": 90}
RULE = {"quantity": "cant gradient", "normal": 2, "unit": "mm/m"}


@pytest.mark.parametrize(
    ("path", "body"),
    [
        ("settings", {"rail_spacing_mm": 5e-324}),
        ("settings", {"rail_spacing_mm": 1e308}),
        ("settings", {"equilibrium_constant": 1e-300}),
        ("settings", {"underbalance_mm": 1e308}),
        ("settings", {"maintenance_allowance_mm": 1e308}),
        ("traffic", {"rows": [{**TRAIN, "roll_coefficient": 1e308}]}),
        ("traffic", {"rows": [{**TRAIN, "mass_t": 1e308}]}),
        ("limits", {"name": "own", "rows": [{**RULE, "normal": -1e308}]}),
        ("limits", {"name": "own", "rows": [{**RULE, "exceptional": 1e308}]}),
        ("limits", {"name": "own", "rows": [{**RULE, "per_metre_of_radius": 1e308}]}),
    ],
)
def test_a_number_that_cannot_be_computed_with_is_refused(
    browser: Browser, path: str, body: dict[str, Any]
) -> None:
    plan = planned(browser)
    api = plan.replace("/plans/", "/api/v1/plans/")
    before = browser.get(api).json["steps"]
    answer = browser.client.put(f"{api}/{path}", json=body)
    assert answer.status_code == 422, answer.text
    assert browser.get(api).json["steps"] == before
    assert browser.get(f"{plan}/cants").status_code == 200


@pytest.mark.parametrize("field", ["rail_spacing_mm", "equilibrium_constant", "underbalance_mm"])
@pytest.mark.parametrize("value", ["1e-320", "1e308"])
def test_a_number_that_cannot_be_computed_with_is_told_beside_its_field(
    browser: Browser, field: str, value: str
) -> None:
    plan = planned(browser)
    answer = browser.post(f"{plan}/choice", {"method": "rms", "tiers": "normal", field: value})
    if field == "underbalance_mm" and value == "1e-320":
        assert answer.status_code == 303
    else:
        assert answer.status_code == 422
        assert "Some fields cannot be used" in answer.text
    assert browser.get(f"{plan}/cants").status_code == 200


def test_xml_that_grows_without_end_is_refused_at_once(browser: Browser) -> None:
    entities = '<!ENTITY a "ha">' + "".join(
        f'<!ENTITY {chr(98 + n)} "{f"&{chr(97 + n)};" * 10}">' for n in range(12)
    )
    good, bad = io.BytesIO(book(("Curves", table(ROWS)))), io.BytesIO()
    with zipfile.ZipFile(good) as source, zipfile.ZipFile(bad, "w", zipfile.ZIP_DEFLATED) as target:
        for entry in source.namelist():
            data = source.read(entry)
            if entry.endswith("sheet1.xml"):
                text = re.sub(r"^<\?xml.*?\?>", "", data.decode())
                data = (
                    f'<?xml version="1.0"?><!DOCTYPE w [{entities}]>{text.replace("Aldmere", "&m;")}'.encode()
                )
            target.writestr(entry, data)
    begun = time.perf_counter()
    answer = browser.post("/plans", {"file": (io.BytesIO(bad.getvalue()), "bomb.xlsx")})
    assert answer.status_code == 422
    assert time.perf_counter() - begun < 10
    assert browser.get("/api/v1/plans").json["plans"] == []


# Requests that others make a browser send.


@pytest.mark.parametrize(
    "headers",
    [
        {"Sec-Fetch-Site": "cross-site"},
        {"Sec-Fetch-Site": "same-site"},
        {"Origin": "https://elsewhere.example"},
        {"Origin": "http://localhost.elsewhere.example"},
        {"Origin": "null"},
    ],
    ids=lambda headers: "-".join(next(iter(headers.items()))),
)
def test_nothing_is_changed_for_another_site(app: Flask, headers: dict[str, str]) -> None:
    browser = Browser(app)
    plan = planned(browser)
    before = browser.get(f"/api/v1{plan}/history").json
    for rule, method in rules_of(app, changing=True):
        answer = ask(browser, method, filled(rule, plan.split("/")[2]), headers=headers)
        assert answer.status_code == 403, (method, rule.rule, answer.status_code)
    assert browser.get(f"/api/v1{plan}/history").json == before


def test_no_form_is_taken_without_its_token(start: Start) -> None:
    app = start(bounds=MANY)
    browser, other = Browser(app), Browser(app)
    plan = planned(browser)
    other.get("/")
    signer = URLSafeTimedSerializer("another key", salt="form")
    for token in ("", other.token, signer.dumps("me"), browser.token[:-2], browser.token + "A", "\x00"):
        for rule, method in rules_of(app, changing=True):
            if rule.rule.startswith("/api/"):
                continue
            path = filled(rule, plan.split("/")[2])
            answer = browser.client.open(path, method=method, data={**TRAINS, "token": token})
            code = 400 if "\x00" in token else 403
            assert answer.status_code == code, (method, rule.rule, answer.status_code)
    assert browser.get(f"{plan}/cants").status_code == 200


def test_a_page_that_is_only_looked_at_changes_nothing(app: Flask) -> None:
    browser = Browser(app)
    plan = planned(browser)
    before = browser.get(f"/api/v1{plan}/history").json
    for rule, method in rules_of(app):
        if method == "GET" and "<path" not in rule.rule:
            browser.get(filled(rule, plan.split("/")[2]))
    assert browser.get(f"/api/v1{plan}/history").json == before
    assert len(browser.get("/api/v1/plans").json["plans"]) == 1


def test_no_method_stands_for_another(browser: Browser) -> None:
    plan = planned(browser)
    for name in ("X-HTTP-Method-Override", "X-HTTP-Method", "X-Method-Override"):
        assert browser.get(f"/api/v1{plan}", headers={name: "DELETE"}).status_code == 200
        browser.client.post(f"/api/v1{plan}", headers={name: "DELETE"})
        browser.post(f"{plan}/keep", {"_method": "DELETE"}, headers={name: "DELETE"})
    browser.get(f"/api/v1{plan}?_method=DELETE")
    for method in ("TRACE", "CONNECT", "PATCH", "PROPFIND", "DELETE", "PUT"):
        assert browser.client.open(f"{plan}/cants", method=method).status_code == 405, method
    assert browser.get(f"{plan}/cants").status_code == 200


# What is put where it does not belong.


@pytest.mark.parametrize(
    "name",
    ["a\r\nSet-Cookie: x=1\r\n\r\n.csv", 'a"; filename="b.html', "a\nb.csv", "a%0d%0ab.csv", "a\u2028b.csv"],
)
def test_no_file_name_adds_a_header(browser: Browser, name: str) -> None:
    raw = b'--edge\r\nContent-Disposition: form-data; name="token"\r\n\r\nTOKEN\r\n--edge\r\n'
    browser.get("/")
    quoted = name.replace('"', '\\"').encode()
    raw = raw.replace(b"TOKEN", browser.token.encode()) + (
        b'Content-Disposition: form-data; name="file"; filename="'
        + quoted
        + b'"\r\n\r\n'
        + ROWS.encode()
        + b"\r\n--edge--\r\n"
    )
    answer = browser.client.post("/plans", data=raw, content_type="multipart/form-data; boundary=edge")
    assert answer.status_code in (303, 400, 403, 422)
    assert "x=1" not in str(answer.headers.get("Set-Cookie"))
    if answer.status_code == 303:
        plan = answer.headers["Location"].removesuffix("/list")
        for path in ("original", "trains/file", "limits/file"):
            sent = browser.get(f"{plan}/{path}").headers.get("Content-Disposition", "")
            assert "\r" not in sent
            assert "\n" not in sent
            assert sent.count("filename=") <= 1
            assert sent.count('"') in (0, 2)


@pytest.mark.parametrize(
    "host",
    [
        "elsewhere.example",
        "localhost:80@elsewhere.example",
        "localhost/../x",
        "a\tb",
        "",
        "localhost\x00",
        "[::1",
    ],
)
def test_no_host_name_of_others_is_answered(start: Start, host: str) -> None:
    app = start(trusted_hosts=("localhost",))
    answer = app.test_client().get("/", headers={"Host": host})
    assert answer.status_code == 400
    assert "elsewhere" not in answer.text
    assert "Location" not in answer.headers


def test_no_address_of_a_redirect_adds_a_header_or_leads_elsewhere(browser: Browser) -> None:
    plan = planned(browser)
    places = (
        "//elsewhere.example", "https://elsewhere.example", "/\\elsewhere.example", "\\\\elsewhere.example",
        "/\t/elsewhere.example", "/\n/elsewhere.example", "/%09/elsewhere.example", "///elsewhere.example",
        "javascript:alert(1)", "/ok\r\nSet-Cookie: x=1", "/ok\nX: y", "data:text/html,x", "@elsewhere",
        "/.//elsewhere.example", " //elsewhere.example", "\x00//elsewhere.example", "",
    )  # fmt: skip
    for place in places:
        answers = [
            browser.post("/units", {"units": "us", "back": place}),
            browser.get(f"{plan}/pieces/{'x' * 32}?then={quote(place)}"),
            browser.post(f"{plan}/pieces/{'x' * 32}/again", {"then": place}),
        ]
        for answer in answers:
            assert answer.status_code in (303, 400, 403, 404), (place, answer.status_code)
            led = answer.headers.get("Location", "/")
            assert re.match(r"/(?![/\\\s])|/$", led), (place, led)
            assert "\n" not in led
            assert "x=1" not in str(answer.headers.get("Set-Cookie"))


# Cookies and keys.


def test_no_cookie_but_ours_is_believed(app: Flask) -> None:
    browser = Browser(app)
    plan = bring(browser)
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    with browser.client.session_transaction() as session:
        owner = session["owner"]
    payload, stamp, signature = cookie.value.rsplit(".", 2)
    elsewhere = URLSafeTimedSerializer("another key", salt="cookie-session")
    with app.app_context():
        other_purpose = URLSafeTimedSerializer(str(app.secret_key), salt="form").dumps({"owner": owner})
    forged = (
        f"{payload}.{stamp}.{signature[:-2]}AA", f"{payload}.{stamp}.", f"{payload}", "", "null",
        f"{payload}.{stamp}.{signature[::-1]}", elsewhere.dumps({"owner": owner}), other_purpose,
        json.dumps({"owner": owner}), f"{payload[:-3]}xyz.{stamp}.{signature}", "a" * 4000,
    )  # fmt: skip
    for value in forged:
        client = app.test_client()
        client.set_cookie("cant", value)
        assert client.get(f"{plan}/list").status_code == 404, value
        assert client.get(f"/api/v1{plan}").status_code in (401, 404), value
    good = app.test_client()
    good.set_cookie("cant", cookie.value)
    assert good.get(f"{plan}/list").status_code == 200


def test_no_key_but_ours_is_believed(app: Flask) -> None:
    client = app.test_client(use_cookies=False)
    made = client.post("/api/v1/plans", data={"file": (io.BytesIO(ROWS.encode()), "a.csv")}).json
    path, key = f"/api/v1/plans/{made['address']}", made["key"]
    secret = str(app.secret_key)
    forged = (
        key[:-2] + ("AA" if key[-2:] != "AA" else "BB"), key.split(".")[0], "", "null", "." * 9, "\x7f",
        URLSafeSerializer("another key", salt="key").dumps("me"),
        URLSafeTimedSerializer(secret, salt="form").dumps("me"),
    )  # fmt: skip
    for value in forged:
        answer = client.get(path, headers={"Authorization": f"Bearer {value}"})
        assert answer.status_code in (401, 403), value
    for scheme in ("Basic", "Digest", "bearer2", ""):
        assert client.get(path, headers={"Authorization": f"{scheme} {key}"}).status_code in (
            400,
            401,
            403,
            404,
        )
    assert client.get(path, headers={"Authorization": f"Bearer {key}"}).status_code == 200


def test_a_new_service_has_a_key_of_its_own(tmp_path: Any) -> None:
    first, second = (create_app({"CANT": Config(tmp_path / name)}) for name in ("a", "b"))
    assert first.secret_key != second.secret_key
    assert len(str(first.secret_key)) >= 43
    browser = Browser(first)
    plan = bring(browser)
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    stranger = second.test_client()
    stranger.set_cookie("cant", cookie.value)
    assert stranger.get(f"{plan}/list").status_code == 404
    for app in (first, second):
        app.extensions[EXTENSION].database.close()
