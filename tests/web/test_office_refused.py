"""What must be refused, one test for each way in; on both databases where that could make a difference.

Slow requests and those refused by their header are in ``test_office_stopping.py``, for they need a process.
"""

from __future__ import annotations

import csv
import io
import json
import re
import time
import zipfile
from collections.abc import Callable, Iterator
from typing import Any
from urllib.parse import quote

import openpyxl
import pytest
from flask import Flask
from itsdangerous import URLSafeSerializer, URLSafeTimedSerializer
from web_tools import TRAINS, Browser
from werkzeug.routing import Rule
from werkzeug.test import TestResponse

from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.guarding.bounds import Bounds

Start = Callable[..., Flask]
HEADER = (
    "Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in (m),Transition out (m),Cant,Speed"
)
ROWS = (
    f"{HEADER}\nAldmere,1,A1,1.200,1.480,800,L,80,80,60,110\nAldmere,1,A2,3.100,3.420,600,R,80,80,100,100\n"
)
MANY = Bounds(requests_per_minute=100_000, wrong_plans_per_minute=100_000, wrong_links_per_minute=100_000)
SAFE_METHODS = {"GET", "HEAD", "OPTIONS"}


@pytest.fixture
def service(start: Start, database_url: str) -> Flask:
    """Give the service on each database, without bounds on guessing."""
    return start(database_url, bounds=MANY)


def bring(browser: Browser, rows: str | bytes = ROWS, name: str = "list.csv") -> str:
    data = rows.encode() if isinstance(rows, str) else rows
    answer = browser.post("/plans", {"file": (io.BytesIO(data), name)})
    assert answer.status_code == 303, answer.text
    return answer.headers["Location"].removesuffix("/list")


def planned(browser: Browser, rows: str | bytes = ROWS, name: str = "list.csv", **trains: str) -> str:
    plan = bring(browser, rows, name)
    assert browser.post(f"{plan}/trains", {**TRAINS, **trains}).status_code == 303
    assert browser.post(f"{plan}/limits/choose", {"source": "set:typical"}).status_code == 303
    assert browser.post(f"{plan}/confirm").status_code == 303
    return plan


def rules_of(app: Flask, *, changing: bool = False) -> Iterator[tuple[Rule, str]]:
    """Yield every rule with each of its methods; those that change something alone where it is asked."""
    for rule in app.url_map.iter_rules():
        for method in sorted((rule.methods or set()) - {"HEAD", "OPTIONS"}):
            if not changing or method not in SAFE_METHODS:
                yield rule, method


def filled(rule: Rule, address: str = "") -> str:
    """Give a rule's address with its variables filled in."""
    plain = {"address": address or "A" * 32, "name": "typical", "filename": "style.css", "change": "x" * 12}
    path = re.sub(r"<int:\w+>", "1", rule.rule)
    return re.sub(r"<(?:\w+:)?(\w+)>", lambda found: plain.get(found.group(1), "x" * 32), path)


def ask(browser: Browser, method: str, path: str, **given: Any) -> TestResponse:
    """Ask with whatever a good request would carry."""
    if path.startswith("/api/"):
        return browser.client.open(
            path, method=method, json={} if method in ("PUT", "POST") else None, **given
        )
    if method == "POST":
        return browser.post(path, dict(TRAINS), **given)
    return browser.client.open(path, method=method, **given)


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


ILLEGAL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f]")


def book(*sheets: tuple[str, list[list[Any]]]) -> bytes:
    made = openpyxl.Workbook()
    made.remove(made.active)  # type: ignore[arg-type]
    for name, rows in sheets:
        sheet = made.create_sheet(name)
        for row in rows:
            sheet.append([None if isinstance(value, str) else value for value in row])
            for column, value in enumerate(row, start=1):
                if isinstance(value, str):  # as text, also where it looks like a formula
                    cell = sheet.cell(sheet.max_row, column, ILLEGAL.sub("", value))
                    cell.data_type = "s"
    stream = io.BytesIO()
    made.save(stream)
    return stream.getvalue()


def table(rows: str) -> list[list[Any]]:
    return [
        [float(c) if c.replace(".", "").isdigit() else c for c in line]
        for line in csv.reader(rows.splitlines())
    ]


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
    from pathlib import Path

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
            browser.get(f"{plan}/work/{'x' * 32}?then={quote(place)}"),
            browser.post(f"{plan}/work/{'x' * 32}/again", {"then": place}),
        ]
        for answer in answers:
            assert answer.status_code in (303, 400, 403, 404), (place, answer.status_code)
            led = answer.headers.get("Location", "/")
            assert re.match(r"/(?![/\\\s])|/$", led), (place, led)
            assert "\n" not in led
            assert "x=1" not in str(answer.headers.get("Set-Cookie"))


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


# Cookies, keys, and letters that are not what they seem.


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
