"""What the tests of the service share: a browser without script, a small list, its trains."""

from __future__ import annotations

import contextlib
import re
import threading
from collections.abc import Iterator
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

from flask import Flask
from flask.testing import FlaskClient
from waitress.server import create_server
from werkzeug.test import TestResponse

TOKEN = re.compile(r'name="token" value="([^"]+)"')


class Browser:
    """A browser without script: cookies, and the token of the form that it was shown."""

    def __init__(self, app: Flask) -> None:
        self.client: FlaskClient = app.test_client()
        self.token = ""

    def get(self, path: str, **given: Any) -> TestResponse:
        """Ask for a page."""
        answer = self.client.get(path, buffered=True, **given)
        if (answer.content_type or "").startswith("text/html") and (found := TOKEN.search(answer.text)):
            self.token = found.group(1)
        return answer

    def post(self, path: str, data: dict[str, Any] | None = None, **given: Any) -> TestResponse:
        """Send a form with the token of the last page."""
        if not self.token:
            self.get("/")
        return self.client.post(path, data={"token": self.token, **(data or {})}, **given)

    def upload(self, file: Path) -> str:
        """Bring a list; give the address of the plan's pages."""
        with file.open("rb") as opened:
            answer = self.post("/plans", {"file": (opened, file.name)})
        assert answer.status_code == 303, answer.text
        return answer.headers["Location"].removesuffix("/list")

    def sample(self) -> str:
        """Plan the sample line; give the address of the plan's pages."""
        answer = self.post("/plans/sample")
        assert answer.status_code == 303, answer.text
        return answer.headers["Location"].removesuffix("/cants")


CURVES = """\
Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in (m),Transition out (m),Cant,Speed
Aldmere,1,A1,1.200,1.480,800,L,80,80,60,110
Aldmere,1,A2,3.100,3.420,600,R,80,80,100,100
Aldmere,1,A3,5.000,5.350,1200,L,60,60,40,120
"""

TRAINS: dict[str, str] = {
    "rows": "2",
    "units": "metric",
    "0-name": "Express",
    "0-category": "passenger",
    "0-speed_kmh": "140",
    "0-trains_per_day": "20",
    "0-mass_t": "400",
    "0-regular": "yes",
    "1-name": "Goods",
    "1-category": "Freight",
    "1-speed_kmh": "80",
    "1-trains_per_day": "30",
    "1-mass_t": "1500,5",
    "1-regular": "yes",
}
"""A traffic form as a person fills it in, one number with a decimal comma."""


@contextlib.contextmanager
def served(app: Flask, threads: int = 4) -> Iterator[str]:
    """Run a service in this process on a port of its own; give its address."""
    server: Any = create_server(app, host="127.0.0.1", port=0, threads=threads)
    closing = threading.Event()

    def run() -> None:
        try:
            server.run()
        except OSError:
            if not closing.is_set():  # closed under its own eyes
                raise

    thread = threading.Thread(target=run, daemon=True)
    thread.start()
    yield f"http://127.0.0.1:{server.effective_port}"
    closing.set()
    server.close()
    thread.join(timeout=10)


class FormFields(HTMLParser):
    """Fields of one form of a page, as a browser sends them (``sent``); action "" is the page itself."""

    def __init__(self, page: str, action: str) -> None:
        super().__init__()
        self.sent: dict[str, str] = {}
        self._action, self._inside, self._select, self._chosen = action, False, "", False
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Take a field."""
        given = {key: value or "" for key, value in attrs}
        if tag == "form":
            action = given.get("action", "")
            self._inside = action.endswith(self._action) if self._action else not action
        if not self._inside:
            return
        if tag == "input" and given.get("name"):
            if given.get("type") not in ("checkbox", "radio", "file") or "checked" in given:
                self.sent[given["name"]] = given.get("value", "")
        elif tag == "select":
            self._select, self._chosen = given["name"], False
        elif tag == "option" and self._select and ("selected" in given or not self._chosen):
            if self._select not in self.sent or "selected" in given:
                self.sent[self._select] = given.get("value", "")
            self._chosen = self._chosen or "selected" in given

    def handle_endtag(self, tag: str) -> None:
        """Leave a field."""
        if tag == "select":
            self._select = ""
        elif tag == "form":
            self._inside = False
