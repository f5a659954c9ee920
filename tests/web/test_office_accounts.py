"""Keys for programs, plans made before, the operator's command, the log of events."""

from __future__ import annotations

import io
import logging
import re
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from flask import Flask
from people_tools import (
    OTHER_PASSWORD,
    PASSWORD,
    database_of,
    is_signed_in,
    made,
    people_of,
    row_of,
    signed_in,
    try_to_sign_in,
)
from sqlalchemy import select, update
from web_tools import CURVES, Browser

from cant.cli import main
from webapp.keeping.records import KeptLimitsRow, SignInRow
from webapp.people.settings import SignIn

Start = Callable[..., Flask]
ACCOUNTS = SignIn(accounts=True)


# Keys for programs


def bearer(key: str) -> dict[str, str]:
    """Give the header that sends a key."""
    return {"Authorization": f"Bearer {key}"}


def new_key(browser: Browser, **sent: str) -> str:
    """Make a key on the page."""
    form = {"label": "nightly <b>run</b>", "days": "90", "password": PASSWORD, **sent}
    answer = browser.post("/account/keys", form)
    assert answer.status_code == 200, answer.text
    assert "<b>run" not in answer.text
    found = re.search(r"<code>(cant-[\w-]{43})</code>", answer.text)
    assert found is not None
    return found.group(1)


def upload(app: Flask, **given: Any) -> Any:
    """Make a plan by the JSON interface."""
    return app.test_client().post(
        "/api/v1/plans", data={"file": (io.BytesIO(CURVES.encode()), "x.csv")}, **given
    )


def test_key_works_with_the_plans_of_its_account_until_it_is_withdrawn(office: Flask) -> None:
    made(office, "bert")
    anna, bert = signed_in(office, "anna"), signed_in(office, "bert")
    plan, key, other = anna.sample(), new_key(anna), new_key(bert)
    api = office.test_client()
    assert [p["address"] for p in api.get("/api/v1/plans", headers=bearer(key)).json["plans"]] == [plan[7:]]
    assert api.get(f"/api/v1{plan}", headers=bearer(other)).status_code == 404
    made_by_key = upload(office, headers=bearer(key))
    assert made_by_key.status_code == 201
    assert made_by_key.json["key"] is None
    assert made_by_key.json["address"] in anna.get("/").text
    with database_of(office).sessions() as session:
        kept = session.scalars(select(SignInRow.secret_digest)).all()
    assert key not in kept
    assert key not in anna.get("/account/keys").text
    number = re.search(r"/account/keys/(\d+)/end", anna.get("/account/keys").text).group(1)
    for strange in (number, "9" * 12, "9" * 40, "-1"):
        assert bert.post(f"/account/keys/{strange}/end").status_code == 404
    assert api.get("/api/v1/plans", headers=bearer(key)).status_code == 200
    assert anna.post(f"/account/keys/{number}/end").status_code == 303
    assert api.get("/api/v1/plans", headers=bearer(key)).status_code == 401


def test_without_a_key_programs_get_nothing(start: Start, database_url: str) -> None:
    """Nor with a key of the time before people signed in."""
    before = start(database_url)
    old = upload(before).json
    office = start(database_url, sign_in=ACCOUNTS)
    assert upload(office).status_code == 401
    for key in (old["key"], "cant-" + "A" * 43, "", "x" * 10_000):
        assert upload(office, headers=bearer(key)).status_code == 401
        answer = office.test_client().get(f"/api/v1/plans/{old['address']}", headers=bearer(key))
        assert answer.status_code == 401
    basic = {"Authorization": "Basic YW5uYTp4"}
    assert office.test_client().get("/api/v1/plans", headers=basic).status_code == 401


def test_key_opens_no_page_and_no_cookie_secret_is_a_key(office: Flask) -> None:
    browser = signed_in(office, "anna")
    key = new_key(browser)
    for page in ("/", "/account", "/account/keys"):
        assert office.test_client().get(page, headers=bearer(key)).status_code == 401, page
    with browser.client.session_transaction() as session:
        secret = session["_user_id"]
    assert office.test_client().get("/api/v1/plans", headers=bearer(secret)).status_code == 401
    thief = Browser(office)
    with thief.client.session_transaction() as session:
        session["_user_id"] = key
    assert not is_signed_in(thief)


def test_key_expires_is_not_idle_and_ends_with_its_account(office: Flask) -> None:
    key = new_key(signed_in(office, "anna"), days="30")
    api = office.test_client()
    with database_of(office).sessions.begin() as session:
        session.execute(update(SignInRow).values(seen=datetime.now(UTC) - timedelta(days=20)))
    assert api.get("/api/v1/plans", headers=bearer(key)).status_code == 200
    with database_of(office).sessions() as session:
        row = session.scalars(select(SignInRow).where(SignInRow.is_key)).one()
    assert row.expires - row.made == timedelta(days=30)
    people_of(office).accounts.change(row_of(office, "anna").id, disabled=True)
    assert api.get("/api/v1/plans", headers=bearer(key)).status_code == 401


@pytest.mark.parametrize(
    "sent", [{"password": "x"}, {"days": "36500"}, {"days": "-1"}, {"label": ""}, {"label": "a\x07b"}]
)
def test_key_is_not_made_of_what_is_wrong(house: Flask, sent: dict[str, str]) -> None:
    browser = signed_in(house, "anna")
    form = {"label": "x", "days": "90", "password": PASSWORD, **sent}
    assert browser.post("/account/keys", form).status_code == 422
    assert "None." in browser.get("/account/keys").text


# What a browser made before


def test_plans_made_before_are_taken_over_if_their_maker_says_so(start: Start, database_url: str) -> None:
    before = Browser(start(database_url))
    before.post("/units", {"units": "us", "back": "/"})
    plans = [before.sample() for _ in range(2)]
    cookie = before.client.get_cookie("cant")
    office = start(database_url, sign_in=ACCOUNTS)
    made(office, "anna")
    made(office, "bert")
    browser = Browser(office)
    browser.client.set_cookie("cant", cookie.value)
    assert browser.get(f"{plans[0]}/cants").status_code == 303
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 303
    start_page = browser.get("/").text
    assert "2 plans made in this browser before you signed in" in start_page
    assert 'value="us" aria-pressed="true"' in start_page
    assert browser.get(f"{plans[0]}/cants").status_code == 404
    assert browser.post("/sign-out").headers["Clear-Site-Data"] == '"cache", "storage"'
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 303
    assert "2 plans made" in browser.get("/").text  # offered until it is answered
    assert browser.post("/account/take-over", {"choice": "take"}).status_code == 303
    assert browser.get(f"{plans[0]}/cants").status_code == 200
    assert "before you signed in" not in browser.get("/").text
    assert signed_in(office, "anna").get(f"{plans[1]}/cants").status_code == 200
    again = Browser(office)
    again.client.set_cookie("cant", cookie.value)
    assert try_to_sign_in(again, "bert", PASSWORD).status_code == 303
    assert "before you signed in" not in again.get("/").text


def test_plans_that_are_left_are_nobodys(start: Start, database_url: str) -> None:
    before = Browser(start(database_url))
    plan = before.sample()
    cookie = before.client.get_cookie("cant")
    office = start(database_url, sign_in=ACCOUNTS)
    made(office, "anna")
    browser = Browser(office)
    browser.client.set_cookie("cant", cookie.value)
    try_to_sign_in(browser, "anna", PASSWORD)
    browser.get("/")
    assert browser.post("/account/take-over", {"choice": "leave"}).status_code == 303
    assert "before you signed in" not in browser.get("/").text
    assert browser.get(f"{plan}/cants").status_code == 404
    assert browser.post("/account/take-over", {"choice": "take"}).status_code == 303
    assert browser.get(f"{plan}/cants").status_code == 404


def test_kept_limits_are_taken_over_and_overwrite_none(start: Start, database_url: str) -> None:
    office = start(database_url, sign_in=ACCOUNTS)
    now = datetime.now(UTC)
    with database_of(office).sessions.begin() as session:
        for owner, name, content in (("b", "mine", "1"), ("b", "other", "2"), ("account:1", "mine", "3")):
            session.add(KeptLimitsRow(owner=owner, name=name, content=content, changed=now, expires=now))
    people_of(office).sign_ins.take_over("b", "account:1")
    with database_of(office).sessions() as session:
        rows = session.scalars(select(KeptLimitsRow).order_by(KeptLimitsRow.content)).all()
    assert [(row.owner, row.name) for row in rows] == [
        ("b", "mine"),
        ("account:1", "other"),
        ("account:1", "mine"),
    ]


# What the log tells


def test_events_are_told_without_secrets_and_in_one_line_each(
    house: Flask, caplog: pytest.LogCaptureFixture
) -> None:
    """V16.2.5, V16.3.1, V16.3.2, V16.4.1."""
    with caplog.at_level(logging.INFO, logger="webapp.security"):
        browser = Browser(house)
        try_to_sign_in(browser, "anna", "wrong secret here")
        try_to_sign_in(browser, "my-password-typed-as-a-name\nsign-in ok", "x")
        try_to_sign_in(browser, "anna", PASSWORD)
        browser.get("/")
        plan = browser.sample()
        key = new_key(browser)
        browser.post(f"{plan}/sign-off", {"password": PASSWORD})
        people_of(house).accounts.change(row_of(house, "anna").id, roles=[])
        browser.post(f"{plan}/sign-off", {"password": PASSWORD})
        new = {"password": PASSWORD, "new": OTHER_PASSWORD, "again": OTHER_PASSWORD}
        browser.post("/account/password", new)
        browser.get("/")
        browser.post("/sign-out")
    lines = [record.getMessage() for record in caplog.records if record.name == "webapp.security"]
    events = [line.split(" account")[0].split(" from")[0] for line in lines]
    assert events == [
        "sign-in failed",
        "sign-in failed",
        "sign-in ok",
        "key made",
        "refused",
        "password changed",
        "sign-out",
    ]
    text = "\n".join(lines)
    assert len(text.splitlines()) == len(lines)
    assert 'account="anna"' in lines[0]
    assert "account" not in lines[1]
    for secret in (PASSWORD, OTHER_PASSWORD, key, "wrong secret", "my-password"):
        assert secret not in text


# The operator's command


@pytest.fixture
def operator(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., tuple[int, str, str]]:
    """Give a function that runs ``cant accounts``: exit status, standard output, standard error."""
    monkeypatch.setenv("CANT_DATA", str(tmp_path / "data"))
    monkeypatch.setenv("CANT_SIGN_IN", "accounts")

    def run(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as ended:
            main(["accounts", *arguments])
        said = capsys.readouterr()
        return int(ended.value.code or 0), said.out, said.err

    return run


def test_operator_makes_changes_and_resets_accounts(
    start: Start, operator: Callable[..., tuple[int, str, str]]
) -> None:
    house = start(sign_in=ACCOUNTS)
    code, out, _ = operator("add", "Anna.Holt", "--full-name", " Anna  Holt ", "--roles", "prepare, check")
    assert code == 0
    password = re.search(r"^  ([a-z0-9-]{19})$", out, flags=re.MULTILINE).group(1)
    account = people_of(house).accounts.named("anna.holt")
    assert (account.full_name, account.roles) == ("Anna Holt", {"prepare", "check"})
    assert account.password_expires - datetime.now(UTC) < timedelta(hours=24)
    assert try_to_sign_in(Browser(house), "anna.holt", password).status_code == 303
    assert operator("roles", "anna.holt", "approve")[0] == 0
    assert people_of(house).accounts.named("anna.holt").roles == {"approve"}
    browser = signed_in(house, "anna.holt", password)
    assert operator("disable", "ANNA.HOLT")[0] == 0
    assert browser.get("/account/password").status_code == 303
    assert "disabled" in operator("list")[1]
    assert operator("enable", "anna.holt")[0] == 0
    people_of(house).accounts.set_second_factor(account.id, "A" * 32)
    code, out, _ = operator("reset", "anna.holt")
    fresh = re.search(r"^  ([a-z0-9-]{19})$", out, flags=re.MULTILINE).group(1)
    assert fresh != password
    assert row_of(house, "anna.holt").second_factor == ""
    assert try_to_sign_in(Browser(house), "anna.holt", password).status_code == 401
    browser = signed_in(house, "anna.holt", fresh)
    assert operator("sign-out", "everybody")[1].startswith("1 sign-in")
    assert browser.get("/account/password").headers["Location"] == "/sign-in"


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("add", "x y"), "name of an account"),
        (("add", "=cmd"), "name of an account"),
        (("add", "everybody"), "stands for all"),
        (("add", "bo", "--roles", "king"), "no role"),
        (("add", "bo", "--full-name", "a\nb\x07"), "printable"),
        (("roles", "nobody", "check"), "no account"),
        (("reset", "nobody"), "no account"),
        (("fly",), "No such command"),
    ],
)
def test_operator_is_told_what_is_wrong_in_one_line(
    operator: Callable[..., tuple[int, str, str]], arguments: tuple[str, ...], said: str
) -> None:
    code, out, err = operator(*arguments)
    assert code == 2
    assert out == ""
    assert said in err
    assert len(err.strip().splitlines()) == 1


def test_account_is_not_made_twice(operator: Callable[..., tuple[int, str, str]]) -> None:
    assert operator("add", "bo")[0] == 0
    code, out, err = operator("add", "BO")
    assert (code, out) == (2, "")
    assert "there is an account 'bo' already" in err
