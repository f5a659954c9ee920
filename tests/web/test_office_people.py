"""Signing in: who comes in, what a password must be, what ends a sign-in, and what nobody learns by trying.

The rules are those of OWASP ASVS 5.0, level 2, chapters V6 (authentication) and V7 (session management);
the numbers beside the tests are its requirements.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import UTC, datetime, timedelta

import pytest
from flask import Flask
from people_tools import (
    PASSWORD,
    cookie_of,
    database_of,
    is_signed_in,
    made,
    people_of,
    row_of,
    signed_in,
    try_to_sign_in,
)
from sqlalchemy import select, update
from web_tools import TOKEN, Browser

from cant.errors import InputError
from webapp.config import Config
from webapp.keeping.records import PlanRow, SignInRow
from webapp.people.settings import SignIn

Start = Callable[..., Flask]


# Whether people sign in at all


def test_without_the_setting_nobody_signs_in(start: Start) -> None:
    app = start()
    browser = Browser(app)
    assert {"people", "account", "signing"} & set(app.blueprints) == set()
    for address in ("/sign-in", "/account", "/account/keys"):
        assert browser.get(address).status_code == 404
    plan = browser.sample()
    for page in ("/", f"{plan}/cants", f"{plan}/history", f"{plan}/print"):
        text = browser.get(page).text
        assert "Sign out" not in text
        assert "Sign off" not in text
    assert browser.get(f"{plan}/sign-off").status_code == 404


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ({"CANT_SIGN_IN": "accounts", "CANT_SIGN_IN_HEADER": "X-Remote-User"}, "both set"),
        ({"CANT_SIGN_IN": "yes"}, "write accounts"),
        ({"CANT_SECOND_FACTOR": "yes"}, "asks nobody"),
        ({"CANT_SIGN_IN_HEADER": "X Remote"}, "name of a header"),
        ({"CANT_SIGN_IN_HEADER": "X_Remote_User"}, "name of a header"),
        ({"CANT_SIGN_IN": "accounts", "CANT_SIGN_IN_DAYS": "-1"}, "whole number"),
    ],
)
def test_a_setting_that_cannot_be_followed_is_refused(given: dict[str, str], said: str) -> None:
    with pytest.raises(InputError, match=said):
        Config.from_environment(given)


def test_settings_are_taken_from_the_environment() -> None:
    given = {"CANT_SIGN_IN": "accounts", "CANT_SECOND_FACTOR": "yes", "CANT_SIGN_IN_IDLE_HOURS": "2"}
    assert Config.from_environment(given).sign_in == SignIn(True, "", True, 2, 7)
    assert Config.from_environment({}).sign_in.on is False


# The door


def test_nothing_but_the_door_is_open(house: Flask) -> None:
    """V8.3.1: every address that the service has, one that is added later too."""
    open_to_all = {
        "static", "people.sign_in", "start.template", "start.units", "api.description", "api.get_template",
        "health.alive", "health.ready",
    }  # fmt: skip
    asked = 0
    for rule in house.url_map.iter_rules():
        if rule.endpoint in open_to_all or rule.endpoint.startswith("help."):
            continue
        address = re.sub(r"<int[^:>]*:\w+>", "1", rule.rule)
        address = re.sub(r"<[^>]*>", "A" * 32, address)
        for method in (rule.methods or set()) & {"GET", "POST", "PUT", "DELETE", "PATCH"}:
            browser = Browser(house)
            browser.get("/sign-in")
            sent = {"data": {"token": browser.token}} if method == "POST" else {}
            answer = browser.client.open(address, method=method, **sent)
            if rule.endpoint.startswith("api."):
                assert answer.status_code == 401, (method, address)
                assert set(answer.json) == {"error"}
            else:
                assert (answer.status_code, answer.headers["Location"]) == (303, "/sign-in"), (
                    method,
                    address,
                )
            asked += 1
    assert asked > 60


def test_signing_in_leads_to_where_one_wanted_to_go(house: Flask) -> None:
    browser = Browser(house)
    assert browser.get("/account/keys?x=1").headers["Location"] == "/sign-in"
    assert try_to_sign_in(browser, "anna", PASSWORD).headers["Location"] == "/account/keys?x=1"


@pytest.mark.parametrize(
    "away", ["//elsewhere.example/", "/\\elsewhere.example/", "/sign-in?next=//x.example"]
)
def test_signing_in_never_leads_elsewhere(house: Flask, away: str) -> None:
    browser = Browser(house)
    browser.client.get(away, base_url="http://localhost")
    assert re.fullmatch(r"/(?![/\\]).*|/", try_to_sign_in(browser, "anna", PASSWORD).headers["Location"])


def test_form_of_the_door_needs_its_token(house: Flask) -> None:
    """Nobody is signed in as somebody else by a page of another site."""
    browser = Browser(house)
    browser.get("/sign-in")
    answer = browser.client.post("/sign-in", data={"name": "anna", "password": PASSWORD})
    assert answer.status_code == 403
    assert not is_signed_in(browser)


def test_name_is_taken_without_regard_to_capitals_and_blanks(office: Flask) -> None:
    assert is_signed_in(signed_in(office, "  ANNA "))


def test_plans_belong_to_the_account(office: Flask) -> None:
    made(office, "bert")
    anna, bert = signed_in(office, "anna"), signed_in(office, "bert")
    plan = anna.sample()
    with database_of(office).sessions() as session:
        assert session.scalars(select(PlanRow.owner)).all() == [people_of(office).accounts.named("anna").who]
    assert bert.get(f"{plan}/cants").status_code == 404
    assert plan in signed_in(office, "anna").get("/").text
    assert plan not in bert.get("/").text


# Sign-ins


def test_a_cookie_planted_before_is_worth_nothing_after(office: Flask) -> None:
    """V7.2.4: session fixation. The attacker keeps the cookie that the victim signs in with."""
    attacker = Browser(office)
    attacker.get("/sign-in")
    planted = cookie_of(attacker)
    victim = Browser(office)
    victim.client.set_cookie("cant", planted)
    assert try_to_sign_in(victim, "anna", PASSWORD).status_code == 303
    assert is_signed_in(victim)
    assert cookie_of(victim) != planted
    assert not is_signed_in(attacker)
    again = Browser(office)
    again.client.set_cookie("cant", planted)
    assert not is_signed_in(again)


def test_every_sign_in_has_a_secret_of_its_own_kept_as_a_digest(office: Flask) -> None:
    """V7.2.3, V7.2.4: 256 random bits; signing in again ends the one before."""
    browser = signed_in(office, "anna")
    secrets = []
    for _ in range(2):
        with browser.client.session_transaction() as session:
            secrets.append(session["_user_id"])
        browser.client.post("/sign-in", data={"token": token(browser), "name": "anna", "password": PASSWORD})
    assert len(set(secrets)) == 2
    assert all(len(secret) >= 43 for secret in secrets)
    with database_of(office).sessions() as session:
        rows = session.scalars(select(SignInRow)).all()
    assert len(rows) == 1
    assert not {row.secret_digest for row in rows} & set(secrets)


def token(browser: Browser) -> str:
    """Give a fresh token of a form."""
    found = TOKEN.search(browser.get("/").text)
    assert found is not None
    return found.group(1)


def test_signing_out_ends_the_sign_in_at_the_server(office: Flask) -> None:
    """V7.4.1: a copy of the cookie is worth nothing afterwards; V14.3.1: the browser forgets what it had."""
    browser = signed_in(office, "anna")
    copied = cookie_of(browser)
    answer = browser.post("/sign-out")
    assert answer.status_code == 303
    assert answer.headers["Clear-Site-Data"] == '"cache", "cookies", "storage"'
    assert not is_signed_in(browser)
    thief = Browser(office)
    thief.client.set_cookie("cant", copied)
    assert not is_signed_in(thief)
    with database_of(office).sessions() as session:
        assert session.scalars(select(SignInRow)).all() == []


def test_every_page_of_who_is_signed_in_has_sign_out(house: Flask) -> None:
    """V7.4.4."""
    browser = signed_in(house, "anna")
    plan = browser.sample()
    for page in ("/", "/account", "/account/keys", f"{plan}/cants", f"{plan}/sign-off", "/help/"):
        assert 'action="/sign-out"' in browser.get(page).text, page


def test_form_of_a_sign_in_that_ended_is_not_taken_after_the_next(office: Flask) -> None:
    browser = signed_in(office, "anna")
    old = token(browser)
    browser.post("/sign-out")
    try_to_sign_in(browser, "anna", PASSWORD)
    answer = browser.client.post("/plans/sample", data={"token": old})
    assert answer.status_code == 403


@pytest.mark.parametrize(
    "values",
    [
        {"seen": datetime.now(UTC) - timedelta(hours=8, minutes=1)},
        {"expires": datetime.now(UTC) - timedelta(seconds=1)},
    ],
    ids=["idle", "absolute"],
)
def test_sign_in_ends_by_itself(office: Flask, values: dict[str, datetime]) -> None:
    """V7.3.1, V7.3.2."""
    browser = signed_in(office, "anna")
    with database_of(office).sessions.begin() as session:
        session.execute(update(SignInRow).values(**values))
    assert not is_signed_in(browser)


def test_use_keeps_a_sign_in_from_being_idle_but_not_from_its_end(office: Flask) -> None:
    browser = signed_in(office, "anna")
    with database_of(office).sessions.begin() as session:
        session.execute(update(SignInRow).values(seen=datetime.now(UTC) - timedelta(hours=7)))
    assert is_signed_in(browser)
    with database_of(office).sessions() as session:
        row = session.scalars(select(SignInRow)).one()
    assert datetime.now(UTC) - row.seen < timedelta(minutes=1)
    assert row.expires - row.made == timedelta(days=7)


def test_disabled_account_is_out_at_once_and_stays_out(office: Flask) -> None:
    """V7.4.2."""
    browser = signed_in(office, "anna")
    people = people_of(office)
    people.accounts.change(row_of(office, "anna").id, disabled=True)
    assert not is_signed_in(browser)
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 401
    people.accounts.change(row_of(office, "anna").id, disabled=False)
    assert not is_signed_in(browser)
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 303


def test_own_sign_ins_are_shown_and_ended_with_the_password(office: Flask) -> None:
    """V7.5.2; and nobody ends those of somebody else by their numbers."""
    made(office, "bert")
    here, there, third, bert = (signed_in(office, name) for name in ("anna", "anna", "anna", "bert"))
    page = here.get("/account/signed-in").text
    others = re.findall(r'name="which" value="(\d+)"', page)
    assert len(others) == 2
    assert here.post("/account/signed-in/end", {"which": others[0], "password": "wrong"}).status_code == 422
    assert bert.post("/account/signed-in/end", {"which": others[0], "password": PASSWORD}).status_code == 303
    assert is_signed_in(there)
    assert is_signed_in(third)
    assert here.post("/account/signed-in/end", {"which": others[0], "password": PASSWORD}).status_code == 303
    assert [is_signed_in(one) for one in (here, there, third)].count(True) == 2
    assert here.post("/account/signed-in/end", {"which": "others", "password": PASSWORD}).status_code == 303
    assert [is_signed_in(one) for one in (here, there, third, bert)] == [True, False, False, True]
