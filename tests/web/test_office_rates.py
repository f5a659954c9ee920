"""Asked too often, too much at once, from behind a proxy; what the log says; addresses for watchers."""

from __future__ import annotations

import io
import logging
import re
import threading
import time
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from flask import Flask
from flask.testing import FlaskClient
from sqlalchemy import select, text, update
from web_tools import CURVES, Browser
from werkzeug.test import TestResponse

from cant.errors import InputError
from webapp.busy import BusyError
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.guarding import turns as turns_module
from webapp.guarding.access_log import LOG, log_to
from webapp.guarding.bounds import Bounds
from webapp.guarding.rates import OPEN_LINK, SIGN_IN
from webapp.guarding.turns import Turns
from webapp.keeping.records import PlanRow, WorkRow
from webapp.keeping.work import WAITING
from webapp.people.settings import SignIn

Start = Callable[..., Flask]
ROW = b"Curve,Radius (m),Speed (km/h)\nA,500,80\n"


def bring(browser: Browser) -> TestResponse:
    return browser.post("/plans", {"file": (io.BytesIO(ROW), "a.csv")})


def from_address(client: FlaskClient, address: str, path: str = "/", **headers: str) -> TestResponse:
    return client.get(path, environ_base={"REMOTE_ADDR": address}, headers=headers)


def test_a_person_may_not_ask_without_end_and_is_told_when_again(start: Start) -> None:
    browser = Browser(start(bounds=Bounds(requests_per_minute=5)))
    browser.get("/")
    codes = [browser.get("/").status_code for _ in range(7)]
    assert codes == [200] * 5 + [429] * 2
    page = browser.get("/")
    assert "Too much at once" in page.text
    assert 1 <= int(page.headers["Retry-After"]) <= 60
    assert page.headers["Retry-After"] in page.text
    assert '<a href="/">This page once more</a>' in page.text
    assert "once more</a>" not in browser.get("//elsewhere.example/").text
    data = browser.get("/api/v1/plans")
    assert data.status_code == 429
    assert data.json["error"]["status"] == 429
    assert int(data.headers["Retry-After"]) >= 1
    assert Browser(browser.client.application).get("/").status_code == 200


def test_an_address_may_not_ask_without_end_whatever_cookies_it_drops(start: Start) -> None:
    app = start(bounds=Bounds(requests_per_minute_address=5))
    codes = [from_address(app.test_client(), "192.0.2.7").status_code for _ in range(7)]
    assert codes == [200] * 5 + [429] * 2
    assert from_address(app.test_client(), "192.0.2.8").status_code == 200


def test_addresses_of_one_ipv6_network_count_as_one(start: Start) -> None:
    app = start(bounds=Bounds(requests_per_minute_address=3))
    codes = [from_address(app.test_client(), f"2001:db8:0:1::{n}").status_code for n in range(1, 6)]
    assert codes == [200] * 3 + [429] * 2
    assert from_address(app.test_client(), "2001:db8:0:2::1").status_code == 200


@pytest.mark.parametrize("bounds", [{"uploads_per_minute": 3}, {"uploads_per_minute_address": 3}])
def test_uploads_are_counted_and_one_refused_stores_nothing(start: Start, bounds: dict[str, int]) -> None:
    browser = Browser(start(bounds=Bounds(**bounds)))
    assert [bring(browser).status_code for _ in range(3)] == [303] * 3
    assert bring(browser).status_code == 429
    assert browser.post("/plans/sample").status_code == 429
    api = browser.client.post("/api/v1/plans", data={"file": (io.BytesIO(CURVES.encode()), "a.csv")})
    assert api.status_code == 429
    assert len(browser.get("/api/v1/plans").json["plans"]) == 3


def test_plans_cannot_be_guessed_for_long(start: Start) -> None:
    app = start(bounds=Bounds(wrong_plans_per_minute=4))
    browser, guesser = Browser(app), app.test_client()
    plan = browser.sample()
    codes = [guesser.get(f"/plans/{n:032d}/cants").status_code for n in range(6)]
    assert codes == [404] * 4 + [429] * 2
    assert guesser.get(plan).status_code == 429  # even one that is there
    assert guesser.get("/").status_code == 200
    assert from_address(browser.client, "192.0.2.9", f"{plan}/cants").status_code == 200


def test_keys_cannot_be_guessed_for_long(start: Start) -> None:
    client = start(bounds=Bounds(wrong_plans_per_minute=4)).test_client(use_cookies=False)
    codes = [
        client.get("/api/v1/plans", headers={"Authorization": f"Bearer guess-{n}.x"}).status_code
        for n in range(6)
    ]
    assert codes == [403] * 4 + [429] * 2


def test_share_links_cannot_be_guessed_for_long(start: Start) -> None:
    app = start(bounds=Bounds(wrong_links_per_minute=4))
    client = app.test_client()
    codes = [client.get(f"/shared/{n:032d}").status_code for n in range(6)]
    assert codes == [404] * 4 + [429] * 2
    assert client.get("/").status_code == 200
    assert set(app.view_functions) >= OPEN_LINK


def test_passwords_cannot_be_guessed_for_long(start: Start) -> None:
    app = start(sign_in=SignIn(accounts=True), bounds=Bounds(sign_ins_per_minute=2))
    browser = Browser(app)
    browser.get("/sign-in")

    def tried(name: str, address: str = "192.0.2.1") -> int:
        wrong = {"name": name, "password": "not the password"}
        return browser.post("/sign-in", wrong, environ_base={"REMOTE_ADDR": address}).status_code

    assert [tried("anna") for _ in range(4)] == [401, 401, 429, 429]
    assert tried(" ANNA ") == 429  # the same account
    assert tried("anna", "192.0.2.2") == 401
    codes = [tried(f"guess{n}") for n in range(12)]
    assert codes[-1] == 429  # as any account
    assert SIGN_IN in app.view_functions


def test_a_busy_office_behind_one_address_is_not_cut(start: Start) -> None:
    """Thirty-two people bring a list and look at ten pages within the same minute."""
    app = start()
    for _ in range(32):
        client = app.test_client()
        codes = {client.get("/units-of-nothing").status_code for _ in range(10)}
        assert codes == {404}
    assert Bounds().uploads_per_minute_address >= 32 * 60


def test_turns_are_given_in_order_and_given_back() -> None:
    turns = Turns(1, wait_s=5)
    turns.take("a")
    order: list[int] = []

    def wait(number: int) -> None:
        turns.take("b")
        order.append(number)
        turns.give_back()

    threads = []
    for number in range(3):
        threads.append(threading.Thread(target=wait, args=(number,)))
        threads[-1].start()
        time.sleep(0.05)
    turns.give_back()
    for thread in threads:
        thread.join()
    assert order == [0, 1, 2]
    turns.take("c")  # free again


def test_who_waits_too_long_or_too_many_is_told_to_come_back() -> None:
    turns = Turns(1, wait_s=0.05, most_waiting=2, most_waiting_person=1)
    turns.take()
    with pytest.raises(BusyError) as caught:
        turns.take("a")
    assert caught.value.retry_s > 0
    turns.wait_s = 1.0
    first = threading.Thread(target=turns.take, args=("a",))
    first.start()
    time.sleep(0.05)
    begun = time.monotonic()
    with pytest.raises(BusyError):
        turns.take("a")  # waits already
    assert time.monotonic() - begun < 0.5
    turns.give_back()
    first.join()
    turns.give_back()
    turns.take("a")


def test_busy_is_a_clean_answer_and_light_pages_still_come(start: Start) -> None:
    app = start(bounds=Bounds(computing_at_once=1, wait_seconds=1))
    browser = Browser(app)
    plan = browser.sample()
    entered, leave = threading.Event(), threading.Event()
    store = app.extensions[EXTENSION].store
    whole = store.plan

    def slow(owner: str, address: str) -> object:
        entered.set()
        leave.wait(20)
        return whole(owner, address)

    store.plan = slow
    held = threading.Thread(target=lambda: app.test_client().get(f"{plan}/cants"))
    held.start()
    entered.wait(20)
    try:
        page = bring(browser)
        assert page.status_code == 503
        assert "busy" in page.text
        assert int(page.headers["Retry-After"]) > 0
        assert browser.get("/api/v1/limits").json["error"]["status"] == 503
        for path in ("/", "/healthz", "/readyz", "/static/style.css"):
            assert browser.get(path).status_code == 200, path
    finally:
        store.plan = whole
        leave.set()
        held.join()
    assert len(browser.get("/api/v1/plans").json["plans"]) == 1
    assert bring(browser).status_code == 303


def test_an_answer_in_pieces_takes_a_turn_for_each(start: Start) -> None:
    app = start(bounds=Bounds(computing_at_once=1, wait_seconds=1))
    browser = Browser(app)
    plan = browser.sample()
    stream = browser.client.get(f"{plan}/plan.json")  # not read yet
    assert browser.get(f"{plan}/cants").status_code == 200
    assert b"".join(stream.response).endswith(b"}\n") or stream.status_code == 200
    assert browser.get(f"{plan}/cants").status_code == 200


def test_endpoints_that_need_no_turn_exist(app: Flask) -> None:
    assert set(app.view_functions) >= turns_module.NEEDS_NONE


def test_a_proxy_is_believed_where_it_is_ours_alone(start: Start) -> None:
    app = start(
        proxies=("10.0.0.0/24",),
        trusted_hosts=("cant.example",),
        bounds=Bounds(requests_per_minute_address=2),
    )
    said = {
        "X-Forwarded-For": "198.51.100.1, 192.0.2.1",
        "X-Forwarded-Host": "cant.example",
        "X-Forwarded-Proto": "https",
        "Host": "inside",
    }

    def asked(proxy: str, **more: str) -> int:
        return from_address(app.test_client(), proxy, "/help/", **{**said, **more}).status_code

    assert asked("10.0.0.5") == 200
    assert asked("192.0.2.66") == 400  # what it says of the host is not believed
    assert asked("10.0.0.5", **{"X-Forwarded-For": "1.2.3.4, 192.0.2.1"}) == 200
    assert asked("10.0.0.6", **{"X-Forwarded-For": "5.6.7.8, 192.0.2.1"}) == 429  # the last address counts
    assert asked("10.0.0.6", **{"X-Forwarded-For": "192.0.2.2"}) == 200


def test_an_address_that_claims_to_be_another_is_counted_as_itself(start: Start) -> None:
    app = start(bounds=Bounds(requests_per_minute_address=3))
    codes = [
        from_address(app.test_client(), "192.0.2.5", **{"X-Forwarded-For": f"198.51.100.{n}"}).status_code
        for n in range(5)
    ]
    assert codes == [200] * 3 + [429] * 2


@pytest.mark.parametrize("value", ["proxy.example", "10.0.0.300", "10.0.0.1/24"])
def test_a_proxy_must_be_an_address(value: str) -> None:
    with pytest.raises(InputError, match="CANT_PROXIES"):
        Config.from_environment({"CANT_PROXIES": value})


def test_bounds_come_from_the_environment(tmp_path: Path) -> None:
    config = Config.from_environment(
        {"CANT_DATA": str(tmp_path), "CANT_PLANS_PER_PERSON": "7", "CANT_PROXIES": "10.0.0.1, 192.0.2.0/24"}
    )
    assert config.bounds.plans_per_person == 7
    assert config.proxies == ("10.0.0.1", "192.0.2.0/24")
    assert config.bounds.turns >= 2
    for value in ("0", "-1", "many", "²", "9" * 20):
        with pytest.raises(InputError, match="CANT_UPLOADS_PER_MINUTE"):
            Config.from_environment({"CANT_UPLOADS_PER_MINUTE": value})


def test_a_signing_key_must_be_long() -> None:
    with pytest.raises(InputError, match="CANT_SIGNING_KEY"):
        Config.from_environment({"CANT_SIGNING_KEY": "secret"})
    assert Config.from_environment({"CANT_SIGNING_KEY": "x" * 32}).key() == "x" * 32


LINE = re.compile(
    r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z (\S+) (GET|POST|OTHER) (\S+) (\d{3}|-) (\d+) "
    r"\d+ms (-|[0-9a-f]{12})"
)


@pytest.fixture
def access_log(tmp_path: Path) -> Path:
    """Write the access log into a file while a test runs."""
    file = tmp_path / "logs" / "access.log"
    log_to(str(file))
    yield file  # type: ignore[misc]
    for handler in LOG.handlers[:]:
        LOG.removeHandler(handler)
        handler.close()
    LOG.setLevel(logging.NOTSET)
    LOG.propagate = True


def test_the_access_log_has_one_line_a_request_and_tells_no_secret(app: Flask, access_log: Path) -> None:
    browser = Browser(app)
    browser.get("/?token=very-secret")
    answer = browser.post("/plans", {"file": (io.BytesIO(ROW), "secret-name.csv")})
    answer.close()
    plan = answer.headers["Location"].removesuffix("/list")
    browser.get(f"{plan}/list?search=hidden")
    browser.get("/no/such/page%0Ainvented line")
    browser.client.open("/", method="BREW\tTEA", buffered=True)
    text = access_log.read_text()
    lines = text.splitlines()
    assert len(lines) == 5
    found = [LINE.fullmatch(line) for line in lines]
    assert all(found), text
    routes = [match.group(3) for match in found if match]
    assert routes == ["/", "/plans", "/plans/<address>/list", "-", "-"]
    for secret in ("very-secret", "secret-name", plan.split("/")[2], "hidden", "invented"):
        assert secret not in text
    sizes = [int(match.group(5)) for match in found if match]
    assert sizes[0] > 1000
    people = [match.group(6) for match in found if match]
    assert people[1] == people[2] != "-"
    with browser.client.session_transaction() as session:
        assert session["owner"][:6] not in text
    assert access_log.stat().st_mode & 0o077 == 0


def test_the_access_log_may_be_moved_away(app: Flask, access_log: Path) -> None:
    browser = Browser(app)
    browser.get("/")
    access_log.rename(access_log.with_suffix(".1"))
    browser.get("/")
    assert len(access_log.read_text().splitlines()) == 1
    assert len(access_log.with_suffix(".1").read_text().splitlines()) == 1


def test_an_unforeseen_error_is_logged_without_the_address_asked_for(
    app: Flask, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    browser = Browser(app)
    plan = browser.sample()

    def fails(*_given: object) -> None:
        message = "detail"
        raise RuntimeError(message)

    monkeypatch.setattr(app.extensions[EXTENSION].store, "plan", fails)
    assert browser.get(f"{plan}/cants").status_code == 500
    record = next(r for r in caplog.records if "failed, reference" in r.getMessage())
    assert "/plans/<address>/cants" in record.getMessage()
    assert plan not in record.getMessage()


def test_an_unforeseen_error_of_the_database_is_logged_without_what_it_was_about(
    start: Start, database_url: str, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    app = start(database_url)
    browser = Browser(app)
    database = app.extensions[EXTENSION].database

    def fails(_owner: str, name: str, data: bytes) -> None:
        with database.sessions.begin() as session:
            session.execute(text("INSERT INTO nowhere VALUES (:name, :data)"), {"name": name, "data": data})

    monkeypatch.setattr(app.extensions[EXTENSION].store, "add", fails)
    answer = browser.post("/plans", {"file": (io.BytesIO(ROW), "secret-name.csv")})
    assert answer.status_code == 500
    assert "nowhere" in caplog.text
    assert "secret-name" not in caplog.text
    assert "A,500,80" not in caplog.text


def test_health_addresses_need_no_cookie_make_none_and_are_not_counted(start: Start) -> None:
    app = start(bounds=Bounds(requests_per_minute_address=2, requests_per_minute=2))
    for path, words in (("/healthz", "alive\n"), ("/readyz", "ready\n")):
        for _ in range(5):
            answer = app.test_client().get(path)
            assert (answer.status_code, answer.text) == (200, words)
            assert "Set-Cookie" not in answer.headers


def test_not_ready_while_stopping_or_without_database(app: Flask, monkeypatch: pytest.MonkeyPatch) -> None:
    running = app.extensions[EXTENSION]
    client = app.test_client()
    monkeypatch.setattr(running.database, "answers", lambda: False)
    answer = client.get("/readyz")
    assert (answer.status_code, answer.text) == (503, "not ready: the database does not answer\n")
    assert client.get("/healthz").status_code == 200
    running.stopping.set()
    assert client.get("/readyz").text == "not ready: stopping\n"


def test_not_ready_with_a_full_disk(start: Start) -> None:
    app = start(bounds=Bounds(mb_kept_free=10**9))
    assert app.test_client().get("/readyz").text == "not ready: the disk is full\n"


def test_headers_and_cookie_behind_https(start: Start) -> None:
    answer = start(https=True).test_client().get("/", base_url="https://localhost")
    cookie = answer.headers["Set-Cookie"]
    assert cookie.startswith("__Host-cant=")
    for part in ("Secure", "HttpOnly", "SameSite=Lax", "Path=/"):
        assert part in cookie
    assert "Domain" not in cookie
    assert "max-age=" in answer.headers["Strict-Transport-Security"]
    assert "Strict-Transport-Security" not in start().test_client().get("/").headers


def test_every_text_names_its_characters(browser: Browser) -> None:
    plan = browser.sample()
    for path in ("/", "/static/style.css", "/static/mark.svg", f"{plan}/trains/file", "/healthz"):
        assert "charset=utf-8" in browser.get(path).headers["Content-Type"].lower(), path


def test_not_ready_where_nobody_does_the_work(start: Start) -> None:
    app = start()
    running = app.extensions[EXTENSION]
    plan = running.store.add("anna", "a.csv", ROW)
    hours_ago = datetime.now(UTC) - timedelta(hours=1)
    with running.database.sessions.begin() as session:
        number = session.scalar(select(PlanRow.id).where(PlanRow.address == plan.address))
        waiting = {"state": WAITING, "made": hours_ago, "kind": "plan", "key": "k", "content": "{}"}
        session.add(WorkRow(address="w", plan_id=number, asked_by="anna", **waiting))
    client = app.test_client()
    assert client.get("/readyz").text == "not ready: nobody does the work that waits\n"
    with running.database.sessions.begin() as session:
        session.execute(update(WorkRow).values(beat=datetime.now(UTC)))
    assert not running.background.queue.is_left_alone()
