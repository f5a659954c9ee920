"""What the tests of refused requests share: small plans, every route, workbooks made from nothing."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator
from typing import Any

import openpyxl
from flask import Flask
from web_tools import TRAINS, Browser
from werkzeug.routing import Rule
from werkzeug.test import TestResponse

from webapp.guarding.bounds import Bounds

HEADER = (
    "Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in (m),Transition out (m),Cant,Speed"
)
ROWS = (
    f"{HEADER}\nAldmere,1,A1,1.200,1.480,800,L,80,80,60,110\nAldmere,1,A2,3.100,3.420,600,R,80,80,100,100\n"
)
MANY = Bounds(requests_per_minute=100_000, wrong_plans_per_minute=100_000, wrong_links_per_minute=100_000)
SAFE_METHODS = {"GET", "HEAD", "OPTIONS"}


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
