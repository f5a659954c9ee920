"""Texts that are made to harm: script, templates, formulas, JSON, letters that deceive; in every field."""

from __future__ import annotations

import csv
import io
import json
import re
import time
from collections.abc import Callable
from typing import Any
from urllib.parse import quote

import openpyxl
import pytest
from flask import Flask
from refusing_tools import (
    HEADER,
    MANY,
    ROWS,
    book,
    bring,
    filled,
    planned,
    rules_of,
    table,
)
from web_tools import TRAINS, Browser

Start = Callable[..., Flask]
MARK = "zq7"
HARM = (
    f"<script>{MARK}()</script>",
    f"\"'><img src=x onerror={MARK}()>",
    f"{{{{ {MARK}.__class__ }}}}{{{{ 1337*2 }}}}",
    f"{{% if {MARK} %}}x{{% endif %}}${{1337*2}}#{{1337*2}}<%= 1337*2 %>",
    f"javascript:{MARK}()",
)
FORMULAS = (
    f'=HYPERLINK("http://elsewhere.example/{MARK}")', f"+{MARK}+1", f"-{MARK}-1", f"@SUM({MARK})",
    f"=cmd|'/C calc'!{MARK}", f"\t={MARK}", f"\r={MARK}", f"＝{MARK}", f";={MARK}", f"={MARK}\n=1",
)  # fmt: skip


@pytest.fixture
def service(start: Start, database_url: str) -> Flask:
    """Give the service on each database, without bounds on guessing."""
    return start(database_url, bounds=MANY)


@pytest.mark.parametrize(
    "body",
    [
        b"[" * 100_000 + b"]" * 100_000,
        b'{"answers":' * 50_000 + b"1" + b"}" * 50_000,
        b'{"answers": ' + b"9" * 100_000 + b"}",
        b'{"answers": 1e999}',
        b'{"answers": NaN}',
        b'{"answers": {"a": {"b": "\\ud800"}}}',
        b'{"answers": {"a": {"b": "\\u0000"}}}',
        b'{"answers": {"\\u0000": {"\\ud800": "x"}}}',
        b'{"answers": {}, "__proto__": {"x": 1}}',
        b'{"answers": {}, "answers": []}',
        b"\xff\xfe{\x00}\x00",
        b'{"answers": "\xc0\xaf"}',
    ],
)
def test_json_that_is_made_to_harm_is_refused(service: Flask, body: bytes) -> None:
    browser = Browser(service)
    plan = bring(browser)
    begun = time.perf_counter()
    answer = browser.client.put(f"/api/v1{plan}/answers", data=body, content_type="application/json")
    assert answer.status_code in (400, 422), answer.text[:300]
    assert answer.json["error"]["message"]
    assert time.perf_counter() - begun < 10
    assert browser.get(f"{plan}/list").status_code == 200


@pytest.mark.parametrize(
    ("path", "body"),
    [
        ("settings", {"keep_within_mm": 10**400}),
        ("settings", {"units": "metric\x00"}),
        ("traffic", {"rows": [{"name": "\ud800", "category": "x", "speed_kmh": 80}]}),
        ("traffic", {"rows": [{"name": "a\x00", "category": "x", "speed_kmh": 80}]}),
        ("limits", {"name": "\ud800"}),
        ("limits", {"name": "own\ud800", "rows": [{"quantity": "cant", "normal": 60.0, "unit": "mm"}]}),
        (
            "limits",
            {"name": "own", "rows": [{"quantity": "cant", "normal": 60.0, "unit": "mm", "note": "\ud800"}]},
        ),
        ("curves/1/cant", {"cant_mm": 50.0, "because": "\ud800"}),
        ("curves/1/cant", {"cant_mm": 50.0, "because": "x", "who": "\udfff"}),
    ],
)
def test_values_that_no_database_holds_are_refused(service: Flask, path: str, body: dict[str, Any]) -> None:
    browser = Browser(service)
    plan = planned(browser)
    answer = browser.client.put(
        f"/api/v1{plan}/{path}", data=json.dumps(body), content_type="application/json"
    )
    assert answer.status_code in (400, 422), answer.text
    assert answer.json["error"]["message"].isprintable()
    assert browser.get(f"{plan}/cants").status_code == 200


def plan_full_of(browser: Browser, text: str) -> str:
    """Give the address of a plan with a text in every field that takes one, as far as each takes it."""
    line = io.StringIO()
    csv.writer(line).writerow([text, text, text, 1.2, 1.48, 800, "L", 80, 80, 60, 110, text, text])
    rows = f"{HEADER},Remark,{MARK} own\n{line.getvalue()}"
    for first in (
        "Aldmere,1,A2,3.100,3.420,300,R,30,30,100,120,,\n",
        "Aldmere,1,A3,5.1,5.4,250,R,0,0,10,120,,\n",
    ):
        rows += first
    plan = bring(browser, book(("Curves", table(rows))), "list.xlsx")
    trains = {**TRAINS, "0-name": text, "0-category": text, "0-line": text, "0-track": text}
    if browser.post(f"{plan}/trains", trains).status_code != 303:
        assert browser.post(f"{plan}/trains", TRAINS).status_code == 303
    assert browser.post(f"{plan}/limits/choose", {"source": "set:typical"}).status_code == 303
    fields = {"0-normal": "150", "0-clause": text, "0-note": text, "keep-as": text}
    fields |= {"new-0-quantity": "cant", "new-0-normal": "140", "new-0-unit": "mm", "new-0-category": text}
    fields |= {"new-0-clause": text, "new-0-note": text}
    browser.post(f"{plan}/limits", {**fields, "units": "metric"})
    assert browser.post(f"{plan}/confirm").status_code == 303, text
    browser.post(f"{plan}/name", {"name": text})
    held = {"cant": "50", "units": "metric", "because": text, "who": text}
    browser.post(f"{plan}/curves/2/hold", held)
    browser.post(f"{plan}/shares", {"label": text, "access": "read"})
    browser.post(f"{plan}/curves/3/options/1", {"because": text, "who": text})
    return plan


@pytest.mark.parametrize("text", HARM)
def test_no_text_becomes_script_or_template(app: Flask, text: str) -> None:
    browser = Browser(app)
    plan = plan_full_of(browser, text)
    shown = 0
    for rule, method in rules_of(app):
        if method != "GET" or rule.endpoint == "static":
            continue
        path = filled(rule, plan.split("/")[2])
        for address in (
            path,
            f"{path}?search={quote(text)}&status={quote(text)}&track={quote(text)}&page={quote(text)}",
        ):
            answer = browser.get(address)
            assert answer.status_code < 500, address
            if not (answer.content_type or "").startswith("text/html"):
                continue
            shown += MARK in answer.text
            assert "2674" not in answer.text, address
            assert f"<script>{MARK}" not in answer.text, address
            assert not re.search(rf"<[^>]*\son\w+\s*=\s*[\"']?{MARK}", _without_values(answer.text)), address
            assert not re.search(r"(href|src|action)\s*=\s*[\"']?\s*javascript:", answer.text), address
    assert shown > 5


def _without_values(page: str) -> str:
    """Give a page without its quoted values, in which a harmless mark may stand."""
    return re.sub(r'"[^"]*"', '""', page)


@pytest.mark.parametrize("text", FORMULAS)
def test_no_text_becomes_a_formula(browser: Browser, text: str) -> None:
    plan = plan_full_of(browser, text)
    answer = browser.get(f"{plan}/workbook")
    assert answer.status_code == 200, answer.text
    found = 0
    for sheet in openpyxl.load_workbook(io.BytesIO(answer.data)):
        for row in sheet.iter_rows():
            for cell in row:
                if isinstance(cell.value, str) and MARK in cell.value:
                    found += 1
                    is_formula = cell.data_type == "f" and not _quotes(cell.value)
                    assert not is_formula, (sheet.title, cell.coordinate, cell.value)
    assert found > 3
    for name in ("trains/file", "limits/file"):
        for row in csv.reader(io.StringIO(browser.get(f"{plan}/{name}").data.decode("utf-8-sig"))):
            for cell in row:
                if MARK in cell:
                    assert not cell.startswith(("=", "+", "-", "@", "\t", "\r", "＝", "＋", "－", "＠")), (
                        name,
                        cell,
                    )


def test_no_text_of_a_csv_becomes_a_formula(browser: Browser) -> None:
    lines = io.StringIO()
    writer = csv.writer(lines)
    writer.writerow([*HEADER.split(","), "Remark"])
    for number, text in enumerate(FORMULAS):
        start = 1.2 + 2 * number
        writer.writerow([text, text, text, start, start + 0.3, 800, "L", 80, 80, 60, 110, text])
    plan = planned(browser, lines.getvalue())
    answer = browser.get(f"{plan}/workbook")
    assert answer.status_code == 200, answer.text
    found = 0
    for sheet in openpyxl.load_workbook(io.BytesIO(answer.data)):
        for row in sheet.iter_rows():
            for cell in row:
                if isinstance(cell.value, str) and MARK in cell.value:
                    found += 1
                    assert cell.data_type != "f" or _quotes(cell.value), (sheet.title, cell.coordinate)
    assert found > 2 * len(FORMULAS)


def _quotes(formula: str) -> bool:
    """Tell whether a formula of ours names the text in quotes alone."""
    return MARK not in re.sub(r'"(?:[^"]|"")*"', "", formula)


FIELDS = (
    "name label because who keep-as source cant until 0-name 0-category 0-speed_kmh 0-line rows units back "
    "page proposal 0-clause 0-note 0-normal method q-0 c-0-meaning then number"
)
ASKED = "search track status sort page size cant units with from to kind severity then zoom"
TRICKS = {
    "null": "a\x00b",
    "surrogate": "a\ud800b",
    "turned": "csv.\u202eevil",
    "unseen": "a\u200b\u2060\ufeffb",
    "stacked": "e" + "\u0301" * 200,
    "wide digits": "１２３",
    "other digits": "١٢٣",
    "line ends": "a\u2028b\u2029c\x85d",
    "private": "\ue000\U000f0000",
    "control": "a\x1b[31mb\x07",
    "emoji": "\U0001f682" * 40,
}


@pytest.mark.parametrize("trick", TRICKS)
def test_letters_that_deceive_are_refused_or_shown_as_they_are(service: Flask, trick: str) -> None:
    browser, text = Browser(service), TRICKS[trick]
    plan = planned(browser)
    sent = text.encode("utf-8", "surrogatepass")
    as_bytes = "&".join(f"{name}={quote(sent)}" for name in FIELDS.split())
    for rule, method in rules_of(service, changing=True):
        if rule.rule.startswith("/api/") or rule.endpoint in ("start.delete", "start.sample"):
            continue
        answer = browser.client.open(
            filled(rule, plan.split("/")[2]),
            method=method,
            data=f"token={quote(browser.token)}&{as_bytes}",
            content_type="application/x-www-form-urlencoded",
        )
        assert answer.status_code < 500, (rule.rule, answer.status_code)
    for rule, method in rules_of(service):
        if method == "GET" and rule.endpoint != "static":
            path = filled(rule, plan.split("/")[2])
            asked = "&".join(f"{name}={quote(sent)}" for name in ASKED.split())
            assert browser.get(f"{path}?{asked}").status_code < 500, path
    for path in (f"/plans/{quote(sent)}/list", f"/help/limits/{quote(sent)}", f"/shared/{quote(sent)}"):
        assert browser.get(path).status_code in (400, 404, 405), path
    answer = browser.client.post(
        "/plans", data={"token": browser.token, "file": (io.BytesIO(ROWS.encode()), f"{_plain(text)}.csv")}
    )
    assert answer.status_code in (303, 422), answer.text
    page = browser.get("/")
    assert page.status_code == 200
    for letter in ("\x00", "\u202e", "\x1b", "\u200b"):
        assert letter not in page.text


def _plain(text: str) -> str:
    """Give a text as a form can carry it as a file name."""
    return text.encode("utf-8", "ignore").decode()
