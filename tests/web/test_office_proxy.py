"""The proxy before the service that signs people in: whom it names is believed from it alone."""

from __future__ import annotations

import re
import socket
from collections.abc import Callable
from typing import Any

import pytest
from flask import Flask
from people_tools import (
    database_of,
    people_of,
    row_of,
)
from sqlalchemy import select
from web_tools import Browser, served

from webapp.keeping.records import AccountRow, PlanRow
from webapp.people.settings import SignIn

Start = Callable[..., Flask]
PROXY = SignIn(header="X-Remote-User")


def by_proxy(app: Flask, name: str, path: str = "/account", **given: Any) -> Any:
    """Ask as the proxy does for somebody."""
    return app.test_client().get(path, headers={"X-Remote-User": name}, **given)


def from_address(address: str) -> dict[str, Any]:
    """Let a request come from an address."""
    return {"environ_overrides": {"REMOTE_ADDR": address}}


def test_proxy_names_who_has_signed_in(start: Start, database_url: str) -> None:
    office = start(database_url, sign_in=PROXY)
    browser = Browser(office)
    browser.client.environ_base["HTTP_X_REMOTE_USER"] = "anna@example.org"
    page = browser.get("/account").text
    assert "anna@example.org" in page
    assert "Sign out" not in page
    plan = browser.sample()
    assert by_proxy(office, "anna@example.org", f"{plan}/cants").status_code == 200
    assert by_proxy(office, "bert", f"{plan}/cants").status_code == 404
    assert by_proxy(office, "Anna@example.org", f"{plan}/cants").status_code == 404
    account = people_of(office).accounts.named("anna@example.org")
    assert account.roles == {"prepare"}
    assert account.password_hash == ""
    with database_of(office).sessions() as session:
        assert session.scalars(select(PlanRow.owner)).all() == [account.who]
    assert by_proxy(office, "anna@example.org", "/api/v1/plans").json["plans"]
    for page in ("/sign-in", "/account/password", "/account/keys"):
        assert by_proxy(office, "bert", page).status_code == 404, page
    people_of(office).accounts.change(account.id, disabled=True)
    assert by_proxy(office, "anna@example.org").status_code == 403


def test_plan_is_signed_off_by_who_the_proxy_names(start: Start, database_url: str) -> None:
    office = start(database_url, sign_in=PROXY)
    crew = {}
    for name, role in (("anna", "prepare"), ("bo", "check")):
        crew[name] = Browser(office)
        crew[name].client.environ_base["HTTP_X_REMOTE_USER"] = name
        crew[name].get("/")
        people_of(office).accounts.change(row_of(office, name).id, roles=[role])
    plan = crew["anna"].sample()
    digest = re.search(r'name="digest" value="(\w{64})"', crew["anna"].get(f"{plan}/sign-off").text).group(1)
    sent = {"digest": digest, "to": str(row_of(office, "bo").id)}
    assert crew["anna"].post(f"{plan}/sign-off", sent).status_code == 303
    assert "For you to check" in crew["bo"].get("/").text
    assert crew["bo"].post(f"{plan}/sign-off", {"digest": digest}).status_code == 303


@pytest.mark.parametrize("address", ["10.0.0.9", "192.168.1.1", "::2", "::ffff:10.0.0.9", "", "x"])
def test_nobody_but_the_proxy_is_believed(start: Start, address: str) -> None:
    house = start(sign_in=PROXY)
    made_before = by_proxy(house, "anna")
    assert made_before.status_code == 200
    assert by_proxy(house, "anna", **from_address(address)).status_code == 403
    pretended = {"X-Remote-User": "anna", "X-Forwarded-For": "127.0.0.1", "Forwarded": "for=127.0.0.1"}
    answer = house.test_client().get("/account", headers=pretended, **from_address(address))
    assert answer.status_code == 403
    assert house.test_client().get("/healthz", **from_address(address)).status_code == 200


@pytest.mark.parametrize("address", ["127.0.0.1", "::1", "::ffff:127.0.0.1"])
def test_proxy_on_this_machine_is_believed_where_none_is_named(start: Start, address: str) -> None:
    assert by_proxy(start(sign_in=PROXY), "anna", **from_address(address)).status_code == 200


def test_named_proxies_alone_are_believed(start: Start) -> None:
    """Also where they say from where the request came to them."""
    house = start(sign_in=PROXY, proxies=("10.0.0.0/24",))
    assert by_proxy(house, "anna", **from_address("127.0.0.1")).status_code == 403
    assert by_proxy(house, "anna", **from_address("10.0.0.7")).status_code == 200
    forwarded = {"X-Remote-User": "anna", "X-Forwarded-For": "203.0.113.5"}
    answer = house.test_client().get("/account", headers=forwarded, **from_address("10.0.0.7"))
    assert answer.status_code == 200


@pytest.mark.parametrize(
    "path", ["/", "/account", "/api/v1/plans", "/help/", "/static/style.css", "/nothing"]
)
def test_request_without_the_header_is_refused(start: Start, path: str) -> None:
    house = start(sign_in=PROXY)
    assert house.test_client().get(path).status_code == 401
    assert by_proxy(house, "", path).status_code == 401
    assert by_proxy(house, "  ", path).status_code == 401


@pytest.mark.parametrize(
    "name",
    [
        "anna, bert", "anna bert", "anna\tb", "<script>", "=cmd", "-x", "a" * 65, "anna\x00", "a;b", "a/b",
        "\xff\xfe", "{{7*7}}", "a%0d%0ab", "'; DROP TABLE accounts",
    ],
)  # fmt: skip
def test_name_that_is_odd_is_refused(start: Start, name: str) -> None:
    house = start(sign_in=PROXY)
    assert by_proxy(house, name).status_code == 403
    with database_of(house).sessions() as session:
        assert session.scalars(select(AccountRow)).all() == []


def test_name_in_utf8_is_read(start: Start) -> None:
    house = start(sign_in=PROXY)
    answer = by_proxy(house, "jürgen".encode().decode("latin-1"))
    assert "jürgen" in answer.text


def test_header_sent_twice_or_with_an_underscore_is_not_believed(start: Start) -> None:
    """On the wire, through the server that the service runs."""
    house = start(sign_in=PROXY)

    def status(*headers: str) -> int:
        lines = ["GET /account HTTP/1.1", f"Host: 127.0.0.1:{port}", "Connection: close"]
        with socket.create_connection(("127.0.0.1", port), timeout=10) as wire:
            wire.sendall("\r\n".join([*lines, *headers, "", ""]).encode())
            answer = b""
            while piece := wire.recv(65536):
                answer += piece
        return int(answer.split()[1])

    with served(house, threads=2) as address:
        port = int(address.rsplit(":", 1)[1])
        assert status("X-Remote-User: anna") == 200
        assert status("x-remote-user: anna", "X-Remote-User: bert") == 403
        assert status("X_Remote_User: anna") == 401
        assert status("X-Remote-User: anna", "X_Remote_User: root") == 200
        assert people_of(house).accounts.named("root") is None
        assert people_of(house).accounts.named("bert") is None


def test_form_for_somebody_the_proxy_names_needs_its_token(start: Start) -> None:
    house = start(sign_in=PROXY)
    browser = Browser(house)
    browser.client.environ_base["HTTP_X_REMOTE_USER"] = "anna"
    browser.get("/")
    assert browser.client.post("/plans/sample").status_code == 403
    other = Browser(house)
    other.client.environ_base["HTTP_X_REMOTE_USER"] = "bert"
    other.get("/")
    assert browser.client.post("/plans/sample", data={"token": other.token}).status_code == 403
    headers = {"Origin": "https://elsewhere.example"}
    assert browser.client.put("/api/v1/plans/x/settings", json={}, headers=headers).status_code == 403
