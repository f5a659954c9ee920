"""What must be refused, and what every answer carries."""

from __future__ import annotations

import csv
import functools
import io
import re
from collections.abc import Callable
from pathlib import Path

import pytest
from flask import Flask
from web_tools import TRAINS, Browser

from webapp.context import EXTENSION
from webapp.security import HEADERS

PAGES = (
    "", "/list", "/trains", "/limits", "/cants", "/line", "/findings", "/files", "/print",
    "/curves/1", "/workbook", "/plan.json", "/original", "/trains/file", "/limits/file", "/delete",
    "/compare", "/history", "/curves/1/at?cant=50", "/curves/1/held?cant=50", "/shares",
)  # fmt: skip
POSTS = (
    "/list", "/list/forget", "/trains", "/trains/file", "/trains/forget", "/limits", "/limits/choose",
    "/limits/file", "/limits/forget", "/choice", "/confirm", "/name", "/keep", "/delete",
    "/compare", "/keep-proposal", "/curves/1/hold", "/curves/1/options/1", "/changes/abc/back",
    "/shares", "/shares/1/withdraw", "/leave",
)  # fmt: skip


def test_other_browser_finds_none_of_a_plan(browser: Browser, other_browser: Browser) -> None:
    plan = browser.sample()
    for page in PAGES:
        assert other_browser.get(f"{plan}{page}").status_code == 404, page
        assert browser.get(f"{plan}{page}").status_code in (200, 302), page
    other_browser.get("/")
    for page in POSTS:
        assert other_browser.post(f"{plan}{page}", dict(TRAINS)).status_code == 404, page
    assert plan not in other_browser.get("/").text
    assert browser.get(f"{plan}/cants").status_code == 200


def test_every_address_of_a_plan_is_in_these_tests(app: Flask) -> None:
    """A new page or form must be added to the lists above; those of long work are tested with it."""
    rules = [
        r
        for r in app.url_map.iter_rules()
        if r.rule.startswith("/plans/<address>") and "<work>" not in r.rule
    ]
    gets = {r.rule.removeprefix("/plans/<address>") for r in rules if "GET" in (r.methods or ())}
    posts = {r.rule.removeprefix("/plans/<address>") for r in rules if "POST" in (r.methods or ())}
    assert gets == {p.partition("?")[0].replace("/1", "/<int:number>") for p in PAGES}
    asked = {
        "/curves/1": "/curves/<int:number>",
        "/shares/1": "/shares/<int:number>",
        "options/1": "options/<int:option>",
        "/abc/": "/<key>/",
    }
    assert posts == {functools.reduce(lambda p, pair: p.replace(*pair), asked.items(), p) for p in POSTS}


def test_forged_cookie_is_nobody(browser: Browser, app: Flask) -> None:
    plan = browser.sample()
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    payload, rest = cookie.value.split(".", 1)
    forged = app.test_client()
    forged.set_cookie("cant", payload[:-2] + "AA." + rest)
    assert forged.get(f"{plan}/cants").status_code == 404


@pytest.mark.parametrize("page", POSTS)
def test_form_without_token_changes_nothing(browser: Browser, page: str) -> None:
    plan = browser.sample()
    answer = browser.client.post(f"{plan}{page}", data=dict(TRAINS))
    assert answer.status_code == 403
    assert browser.get(f"{plan}/cants").status_code == 200


def test_form_with_the_token_of_another_browser_is_refused(browser: Browser, other_browser: Browser) -> None:
    plan = browser.sample()
    other_browser.get("/")
    answer = browser.client.post(f"{plan}/delete", data={"token": other_browser.token})
    assert answer.status_code == 403
    assert browser.get(f"{plan}/cants").status_code == 200


@pytest.mark.parametrize(
    "header", [{"Sec-Fetch-Site": "cross-site"}, {"Origin": "https://elsewhere.example"}]
)
def test_form_from_another_site_is_refused_even_with_the_token(
    browser: Browser, header: dict[str, str]
) -> None:
    plan = browser.sample()
    assert browser.post(f"{plan}/delete", headers=header).status_code == 403
    api = browser.client.delete(f"/api/v1{plan}", headers=header)
    assert api.status_code == 403


def test_every_answer_carries_the_headers(browser: Browser) -> None:
    plan = browser.sample()
    addresses = ["/", "/nothing", "/help/", "/api/v1/limits", "/static/style.css", "/healthz"]
    for address in [*addresses, *(f"{plan}{page}" for page in PAGES)]:
        answer = browser.get(address)
        for name, value in HEADERS.items():
            assert answer.headers[name] == value, address
    policy = HEADERS["Content-Security-Policy"]
    assert "default-src 'self'" in policy
    assert "frame-ancestors 'none'" in policy
    assert "unsafe" not in policy
    assert browser.get(f"{plan}/cants").headers["Cache-Control"] == "private, no-store"


def test_no_page_has_inline_script_or_style(browser: Browser) -> None:
    plan = browser.sample()
    helps = [
        "/help/",
        "/help/terms",
        "/help/formulas",
        "/help/columns",
        "/help/limits",
        "/help/limits/typical",
    ]
    for address in ["/", *helps, *(f"{plan}{p}" for p in PAGES[1:10])]:
        text = browser.get(address).text
        assert not re.search(r"<script(?! src=\"/static/)|<style|\sstyle=|\son[a-z]+=|javascript:", text), (
            address
        )


def test_cookie_is_signed_http_only_and_same_site(browser: Browser) -> None:
    sent = browser.get("/").headers["Set-Cookie"]
    assert "HttpOnly" in sent
    assert "SameSite=Lax" in sent
    assert "Secure" not in sent


def test_cookie_is_secure_behind_https(start: Callable[..., Flask]) -> None:
    assert "Secure" in start(https=True).test_client().get("/").headers["Set-Cookie"]


def test_too_large_a_request_is_refused(start: Callable[..., Flask]) -> None:
    app = start(upload_mb=1)
    assert app.config["MAX_CONTENT_LENGTH"] == 1_000_000
    app.config["MAX_CONTENT_LENGTH"] = 100_000
    browser = Browser(app)
    browser.get("/")
    answer = browser.post("/plans", {"file": (io.BytesIO(b"x" * 120_000), "big.csv")})
    assert answer.status_code == 413
    assert "1 MB at most" in answer.text


@pytest.mark.parametrize("back", ["//elsewhere.example", "https://elsewhere.example", "/\\elsewhere.example"])
def test_change_of_units_never_leads_elsewhere(browser: Browser, back: str) -> None:
    assert browser.post("/units", {"units": "us", "back": back}).headers["Location"] == "/"


def test_unforeseen_error_shows_a_reference_and_no_trace(
    app: Flask, browser: Browser, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    def fails(_owner: str) -> None:
        message = "secret detail"
        raise RuntimeError(message)

    monkeypatch.setattr(app.extensions[EXTENSION].store, "plans", fails)
    answer = browser.client.get("/")
    assert answer.status_code == 500
    assert "secret detail" not in answer.text
    assert "Traceback" not in answer.text
    found = re.search(r"reference ([0-9a-f]{8})", answer.text)
    assert found is not None
    assert found.group(1) in caplog.text


def test_errors_are_json_where_json_is_asked_for(browser: Browser) -> None:
    answer = browser.get("/nothing", headers={"Accept": "application/json"})
    assert answer.json == {"error": {"status": 404, "message": "There is no page at this address."}}
    assert browser.get("/api/v1/nothing").json["error"]["status"] == 404
    assert browser.client.put("/plans").status_code == 405


def test_names_of_the_user_are_shown_as_text(browser: Browser, bare_list: Path) -> None:
    nasty = "<script>alert(1)</script>\"'><b>"
    bare_list.write_text(bare_list.read_text().replace("A2", '"' + nasty.replace('"', '""') + '"'))
    plan = browser.upload(bare_list)
    trains = {**TRAINS, "0-name": "<i>Fast</i>"}
    assert browser.post(f"{plan}/trains", trains).status_code == 303
    browser.post(f"{plan}/limits/choose", {"source": "set:typical"})
    browser.post(f"{plan}/confirm")
    for page in ("/list", "/trains", "/cants", "/line", "/findings", "/print", "/curves/2"):
        text = browser.get(f"{plan}{page}").text
        assert "<script>" not in text, page
        assert "<i>Fast" not in text, page
    assert "&lt;script&gt;" in browser.get(f"{plan}/cants").text


def test_no_cell_of_a_csv_is_a_formula(browser: Browser, bare_list: Path) -> None:
    plan = browser.upload(bare_list)
    trains = {**TRAINS, "0-name": "=HYPERLINK(1)", "0-category": "+cmd", "0-line": "@x", "0-track": "-1"}
    assert browser.post(f"{plan}/trains", trains).status_code == 303
    table = list(csv.reader(io.StringIO(browser.get(f"{plan}/trains/file").data.decode("utf-8-sig"))))
    texts = [cell for row in table[1:] for cell in (row[0], row[1], row[8], row[9])]
    assert [t for t in texts if t]
    assert not [t for t in texts if t.startswith(("=", "+", "-", "@"))]


def test_file_names_are_shown_without_folders_and_control_characters(browser: Browser) -> None:
    rows = b"Curve,Radius (m),Speed (km/h)\nA,500,80\n"
    answer = browser.post("/plans", {"file": (io.BytesIO(rows), "..\\..\\etc/pass\x07wd<b>.csv")})
    assert answer.status_code == 303
    page = browser.get("/").text
    assert "passwdb.csv" in page
    plan = answer.headers["Location"].removesuffix("/list")
    sent = browser.get(f"{plan}/original").headers["Content-Disposition"]
    assert sent.startswith('attachment; filename="passwdb.csv"')
