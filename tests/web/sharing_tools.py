"""Plans shared by links, for tests: links made and opened, forms of a page, every route of a plan."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from html.parser import HTMLParser
from typing import Any, cast

from flask import Flask
from web_tools import TRAINS, Browser

from webapp.context import EXTENSION, Running
from webapp.guarding.bounds import Bounds

LINK = re.compile(r'value="(?:https?://[^/"]+)(/shared/[A-Za-z0-9_-]+)"')
WITHDRAW = re.compile(r"/shares/(\d+)/withdraw")
PATIENT = Bounds(requests_per_minute=100_000, wrong_links_per_minute=100_000, wrong_plans_per_minute=100_000)
CHANGING = ("POST", "PUT", "DELETE", "PATCH")
VALUES: dict[str, Any] = {
    "number": 1,
    "option": 1,
    "share": 1,
    "key": "abcdefghijkl",
    "change": "abcdefghijkl",
    "work": "x" * 32,
}
"""What stands for each variable of a route but the plan's address."""
FORM = {**TRAINS, "name": "mine now", "source": "set:typical", "because": "why not", "cant": "40"}
RULES = [{"quantity": "cant", "normal": 150, "unit": "mm"}]
BODIES: dict[str, dict[str, Any]] = {
    "api.put_answers": {"answers": {}, "columns": {}},
    "api.put_traffic": {"rows": [{"name": "Local", "category": "passenger", "speed_kmh": 90}]},
    "api.put_limits": {"name": "typical"},
    "api.put_settings": {"method": "balanced"},
    "api.hold_cant": {"cant_mm": 40, "because": "why not"},
    "api.take_option": {"because": "why not"},
    "api.make_share": {"label": "me", "access": "edit"},
}
"""What each operation takes that takes a body; a new one must be added, else it is refused as malformed."""


def running_of(app: Flask) -> Running:
    """Give the parts of a service."""
    return cast("Running", app.extensions[EXTENSION])


def share(owner: Browser, plan: str, access: str = "read", **more: str) -> str:
    """Make a link of a plan; give its path."""
    owner.get(f"{plan}/shares")
    answer = owner.post(f"{plan}/shares", {"label": "Survey", "access": access, **more})
    assert answer.status_code == 200, answer.text
    found = LINK.search(answer.text)
    assert found is not None
    return found.group(1)


def opened(browser: Browser, link: str, **sent: str) -> Browser:
    """Open a link in a browser."""
    assert browser.get(link).status_code == 200
    answer = browser.post(link, sent)
    assert answer.status_code == 303, answer.text
    return browser


def numbers(owner: Browser, plan: str) -> list[int]:
    """Give the numbers of the links of a plan."""
    return [int(number) for number in WITHDRAW.findall(owner.get(f"{plan}/shares").text)]


def routes(app: Flask, address: str, methods: tuple[str, ...]) -> Iterator[tuple[str, str, str]]:
    """Give endpoint, method and path of every route of a plan that answers to some methods."""
    with app.test_request_context():
        adapter = app.url_map.bind("localhost")
        for rule in app.url_map.iter_rules():
            if "address" not in rule.arguments:
                continue
            values = {name: VALUES[name] for name in rule.arguments if name != "address"}
            path = adapter.build(rule.endpoint, {"address": address, **values})
            for method in sorted((rule.methods or set()) & set(methods)):
                yield rule.endpoint, method, path


def call(browser: Browser, endpoint: str, method: str, path: str) -> int:
    """Call a route as a page or a program would; give the status."""
    if endpoint.startswith("api."):
        return browser.client.open(path, method=method, json=BODIES.get(endpoint), buffered=True).status_code
    assert method == "POST", "a page is opened or sent"
    return browser.post(path, dict(FORM), buffered=True).status_code


@dataclass
class Form:
    """A form of a page: where it goes, and its buttons as (name, text)."""

    method: str
    action: str
    buttons: list[str] = field(default_factory=list)


class Forms(HTMLParser):
    """The forms of a page, with the names of the buttons that send them."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.found: list[Form] = []
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Take a form or a button."""
        given = {key: value or "" for key, value in attrs}
        if tag == "form":
            self.found.append(Form(given.get("method", "get"), given.get("action", "")))
        elif tag == "button" and given.get("formmethod") != "get":
            self.found[-1].buttons.append(given.get("name", ""))
