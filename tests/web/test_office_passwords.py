"""Passwords and second factors: what they must be, what failing tells and costs, what a change ends.

The rules are those of OWASP ASVS 5.0, level 2, chapter V6 (authentication); the numbers are its requirements.
"""

from __future__ import annotations

import contextlib
import re
import sqlite3
import threading
import unicodedata
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from typing import Any

import pytest
from flask import Flask
from people_tools import (
    HASHES,
    OTHER_PASSWORD,
    PASSWORD,
    code_at,
    cookie_of,
    database_of,
    is_signed_in,
    made,
    people_of,
    row_of,
    set_account,
    signed_in,
    try_to_sign_in,
)
from web_tools import TOKEN, Browser
from zxcvbn.frequency_lists import FREQUENCY_LISTS

from cant.errors import InputError
from webapp.keeping.accounts import FREE_TRIES, LONGEST_WAIT, wait_after
from webapp.people import passwords, second_factor
from webapp.people.settings import SignIn

Start = Callable[..., Flask]


# Passwords


@pytest.mark.parametrize(
    "password",
    [
        "short words", "x" * 129, "passwordpassword", "123456789012", "qwertyuiopas", "P@ssw0rd1234",
        "aaaaaaaaaaaaaaaa", "abcdefghijkl", "anna.holt 1234", "Anna Holt 2026!", "cant curve rail",
        "cantcantcant", "Railway-Track-1", "superelevation1", "iloveyouforever", "letmein letmein",
        "HoltAnnaHolt!!",
    ],
)  # fmt: skip
def test_password_that_is_guessed_is_refused(password: str) -> None:
    """V6.2.1, V6.2.4, V6.2.11, V6.2.12."""
    with pytest.raises(InputError):
        passwords.check(password, ("anna", "Anna Holt"))


def test_no_password_of_the_lists_that_leaked_is_taken() -> None:
    """V6.2.4, V6.2.12: those long enough of the 30,000 most used that zxcvbn has from public leaks."""
    listed = [word for word in FREQUENCY_LISTS["passwords"] if len(word) >= passwords.SHORTEST]
    assert len(listed) > 200
    for word in (*listed, *(a + b for a in ("monkey", "dragon", "qwerty") for b in ("shadow", "123456"))):
        with pytest.raises(InputError):
            passwords.check(word)


@pytest.mark.parametrize(
    "password",
    [
        PASSWORD, "only lower case letters here", "тёплый чайник у окна", "🐎 lantern 🪁 gravel 🫖 oboe",
        " blanks at both ends count ", "x7Jm!p0Rt_w9Qz-c4Vb", "tab\tand\nnew line twelve",
        "<script>'\"&; DROP plum",
        ("lantern gravel oboe kettle " * 5)[:128].strip(),
    ],
)  # fmt: skip
def test_any_characters_make_a_password(password: str) -> None:
    """V6.2.5, V6.2.8, V6.2.9: no rule on kinds of characters, nothing cut off, 64 and more."""
    passwords.check(password, ("anna", "Anna Holt"))
    kept = passwords.hashed(password)
    assert passwords.matches(kept, password)
    assert not passwords.matches(kept, password.swapcase() if password.swapcase() != password else "x")
    assert not passwords.matches(kept, password[:-1])
    assert not passwords.matches(kept, password.strip() + "x")


def test_password_is_the_same_however_its_letters_are_composed() -> None:
    one = "zwölf müde Gärtner"
    other = unicodedata.normalize("NFD", one)
    assert other != one
    assert passwords.matches(passwords.hashed(other), one)


def test_hash_is_argon2id_with_the_recommended_cost() -> None:
    """OWASP Password Storage Cheat Sheet: 19 MiB, 2 passes, 1 lane at the least."""
    assert HASHES[PASSWORD].startswith("$argon2id$v=19$m=19456,t=2,p=1$")
    assert HASHES[PASSWORD] != passwords.hashed(PASSWORD)


def test_change_takes_the_old_password_and_ends_everything_else(office: Flask) -> None:
    """V6.2.2, V6.2.3, V7.4.3."""
    here, there = signed_in(office, "anna"), signed_in(office, "anna")
    key = people_of(office).new_key(people_of(office).accounts.named("anna"), "x", 30)
    before = cookie_of(here)
    new = {"new": OTHER_PASSWORD, "again": OTHER_PASSWORD}
    assert here.post("/account/password", {"password": "not it", **new}).status_code == 422
    assert here.post("/account/password", {"password": PASSWORD, **new, "again": "x"}).status_code == 422
    same = {"password": PASSWORD, "new": PASSWORD, "again": PASSWORD}
    assert here.post("/account/password", same).status_code == 422
    weak = {"password": PASSWORD, "new": "passwordpassword", "again": "passwordpassword"}
    assert here.post("/account/password", weak).status_code == 422
    assert here.post("/account/password", {"password": PASSWORD, **new}).status_code == 303
    assert is_signed_in(here)
    assert not is_signed_in(there)
    assert cookie_of(here) != before
    assert people_of(office).sign_ins.find(key, is_key=True) is None
    assert try_to_sign_in(there, "anna", PASSWORD).status_code == 401
    assert try_to_sign_in(there, "anna", OTHER_PASSWORD).status_code == 303


def test_password_fields_let_programs_and_the_clipboard_in(house: Flask) -> None:
    """V6.2.6, V6.2.7."""
    door = Browser(house).get("/sign-in").text
    change = signed_in(house, "anna").get("/account/password").text
    for text, kinds in ((door, ["current-password"]), (change, ["current-password", "new-password"])):
        for field in re.findall(r'<input type="password"[^>]*>', text):
            assert any(f'autocomplete="{kind}"' in field for kind in kinds)
            assert "maxlength" not in field
    assert 'autocomplete="username"' in door
    assert 'autocomplete="one-time-code"' in door


@pytest.fixture
def newcomer(office: Flask) -> str:
    """Give the password for a single use of a new account ``bert``."""
    password = passwords.single_use()
    soon = datetime.now(UTC) + timedelta(hours=passwords.SINGLE_USE_HOURS)
    people_of(office).accounts.add("bert", "", ("prepare",), passwords.hashed(password), soon)
    return password


def test_single_use_password_opens_nothing_but_its_change(office: Flask, newcomer: str) -> None:
    """V6.4.1."""
    assert len({passwords.single_use() for _ in range(50)}) == 50
    browser = Browser(office)
    assert try_to_sign_in(browser, "bert", newcomer).status_code == 303
    for page in ("/", "/account", "/account/keys", "/account/second-factor", "/plans/x/cants"):
        assert browser.get(page).headers["Location"] == "/account/password", page
    assert browser.get("/account/password").status_code == 200
    assert browser.client.get("/api/v1/plans").status_code == 403
    assert browser.post("/plans/sample").headers["Location"] == "/account/password"
    new = {"password": newcomer, "new": OTHER_PASSWORD, "again": OTHER_PASSWORD}
    assert browser.post("/account/password", new).status_code == 303
    assert browser.get("/").status_code == 200
    assert try_to_sign_in(Browser(office), "bert", newcomer).status_code == 401


def test_single_use_password_expires(office: Flask, newcomer: str) -> None:
    set_account(office, "bert", password_expires=datetime.now(UTC) - timedelta(seconds=1))
    answer = try_to_sign_in(Browser(office), "bert", newcomer)
    assert answer.status_code == 401
    assert without_token(answer.text) == without_token(try_to_sign_in(Browser(office), "bert", "x").text)


# Guessing


def without_token(text: str) -> str:
    """Give a page without what differs every time."""
    return TOKEN.sub("", text)


class Counted:
    """A hasher that counts what it verifies."""

    def __init__(self, inner: Any) -> None:
        self.inner, self.count = inner, 0

    def verify(self, kept: str, given: str) -> bool:
        """Verify, and count it."""
        self.count += 1
        return bool(self.inner.verify(kept, given))

    def __getattr__(self, name: str) -> Any:
        return getattr(self.inner, name)


@pytest.fixture
def counted(monkeypatch: pytest.MonkeyPatch) -> Counted:
    """Count the verifications of a hash."""
    counting = Counted(passwords._HASHER)
    monkeypatch.setattr(passwords, "_HASHER", counting)
    return counting


def test_failing_takes_the_same_work_and_says_the_same(office: Flask, counted: Counted) -> None:
    """V6.3.8: whether a name exists is not told, neither by words nor by work. Counted, not timed."""
    people = people_of(office)
    for name in ("disabled", "waiting", "factor", "expired", "proxied"):
        made(office, name)
    set_account(office, "disabled", disabled=True)
    set_account(office, "waiting", locked_until=datetime.now(UTC) + timedelta(seconds=30), failed=9)
    set_account(office, "factor", second_factor=second_factor.new_secret())
    set_account(office, "expired", password_expires=datetime.now(UTC), must_change=True)
    set_account(office, "proxied", password_hash="")
    tries = {"anna": "wrong", "nobody": PASSWORD, "": "", "x" * 5000: "y" * 5000}
    tries |= dict.fromkeys(("disabled", "waiting", "factor", "expired", "proxied"), PASSWORD)
    answers, browser = set(), Browser(office)
    for name, password in tries.items():
        counted.count = 0
        answer = try_to_sign_in(browser, name, password)
        assert counted.count == 1, name
        assert answer.status_code == 401
        answers.add(re.sub(r'name="name" value="[^"]*"', "", without_token(answer.text)))
    assert len(answers) == 1
    assert people.accounts.named("nobody") is None


def test_a_try_is_written_down_whether_the_name_exists_or_not(house: Flask) -> None:
    """V6.3.8: waiting for the disk is what takes long, and would tell which names are accounts."""
    made(house, "waiting")
    set_account(house, "waiting", locked_until=datetime.now(UTC) + timedelta(seconds=30), failed=9)
    accounts, file = people_of(house).accounts, database_of(house).file
    assert file is not None
    with contextlib.closing(sqlite3.connect(file)) as watching:

        def version() -> int:
            return int(watching.execute("PRAGMA data_version").fetchone()[0])

        for name in ("anna", "waiting", "nobody", ""):
            before = version()
            assert (accounts.count_try(name) is None) is (name != "anna")
            assert version() != before, name


def test_tries_slow_down_and_never_lock_for_good(office: Flask) -> None:
    """V6.3.1: after five failures each try has to wait, longer every time, a minute at most."""
    browser = Browser(office)
    for _ in range(FREE_TRIES):
        assert try_to_sign_in(browser, "anna", "wrong").status_code == 401
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 401
    row = row_of(office, "anna")
    assert row.failed == FREE_TRIES
    assert row.locked_until is not None
    waits = row.locked_until
    try_to_sign_in(browser, "anna", "wrong")
    assert row_of(office, "anna").locked_until == waits  # who keeps trying does not keep others out
    set_account(office, "anna", locked_until=datetime.now(UTC) - timedelta(seconds=1))
    assert try_to_sign_in(browser, "anna", PASSWORD).status_code == 303
    assert row_of(office, "anna").failed == 0
    assert [wait_after(n) for n in (0, 4, 5, 6, 7, 8, 9, 10_000)] == [0, 0, 5, 10, 20, 40, 60, LONGEST_WAIT]


def test_failures_are_forgiven_after_a_day(office: Flask) -> None:
    set_account(office, "anna", failed=40, locked_until=datetime.now(UTC) - timedelta(days=1, minutes=1))
    try_to_sign_in(Browser(office), "anna", "wrong")
    assert row_of(office, "anna").failed == 1


def test_tries_at_the_same_moment_are_all_counted(office: Flask) -> None:
    people, let_in = people_of(office), []

    def guess() -> None:
        let_in.append(people.accounts.count_try("anna") is not None)

    threads = [threading.Thread(target=guess) for _ in range(12)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert let_in.count(True) == FREE_TRIES
    assert row_of(office, "anna").failed == FREE_TRIES


def test_password_asked_for_again_is_throttled_too(office: Flask) -> None:
    """Who found an open browser does not guess the password there."""
    browser = signed_in(office, "anna")
    for _ in range(FREE_TRIES):
        browser.post("/account/keys", {"label": "x", "days": "90", "password": "wrong"})
    answer = browser.post("/account/keys", {"label": "x", "days": "90", "password": PASSWORD})
    assert answer.status_code == 422
    assert people_of(office).sign_ins.of(people_of(office).accounts.named("anna"), keys=True) == []


# The second factor


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """Give the time of codes; change it to let time pass."""
    now = [1_790_000_010.0]
    monkeypatch.setattr(second_factor.time, "time", lambda: now[0])
    return now


def test_codes_are_those_of_the_published_method() -> None:
    """RFC 6238, appendix B: SHA-1, the last six of the eight digits printed."""
    secret = "GEZDGNBVGY3TQOJQGEZDGNBVGY3TQOJQ"  # noqa: S105 of the RFC
    printed = {59: "94287082", 1111111109: "07081804", 1234567890: "89005924", 2000000000: "69279037"}
    for moment, code in printed.items():
        assert code_at(secret, moment) == code[-6:]


def turn_on(app: Flask, browser: Browser, clock: list[float]) -> str:
    """Turn the second factor on; give its secret."""
    page = browser.get("/account/second-factor").text
    secret = re.search(r"<code>([A-Z2-7 ]+)</code>", page).group(1).replace(" ", "")
    sent = {"password": PASSWORD, "first": code_at(secret, clock[0])}
    answer = browser.post("/account/second-factor", sent)
    assert answer.status_code == 303, answer.text
    assert row_of(app, "anna").second_factor == secret
    return secret


def test_second_factor_is_turned_on_asked_for_and_turned_off(office: Flask, clock: list[float]) -> None:
    """V6.3.3, V7.5.1."""
    here, there = signed_in(office, "anna"), signed_in(office, "anna")
    page = here.get("/account/second-factor").text
    assert '<svg width="' in page
    assert not re.search(r"<style|\sstyle=", page)
    assert here.post("/account/second-factor", {"password": PASSWORD, "first": "000000"}).status_code == 422
    shown = re.search(r"<code>([A-Z2-7 ]+)</code>", page).group(1).replace(" ", "")
    wrong = {"password": "wrong", "first": code_at(shown, clock[0])}
    assert here.post("/account/second-factor", wrong).status_code == 422
    assert row_of(office, "anna").second_factor == ""
    secret = turn_on(office, here, clock)
    assert is_signed_in(here)
    assert not is_signed_in(there)
    clock[0] += 30
    assert try_to_sign_in(there, "anna", PASSWORD).status_code == 401
    assert try_to_sign_in(there, "anna", "wrong", code_at(secret, clock[0])).status_code == 401
    assert try_to_sign_in(there, "anna", PASSWORD, code_at(secret, clock[0])).status_code == 303
    clock[0] += 30
    off = "/account/second-factor/off"
    assert here.post(off, {"password": PASSWORD}).status_code == 422
    assert here.post(off, {"password": PASSWORD, "code": code_at(secret, clock[0])}).status_code == 303
    assert row_of(office, "anna").second_factor == ""
    assert not is_signed_in(there)


def test_code_is_good_once_and_in_its_half_minute_alone(office: Flask, clock: list[float]) -> None:
    """V6.5.1, V6.5.5."""
    secret = turn_on(office, signed_in(office, "anna"), clock)
    first = code_at(secret, clock[0])
    browser = Browser(office)
    assert try_to_sign_in(browser, "anna", PASSWORD, first).status_code == 401  # used to turn it on
    clock[0] += 30
    second = code_at(secret, clock[0])
    assert try_to_sign_in(browser, "anna", PASSWORD, second).status_code == 303
    assert try_to_sign_in(Browser(office), "anna", PASSWORD, second).status_code == 401
    clock[0] += 30
    late, early = code_at(secret, clock[0] - 30), code_at(secret, clock[0] + 30)
    for code in (late, early, "", "１２３４５６", "abc", code_at(secret, clock[0])[:5]):
        set_account(office, "anna", failed=0, locked_until=None)
        assert try_to_sign_in(Browser(office), "anna", PASSWORD, code).status_code == 401, code
    spaced = code_at(secret, clock[0])[:3] + " " + code_at(secret, clock[0])[3:]
    assert try_to_sign_in(Browser(office), "anna", PASSWORD, spaced).status_code == 303


def test_code_used_twice_at_the_same_moment_opens_once(office: Flask) -> None:
    accounts, opened = people_of(office).accounts, []
    number = row_of(office, "anna").id
    threads = [
        threading.Thread(target=lambda: opened.append(accounts.use_code(number, 77))) for _ in range(8)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert opened.count(True) == 1


def test_where_everybody_needs_a_second_factor_nothing_opens_before(
    start: Start, database_url: str, clock: list[float]
) -> None:
    office = start(database_url, sign_in=SignIn(accounts=True, second_factor=True))
    made(office, "anna")
    browser = Browser(office)
    try_to_sign_in(browser, "anna", PASSWORD)
    for page in ("/", "/account", "/account/keys", "/account/signed-in"):
        assert browser.get(page).headers["Location"] == "/account/second-factor", page
    assert browser.client.get("/api/v1/plans").status_code == 403
    secret = turn_on(office, browser, clock)
    assert browser.get("/").status_code == 200
    clock[0] += 30
    off = {"password": PASSWORD, "code": code_at(secret, clock[0])}
    assert browser.post("/account/second-factor/off", off).status_code == 422
    assert row_of(office, "anna").second_factor == secret
