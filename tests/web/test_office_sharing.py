"""Plans shared by links: who may do what by every route, what a link is worth, and what it leaves behind."""

from __future__ import annotations

import base64
import contextlib
import io
import logging
import re
import threading
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime, timedelta
from functools import partial
from typing import Any

import pytest
from flask import Flask
from screen_tools import Visit
from sharing_tools import (
    CHANGING,
    PATIENT,
    RULES,
    Forms,
    call,
    numbers,
    opened,
    routes,
    running_of,
    share,
)
from sqlalchemy import event, select, text, update
from web_tools import TOKEN, Browser

from webapp.guarding import access_log
from webapp.keeping import shares as sharing
from webapp.keeping.access import NotThereError
from webapp.keeping.records import GrantRow, PlanRow, ShareRow
from webapp.keeping.store import StoredPlan
from webapp.people.settings import SignIn

OWNERS = {
    "start.rename", "start.keep", "start.delete", "sharing.show", "sharing.make", "sharing.withdraw",
    "api.delete_plan", "api.make_share", "api.list_shares", "api.withdraw_share",
}  # fmt: skip
"""What nobody but the owner may do."""
READERS = {
    "limits.forget": "deletes limits that the reader keeps himself",
    "sharing.leave": "takes the plan from the reader's own list",
    "api.leave_shared_plan": "likewise",
    "comparing.look": "shows a proposal, and keeps nothing",
    "comparing.option": "shows what an option would change, and keeps nothing",
    "waiting.stop": "stops work that the reader asked for; of others it is refused where there is some",
    "waiting.again": "begins work again that makes no decision",
    "api.cancel_work": "as waiting.stop",
    "api.begin_work_again": "as waiting.again",
}
"""What a reader may send, and why; everything else that changes is refused to him, new routes too."""
COMPARED = (
    "limits.choose", "limits.change", "limits.settings", "limits.from_file", "trains.change",
    "trains.from_file", "deciding.hold",
)  # fmt: skip


@pytest.fixture
def app(start: Callable[..., Flask], database_url: str) -> Flask:
    return start(database_url, bounds=PATIENT)


@pytest.fixture
def owner(app: Flask) -> Browser:
    return Browser(app)


@pytest.fixture
def plan(owner: Browser) -> str:
    return owner.sample()


def as_stored(app: Flask, plan: str) -> StoredPlan:
    address = plan.removeprefix("/plans/")
    store = running_of(app).store
    with running_of(app).database.sessions() as session:
        who = session.scalars(select(PlanRow.owner).where(PlanRow.address == address)).one()
    return store.plan(who, address)


def test_a_reader_can_look_at_everything_and_change_nothing(app: Flask, owner: Browser, plan: str) -> None:
    reader = opened(Browser(app), share(owner, plan))
    before = as_stored(app, plan)
    address = before.address
    for endpoint, method, path in routes(app, address, CHANGING):
        status = call(reader, endpoint, method, path) if "leave" not in endpoint else None
        if endpoint in READERS:
            assert status in (None, 200, 303, 404, 422), (endpoint, status)
        else:
            assert status == 403, (endpoint, status)
        assert as_stored(app, plan) == before, endpoint
    for endpoint, _, path in routes(app, address, ("GET",)):
        asked = f"{path}?cant=50" if endpoint in ("curves.at", "curves.held") else path
        expected = (403,) if endpoint in OWNERS else (200, 302)
        if "pieces" in path.rsplit("/", 2)[-2]:
            expected = (404,)
        assert reader.get(asked).status_code in expected, endpoint
    assert as_stored(app, plan) == before
    assert reader.post(f"{plan}/leave").status_code == 303
    assert reader.get(f"{plan}/cants").status_code == 404


def test_new_routes_are_in_these_tests(app: Flask, plan: str) -> None:
    """A name in the lists above that no route bears would let a test pass for nothing."""
    known = {endpoint for endpoint, _, _ in routes(app, "x", (*CHANGING, "GET"))}
    assert known >= (OWNERS | set(READERS) | set(COMPARED))


def test_an_outsider_finds_nothing_by_any_route(app: Flask, owner: Browser, plan: str) -> None:
    share(owner, plan)
    outsider = Browser(app)
    outsider.get("/")
    for endpoint, method, path in routes(app, plan.removeprefix("/plans/"), CHANGING):
        assert call(outsider, endpoint, method, path) == 404, endpoint
    for endpoint, _, path in routes(app, plan.removeprefix("/plans/"), ("GET",)):
        assert outsider.get(path).status_code == 404, endpoint


def test_an_editor_decides_but_owns_nothing(app: Flask, owner: Browser, plan: str) -> None:
    editor = opened(Browser(app), share(owner, plan, "edit"), who="Bea Moss")
    before = as_stored(app, plan)
    for endpoint, method, path in routes(app, before.address, (*CHANGING, "GET")):
        if endpoint in OWNERS:
            refused = (
                editor.get(path).status_code if method == "GET" else call(editor, endpoint, method, path)
            )
            assert refused == 403, endpoint
    after = as_stored(app, plan)
    assert after == before
    held = editor.post(f"{plan}/curves/1/hold", {"cant": "45", "because": "ballast", "who": "Bea Moss"})
    assert held.status_code == 303
    assert editor.post(f"{plan}/choice", {"method": "balanced"}).status_code == 303
    kinds = [(d.kind, d.who) for d in as_stored(app, plan).history[len(before.history) :]]
    assert kinds == [("change", "Bea Moss"), ("settings", "Bea Moss")]
    assert "Bea Moss" in owner.get(f"{plan}/history").text
    option = re.search(r'action="([^"]+/options/\d+)"', _page_with_options(editor, plan))
    assert option is not None
    shown = editor.post(option.group(1))
    proposal = re.search(r'name="proposal" value="([^"]+)"', shown.text)
    assert shown.status_code == 200
    assert proposal is not None
    for browser, status in ((owner, 422), (editor, 303)):  # a proposal is its maker's alone
        sent = {"proposal": proposal.group(1), "because": "as agreed", "who": "Bea Moss"}
        assert browser.post(f"{plan}/keep-proposal", sent).status_code == status
    assert len(as_stored(app, plan).decided.changes) == 2


def _page_with_options(browser: Browser, plan: str) -> str:
    for number in range(1, 40):
        page = browser.get(f"{plan}/curves/{number}")
        if page.status_code == 200 and "/options/" in page.text:
            return page.text
    message = "no curve of the sample offers an option"
    raise AssertionError(message)


def test_a_reader_compares_and_keeps_nothing(app: Flask, owner: Browser, plan: str) -> None:
    reader = opened(Browser(app), share(owner, plan))
    before = as_stored(app, plan)
    option = re.search(r'action="([^"]+/options/\d+)"', _page_with_options(reader, plan))
    assert option is not None
    answers = [
        reader.post(option.group(1)),
        reader.post(f"{plan}/choice", {"method": "balanced", "compare": "yes"}),
        reader.post(f"{plan}/limits/choose", {"source": "set:typical", "compare": "yes"}),
        reader.post(f"{plan}/curves/1/hold", {"cant": "40", "compare": "yes"}),
    ]
    for answer in answers:
        assert answer.status_code == 200, answer.text
        assert "What this would change" in answer.text
        assert "Keep it" not in answer.text
        proposal = re.search(r'name="proposal" value="([^"]+)"', answer.text)
        sent = {"proposal": proposal.group(1) if proposal else "x", "because": "mine", "who": "me"}
        assert reader.post(f"{plan}/keep-proposal", sent).status_code == 403
    assert as_stored(app, plan) == before


def test_no_form_that_changes_is_offered_to_a_reader(app: Flask, owner: Browser, plan: str) -> None:
    owner.post(f"{plan}/curves/1/hold", {"cant": "45", "because": "x", "who": "x"})
    owner.post(f"{plan}/choice", {"method": "balanced"})
    link = share(owner, plan)
    reader = opened(Browser(app), link)
    harmless = ("/units", "/limits/forget", "/leave")
    shows = re.compile(r"/options/\d+$|/compare$")
    pages = 0
    for endpoint, _, path in routes(app, plan.removeprefix("/plans/"), ("GET",)):
        answer = reader.get(path)
        if endpoint.startswith("api.") or answer.mimetype != "text/html" or answer.status_code != 200:
            continue
        pages += 1
        assert "shared with you to read" in answer.text, endpoint
        for form in Forms(answer.text).found:
            if form.method == "get" or form.action.endswith(harmless) or shows.search(form.action):
                continue
            assert set(form.buttons) <= {"compare", "more"}, (endpoint, form)
        for words in ("Take it back", "Plan the cants", ">Share<", "Keep under a name"):
            assert words not in answer.text, (endpoint, words)
    assert pages >= 10
    assert "Take it back" in owner.get(f"{plan}/history").text


def test_a_withdrawn_link_takes_everything_at_once(app: Flask, owner: Browser, plan: str) -> None:
    link, other = share(owner, plan, "edit"), share(owner, plan)
    editor, reader = opened(Browser(app), link), opened(Browser(app), other)
    both = opened(opened(Browser(app), link), other)
    latest, first = numbers(owner, plan)
    assert "opened by 2" in owner.get(f"{plan}/shares").text
    assert owner.post(f"{plan}/shares/{first}/withdraw").status_code == 303
    for endpoint, method, path in routes(app, plan.removeprefix("/plans/"), CHANGING):
        assert call(editor, endpoint, method, path) == 404, endpoint
    assert editor.get(f"{plan}/original").status_code == 404
    assert plan not in editor.get("/").text
    assert reader.get(f"{plan}/cants").status_code == 200
    assert both.get(f"{plan}/cants").status_code == 200
    assert both.post(f"{plan}/trains/forget").status_code == 403, "what is left to him is to read"
    assert numbers(owner, plan) == [latest]
    assert owner.post(f"{plan}/shares/{first}/withdraw").status_code == 404
    with running_of(app).database.sessions() as session:
        assert len(session.scalars(select(GrantRow)).all()) == 2


def test_a_link_of_another_plan_cannot_be_withdrawn(app: Flask, owner: Browser, plan: str) -> None:
    share(owner, plan)
    (number,) = numbers(owner, plan)
    stranger = Browser(app)
    mine = stranger.sample()
    for given in (number, 0, 2**31, 2**63, 2**80):
        assert stranger.post(f"{mine}/shares/{given}/withdraw").status_code == 404
    assert stranger.client.delete(f"/api/v1{mine}/shares/{number}").status_code == 404
    assert numbers(owner, plan) == [number]


def test_a_plan_is_deleted_and_a_link_withdrawn_while_others_open_it(
    start: Callable[..., Flask], database_url: str
) -> None:
    """Whoever comes first, nobody waits for another without end, and nobody holds what is gone."""
    app = start(database_url)
    store, shares = running_of(app).store, sharing.Shares(running_of(app).database)
    odd: list[Exception] = []

    def together(*calls: Callable[[], object]) -> None:
        ready = threading.Barrier(len(calls))

        def one(call: Callable[[], object]) -> None:
            ready.wait()
            try:
                call()
            except NotThereError:
                pass
            except Exception as error:
                odd.append(error)

        threads = [threading.Thread(target=one, args=(call,)) for call in calls]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()

    for turn in range(10):
        address = store.add("anna", "a.csv", b"x").address
        link, secret = shares.make("anna", address, "Survey", may_edit=True)
        end: Callable[[], object] = partial(store.remove, "anna", address)
        if turn % 2:
            end = partial(shares.withdraw, "anna", address, link.number)
        decide = partial(store.decide, "anna", address, {"answers": "{}"})
        together(partial(shares.accept, "bo", secret), end, decide, partial(shares.accept, "cy", secret))
        for who in ("bo", "cy"):
            with pytest.raises(NotThereError):
                store.plan(who, address)
    assert odd == []


def test_an_expired_link_opens_nothing_more(app: Flask, owner: Browser, plan: str) -> None:
    today = datetime.now(UTC).date()
    link = share(owner, plan, until=f"{today:%Y-%m-%d}")
    reader = opened(Browser(app), link)
    assert f"until {today:%Y-%m-%d}" in re.sub(r"<[^>]+>", "", reader.get("/").text)
    with running_of(app).database.sessions.begin() as session:
        ends = session.scalars(select(GrantRow.expires)).one()
        assert ends == datetime.combine(today + timedelta(days=1), datetime.min.time(), UTC)
        past = datetime.now(UTC) - timedelta(seconds=1)
        session.execute(update(ShareRow).values(expires=past))
        session.execute(update(GrantRow).values(expires=past))
    assert reader.get(f"{plan}/cants").status_code == 404
    assert reader.post(f"{plan}/trains/forget").status_code == 404
    assert "Shared with you" not in reader.get("/").text
    assert Browser(app).get(link).status_code == 404
    assert numbers(owner, plan) == []
    running_of(app).store.remove_expired()
    with running_of(app).database.sessions() as session:
        assert session.scalars(select(ShareRow)).all() == []
        assert session.scalars(select(GrantRow)).all() == []


def test_links_and_grants_go_with_the_plan(app: Flask, owner: Browser, plan: str) -> None:
    link = share(owner, plan, "edit")
    editor = opened(Browser(app), link)
    assert owner.post(f"{plan}/delete").status_code == 303
    assert editor.get(f"{plan}/cants").status_code == 404
    assert editor.get(link).status_code == 404
    assert "Shared with you" not in editor.get("/").text
    with running_of(app).database.sessions() as session:
        assert session.scalars(select(ShareRow)).all() == []
        assert session.scalars(select(GrantRow)).all() == []


def test_every_secret_that_opens_nothing_is_answered_alike(app: Flask, owner: Browser, plan: str) -> None:
    withdrawn, expired, good = (share(owner, plan) for _ in range(3))
    _, second, first = numbers(owner, plan)
    owner.post(f"{plan}/shares/{first}/withdraw")
    with running_of(app).database.sessions.begin() as session:
        past = datetime.now(UTC) - timedelta(seconds=1)
        session.execute(update(ShareRow).where(ShareRow.id == second).values(expires=past))
        digest = session.scalars(select(ShareRow.secret_digest).where(ShareRow.id == first + 2)).one()
    wrong = [
        withdrawn, expired, good[:-1], good + "A", "/shared/" + good.removeprefix("/shared/").swapcase(),
        "/shared/" + "A" * 32, f"/shared/{digest}", "/shared/%ff", "/shared/'%20OR%201=1--",
        "/shared/" + "x" * 5000,
    ]  # fmt: skip
    stranger = Browser(app)
    stranger.get("/")
    asked: list[str] = []

    @event.listens_for(running_of(app).database.engine, "before_cursor_execute")
    def _note(_c: Any, _cursor: Any, statement: str, *_more: Any) -> None:
        asked.append(statement)

    seen = set()
    for link in wrong:
        for method in ("GET", "POST"):
            asked.clear()
            data = {"token": stranger.token} if method == "POST" else None
            answer = stranger.client.open(link, method=method, data=data)
            page = re.sub(r'value="[^"]*"', "", answer.text)
            seen.add((answer.status_code, page, tuple(asked), tuple(sorted(answer.headers.keys()))))
            assert answer.headers["Referrer-Policy"] == "strict-origin"
            assert answer.headers["Cache-Control"] == "private, no-store"
            assert plan not in answer.text
    assert len({one[:3] for one in seen}) == 1, "the answer, and what the database is asked, are the same"
    assert next(iter(seen))[0] == 404
    assert stranger.get(good).status_code == 200


def test_wrong_links_are_soon_too_many(start: Callable[..., Flask]) -> None:
    app = start()
    stranger = Browser(app)
    stranger.get("/")
    most = running_of(app).config.bounds.wrong_links_per_minute
    codes = [stranger.client.get(f"/shared/{i:032d}").status_code for i in range(most // 2)]
    codes += [
        stranger.client.post("/api/v1/shared", json={"secret": f"{i:032d}"}).status_code for i in range(most)
    ]
    assert codes.count(404) == most
    assert codes[-1] == 429


def test_the_secret_is_told_once_and_kept_nowhere(
    app: Flask, owner: Browser, plan: str, caplog: pytest.LogCaptureFixture, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(access_log.LOG, "propagate", True)
    caplog.set_level(logging.DEBUG)
    link = share(owner, plan, "edit")
    secret = link.removeprefix("/shared/")
    assert len(base64.urlsafe_b64decode(secret + "==")) * 8 >= 128
    assert len({share(owner, plan) for _ in range(20)}) == 20
    editor = opened(Browser(app), link, who="Bea Moss")
    editor.post(f"{plan}/curves/1/hold", {"cant": "45", "because": "x", "who": "x"})
    for browser in (owner, editor):
        browser.client.get(f"{link}x")
        for _, _, path in [("", "", "/"), *routes(app, plan.removeprefix("/plans/"), ("GET",))]:
            assert secret.encode() not in browser.get(path).data, path
    assert "/shared/<secret>" in caplog.text
    assert secret not in caplog.text
    database = running_of(app).database
    with database.engine.connect() as connection:
        for table in database_tables(database.engine.dialect.name, connection):
            for row in connection.execute(text(f'SELECT * FROM "{table}"')):  # noqa: S608 names from the database
                assert secret not in str(tuple(row)), table
    if database.file is not None:
        for file in (one for one in database.file.parent.iterdir() if one.is_file()):
            assert secret.encode() not in file.read_bytes(), file


def database_tables(kind: str, connection: Any) -> list[str]:
    asked = (
        "SELECT name FROM sqlite_master WHERE type = 'table'"
        if kind == "sqlite"
        else "SELECT tablename FROM pg_tables WHERE schemaname = 'public'"
    )
    found = [str(name) for (name,) in connection.execute(text(asked))]
    assert {"shares", "grants", "plans"} <= set(found)
    return found


def test_script_in_labels_and_names_is_only_text(app: Flask, owner: Browser, plan: str) -> None:
    hostile = "\"'><script>alert(1)</script>{{7*7}}"
    assert owner.post(f"{plan}/name", {"name": hostile}).status_code == 303
    owner.get(f"{plan}/shares")
    made = owner.post(f"{plan}/shares", {"label": hostile, "access": "edit"})
    again = owner.get(f"{plan}/shares").text
    link = re.search(r'(/shared/[A-Za-z0-9_-]+)"', made.text)
    assert link is not None
    reader = Browser(app)
    pages = [made.text, again, reader.get(link.group(1)).text]
    opened(reader, link.group(1), who=hostile)
    pages += [reader.get("/").text, reader.get(f"{plan}/cants").text]
    (number,) = numbers(owner, plan)
    owner.post(f"{plan}/shares/{number}/withdraw")
    pages.append(owner.get(f"{plan}/shares").text)
    for page in pages:
        assert "<script>alert" not in page
        assert "&lt;script&gt;alert(1)&lt;/script&gt;{{7*7}}" in page
    refused = owner.post(f"{plan}/shares", {"label": hostile, "access": "all", "until": hostile})
    assert refused.status_code == 422
    assert "<script>alert" not in refused.text


@pytest.mark.parametrize(
    ("sent", "words"),
    [
        ({"label": ""}, "for whom"),
        ({"label": "x" * 81}, "for whom"),
        ({"label": "a\x07b"}, "for whom"),
        ({"access": ""}, "choose what the link lets do"),
        ({"access": "own"}, "choose what the link lets do"),
        ({"until": "2001-01-01"}, "last day"),
        ({"until": "9999-12-31"}, "last day"),
        ({"until": "soon"}, "is no day"),
    ],
)
def test_what_cannot_be_a_link_is_refused(
    start: Callable[..., Flask], sent: dict[str, str], words: str
) -> None:
    owner = Browser(start())
    plan = owner.sample()
    answer = owner.post(f"{plan}/shares", {"label": "Survey", "access": "read", **sent})
    assert answer.status_code == 422
    assert words.casefold() in answer.text.casefold()
    assert numbers(owner, plan) == []


def test_links_and_their_holders_are_bounded(
    app: Flask, owner: Browser, plan: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sharing, "MOST_LINKS", 2)
    monkeypatch.setattr(sharing, "MOST_HOLDERS", 1)
    link = share(owner, plan)
    share(owner, plan)
    assert owner.post(f"{plan}/shares", {"label": "x", "access": "read"}).status_code == 422
    reader = opened(Browser(app), link)
    opened(reader, link)  # once more is no second holder
    late = Browser(app)
    late.get(link)
    assert late.post(link).status_code == 422
    assert late.get(f"{plan}/cants").status_code == 404


def test_opened_at_the_same_moment_a_link_counts_once(app: Flask, owner: Browser, plan: str) -> None:
    secret = share(owner, plan).removeprefix("/shared/")
    shares = sharing.Shares(running_of(app).database)
    with ThreadPoolExecutor(4) as pool:
        list(pool.map(lambda who: shares.accept(who, secret), ["bert", "bert", "bert", "carl"]))
    with running_of(app).database.sessions() as session:
        assert sorted(session.scalars(select(GrantRow.holder))) == ["bert", "carl"]
    assert "opened by 2" in owner.get(f"{plan}/shares").text


def test_opened_while_it_is_withdrawn_a_link_leaves_nothing(app: Flask, owner: Browser, plan: str) -> None:
    secret = share(owner, plan).removeprefix("/shared/")
    shares = sharing.Shares(running_of(app).database)
    (number,) = numbers(owner, plan)
    stored = as_stored(app, plan)
    with running_of(app).database.sessions() as session:
        who = session.scalars(select(PlanRow.owner)).one()

    def act(name: str) -> None:
        if name == "owner":
            shares.withdraw(who, stored.address, number)
            return
        with contextlib.suppress(NotThereError):
            shares.accept(name, secret)

    with ThreadPoolExecutor(4) as pool:
        list(pool.map(act, ["bert", "owner", "carl", "dora"]))
    with running_of(app).database.sessions() as session:
        assert session.scalars(select(GrantRow)).all() == []
        assert session.scalars(select(ShareRow)).all() == []


def test_opening_shows_no_more_than_the_name_and_needs_the_form(
    app: Flask, owner: Browser, plan: str
) -> None:
    link = share(owner, plan)
    reader = Browser(app)
    page = reader.get(link)
    assert "dunmarrow_keldrith.xlsx" in page.text
    assert plan not in page.text, "the address of the plan is not told before the link is taken"
    assert reader.get(f"{plan}/cants").status_code == 404, "looking at the offer takes nothing"
    assert reader.client.post(link).status_code == 403
    assert reader.client.post(link, data={"token": owner.token}).status_code == 403
    cross = {"Origin": "https://elsewhere.example"}
    assert reader.post(link, headers=cross).status_code == 403
    assert reader.get(f"{plan}/cants").status_code == 404
    assert TOKEN.search(page.text) is not None
    assert "This plan is your own" in owner.get(link).text
    assert owner.post(link).status_code == 303
    with running_of(app).database.sessions() as session:
        assert session.scalars(select(GrantRow)).all() == []


def test_kept_limits_are_the_visitors_own(app: Flask, owner: Browser, plan: str) -> None:
    reader, editor = (opened(Browser(app), share(owner, plan, access)) for access in ("read", "edit"))
    owner.post(f"{plan}/limits", {"keep-as": "of the owner"})
    assert "of the owner" in owner.get(f"{plan}/limits").text
    assert editor.post(f"{plan}/limits", {"keep-as": "of the editor"}).status_code == 303
    assert reader.post(f"{plan}/limits", {"keep-as": "of the reader"}).status_code == 403
    assert "of the owner" not in editor.get(f"{plan}/limits").text
    assert "of the editor" not in owner.get(f"{plan}/limits").text
    assert "Kept by you" not in reader.get(f"{plan}/limits").text
    reader.post(f"{plan}/limits/forget", {"name": "of the owner"})
    assert "of the owner" in owner.get(f"{plan}/limits").text


def test_a_shared_plan_can_be_compared_with_ones_own(app: Flask, owner: Browser, plan: str) -> None:
    reader = opened(Browser(app), share(owner, plan))
    mine = reader.sample()
    answer = reader.get(f"{mine}/compare?with={plan.removeprefix('/plans/')}")
    assert answer.status_code == 200
    assert owner.get(f"{plan}/compare?with={mine.removeprefix('/plans/')}").status_code == 404


def test_people_who_sign_in_hold_what_they_opened_on_any_device(
    start: Callable[..., Flask], database_url: str
) -> None:
    app = start(database_url, bounds=PATIENT, sign_in=SignIn(header="X-Remote-User"))

    def person(name: str) -> Browser:
        browser = Browser(app)
        browser.client.environ_base["HTTP_X_REMOTE_USER"] = name
        return browser

    anna, bert = person("anna"), person("bert")
    plan = anna.sample()
    opened(bert, share(anna, plan))
    assert person("bert").get(f"{plan}/cants").status_code == 200
    assert person("carl").get(f"{plan}/cants").status_code == 404
    before = as_stored(app, plan)
    for endpoint, method, path in routes(app, before.address, CHANGING):
        if "leave" in endpoint:
            continue
        status = call(bert, endpoint, method, path)
        assert status == 403 or endpoint in READERS, (endpoint, status)
        assert as_stored(app, plan) == before, endpoint


def test_a_program_shares_opens_and_withdraws(app: Flask) -> None:
    maker, taker = (app.test_client(use_cookies=False) for _ in range(2))
    made = maker.post(
        "/api/v1/plans", data={"file": (io.BytesIO(b"Curve,Radius (m)\nA,800\n"), "a.csv")}
    ).json
    assert made is not None
    key = {"Authorization": f"Bearer {made['key']}"}
    path = f"/api/v1/plans/{made['address']}"
    assert made["access"] == "own"
    until = f"{datetime.now(UTC) + timedelta(days=3):%Y-%m-%d}"
    body = {"label": "Depot", "access": "edit", "until": until}
    link = maker.post(f"{path}/shares", headers=key, json=body)
    assert link.status_code == 201
    assert link.json is not None
    assert (link.json["label"], link.json["access"], link.json["until"]) == ("Depot", "edit", until)
    assert link.json["link"].endswith(f"/shared/{link.json['secret']}")
    wrong = {"label": "x", "access": "own"}
    assert maker.post(f"{path}/shares", headers=key, json=wrong).status_code == 422
    assert taker.post("/api/v1/shared", json={"secret": "x" * 32}).status_code == 404
    got = taker.post("/api/v1/shared", json={"secret": link.json["secret"]})
    assert got.status_code == 200
    assert got.json is not None
    assert (got.json["access"], got.json["address"]) == ("edit", made["address"])
    other = {"Authorization": f"Bearer {got.json['key']}"}
    listed = taker.get("/api/v1/plans", headers=other).json
    assert listed is not None
    assert [(p["address"], p["access"]) for p in listed["plans"]] == [(made["address"], "edit")]
    limits = {"name": "own", "rows": RULES}
    assert taker.put(f"{path}/limits", headers=other, json=limits).status_code == 200
    assert taker.delete(path, headers=other).status_code == 403
    assert taker.get(f"{path}/shares", headers=other).status_code == 403
    shares = maker.get(f"{path}/shares", headers=key).json
    assert shares is not None
    (entry,) = shares["shares"]
    assert entry["holders"] == 1
    assert link.json["secret"] not in str(shares)
    assert maker.delete(f"{path}/shares/{entry['number']}", headers=key).status_code == 204
    assert taker.get(path, headers=other).status_code == 404
    again = taker.post("/api/v1/shared", headers=other, json={"secret": link.json["secret"]})
    assert again.status_code == 404
    more = maker.post(f"{path}/shares", headers=key, json={"label": "Depot"}).json
    assert more is not None
    assert more["access"] == "read"
    assert taker.post("/api/v1/shared", headers=other, json={"secret": more["secret"]}).status_code == 200
    assert taker.put(f"{path}/limits", headers=other, json=limits).status_code == 403
    assert taker.delete(f"/api/v1/shared/{made['address']}", headers=other).status_code == 204
    assert taker.get(path, headers=other).status_code == 404
    assert maker.delete(f"/api/v1/shared/{made['address']}", headers=key).status_code == 422


@pytest.mark.browser
def test_a_link_is_made_sent_opened_on_a_phone_and_withdrawn(visit: Visit) -> None:
    owner, reader = visit(), visit("phone")
    page = owner.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("link", name="Share", exact=True).click()
    page.get_by_label("For whom").fill("Survey team at Dunmarrow")
    page.get_by_role("button", name="Make the link").click()
    link = page.get_by_label("Link for Survey team at Dunmarrow").input_value()
    phone = reader.page
    phone.goto(link)
    assert phone.evaluate("document.documentElement.scrollWidth") <= 360
    phone.get_by_role("button", name="Open the plan").click()
    assert phone.url.endswith("/cants")
    assert phone.get_by_text("shared with you to read:").is_visible()
    assert phone.evaluate("document.documentElement.scrollWidth") <= 360
    plan = phone.url
    for path in ("/list", "/trains", "/limits", "/history"):
        phone.goto(plan.replace("/cants", path))
        assert phone.evaluate("document.documentElement.scrollWidth") <= 360, path
    phone.goto(owner.address)
    assert phone.get_by_role("heading", name="Shared with you").is_visible()
    page.goto(page.url)
    assert page.get_by_text("opened by 1").is_visible()
    assert link.rpartition("/")[2] not in page.content()
    page.get_by_role("button", name="Withdraw").first.click()
    assert page.get_by_text("is withdrawn").is_visible()
    phone.goto(plan)
    assert phone.get_by_text("no longer be shared with you").is_visible()
    phone.goto(link)
    assert phone.get_by_text("this link opens nothing").is_visible()
    assert [said for said in owner.said + reader.said if "404" not in said] == []
