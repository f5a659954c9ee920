"""Two people at one plan: what both decide stands in the history, and none replaces what he has not seen."""

from __future__ import annotations

import io
import re
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor

import pytest
from flask import Flask
from sharing_tools import PATIENT, opened, running_of, share
from sqlalchemy import select
from web_tools import CURVES, TRAINS, Browser, FormFields
from werkzeug.test import TestResponse

from cant import limit_sets
from webapp.decisions import limits_text
from webapp.keeping.records import PlanRow
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError


@pytest.fixture
def app(start: Callable[..., Flask], database_url: str) -> Flask:
    return start(database_url, bounds=PATIENT)


@pytest.fixture
def owner(app: Flask) -> Browser:
    return Browser(app)


@pytest.fixture
def plan(owner: Browser) -> str:
    """Give a plan of three curves with trains, limits and cants."""
    owner.get("/")
    made = owner.post("/plans", {"file": (io.BytesIO(CURVES.encode()), "aldmere.csv")})
    plan = made.headers["Location"].removesuffix("/list")
    owner.post(f"{plan}/trains", dict(TRAINS))
    owner.post(f"{plan}/limits/choose", {"source": "set:typical"})
    assert owner.post(f"{plan}/confirm").status_code == 303
    return plan


@pytest.fixture
def editor(app: Flask, owner: Browser, plan: str) -> Browser:
    return opened(Browser(app), share(owner, plan, "edit"), who="Bea Moss")


def as_stored(app: Flask, plan: str) -> StoredPlan:
    address = plan.removeprefix("/plans/")
    with running_of(app).database.sessions() as session:
        who = session.scalars(select(PlanRow.owner).where(PlanRow.address == address)).one()
    return running_of(app).store.plan(who, address)


def fields(answer: TestResponse, action: str) -> dict[str, str]:
    """Give the fields of a form of a page, as a browser sends them."""
    found = FormFields(answer.text, action).sent
    assert "known" in found
    return {name: value for name, value in found.items() if name != "token"}


def kinds(app: Flask, plan: str) -> list[tuple[str, str]]:
    return [(one.kind, one.who) for one in as_stored(app, plan).history]


def test_trains_of_two_people_both_stand_in_the_history(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    mine = fields(owner.get(f"{plan}/trains"), "")
    theirs = fields(editor.get(f"{plan}/trains"), "")
    before = as_stored(app, plan)
    assert editor.post(f"{plan}/trains", {**theirs, "0-speed_kmh": "155"}).status_code == 303
    seen = len(as_stored(app, plan).history)
    assert seen == len(before.history) + 1
    told = owner.post(f"{plan}/trains", {**mine, "1-speed_kmh": "66"})
    assert told.status_code == 409
    assert "Bea Moss changed the trains in step" in told.text
    assert len(as_stored(app, plan).history) == seen, "nothing was kept silently"
    shown = fields(told, "")
    assert (shown["0-speed_kmh"], shown["1-speed_kmh"]) == ("140", "66"), "his own fields stay"
    table = told.text.partition("The trains that hold now")[2].partition("Leave mine")[0]
    assert re.search(r">155<", table)
    assert re.search(r">80<", table)
    assert owner.post(f"{plan}/trains", shown).status_code == 303, "knowing of it, he may"
    rows = as_stored(app, plan).decided.traffic
    assert rows is not None
    assert [row.speed_kmh for row in rows.rows] == [140.0, 66.0]
    assert kinds(app, plan)[-2:] == [("traffic", "Bea Moss"), ("traffic", "")]
    # What he sends after that knows of everything again.
    assert owner.post(f"{plan}/trains", fields(owner.get(f"{plan}/trains"), "")).status_code == 303


def test_told_of_one_decision_he_is_told_of_the_next_too(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    mine = fields(owner.get(f"{plan}/trains"), "")
    for speed in ("150", "151"):
        theirs = fields(editor.get(f"{plan}/trains"), "")
        assert editor.post(f"{plan}/trains", {**theirs, "0-speed_kmh": speed}).status_code == 303
        told = owner.post(f"{plan}/trains", {**mine, "1-speed_kmh": "66"})
        assert told.status_code == 409
        mine = fields(told, "")
    assert mine["1-speed_kmh"] == "66"
    assert owner.post(f"{plan}/trains", mine).status_code == 303


def test_limits_are_read_against_the_page_that_showed_them(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    """Rows are counted: one that another left out meanwhile must not shift what is typed to its neighbour."""
    mine = fields(owner.get(f"{plan}/limits"), "/limits")
    theirs = fields(editor.get(f"{plan}/limits"), "/limits")
    first = as_stored(app, plan).decided.limits
    assert first is not None
    last = len(first.rows) - 1
    assert editor.post(f"{plan}/limits", {**theirs, "0-remove": "yes"}).status_code == 303
    told = owner.post(f"{plan}/limits", {**mine, f"{last}-note": "as agreed", "0-remove": ""})
    assert told.status_code == 409
    assert "Bea Moss changed the limits" in told.text
    assert "The values that hold now" in told.text
    now = as_stored(app, plan).decided.limits
    assert now is not None
    assert now.rows == first.rows[1:]
    sent = fields(told, "/limits")
    assert sent[f"{last}-note"] == "as agreed"
    assert owner.post(f"{plan}/limits", sent).status_code == 303
    kept = as_stored(app, plan).decided.limits
    assert kept is not None
    assert kept.rows[:-1] == first.rows[:-1]
    assert kept.rows[-1].note == "as agreed"


def test_a_mistake_in_a_stale_form_still_knows_what_it_was_shown_with(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    mine = fields(owner.get(f"{plan}/limits"), "/limits")
    editor.post(f"{plan}/limits", {**fields(editor.get(f"{plan}/limits"), "/limits"), "0-remove": "yes"})
    wrong = owner.post(f"{plan}/limits", {**mine, "0-normal": "much"})
    assert wrong.status_code == 422
    sent = fields(wrong, "/limits")
    assert sent["known"] == mine["known"]
    assert sent["0-normal"] == "much"
    assert owner.post(f"{plan}/limits", {**sent, "0-normal": "151"}).status_code == 409


def test_settings_of_two_people(app: Flask, owner: Browser, editor: Browser, plan: str) -> None:
    mine = fields(owner.get(f"{plan}/limits"), "/choice")
    theirs = fields(editor.get(f"{plan}/limits"), "/choice")
    assert editor.post(f"{plan}/choice", {**theirs, "method": "balanced"}).status_code == 303
    told = owner.post(f"{plan}/choice", {**mine, "method": "fraction", "today_within_mm": "12"})
    assert told.status_code == 409
    assert "Bea Moss changed how cants are chosen" in told.text
    facts = told.text.partition("What holds now")[2].partition("Leave mine")[0]
    assert "<dd>balanced</dd>" in facts
    sent = fields(told, "/choice")
    assert sent["today_within_mm"] == "12"
    assert "<option selected>fraction</option>" in told.text
    assert owner.post(f"{plan}/choice", {**sent, "method": "fraction"}).status_code == 303
    found = as_stored(app, plan).decided.settings
    assert found is not None
    assert (found.method, found.today_within_mm) == ("fraction", 12.0)


def test_answers_of_two_people(app: Flask, owner: Browser, editor: Browser, plan: str) -> None:
    page = owner.get(f"{plan}/list")
    mine, theirs = fields(page, ""), fields(editor.get(f"{plan}/list"), "")
    speed, cant = (
        next(name for name, value in mine.items() if value == meaning) for meaning in ("Speed", "Cant")
    )
    assert editor.post(f"{plan}/list", {**theirs, speed: ""}).status_code == 303
    told = owner.post(f"{plan}/list", {**mine, cant: ""})
    assert told.status_code == 409
    assert "Bea Moss changed how the list is read" in told.text
    assert "What you had sent, and was not kept" in told.text
    assert re.search(r"<li>Column J Cant: read as nothing</li>", told.text)
    answers = as_stored(app, plan).decided.answers
    assert answers is not None
    assert answers["columns"][""].keys() == {"K"}
    assert owner.post(f"{plan}/list", {**fields(told, ""), cant: ""}).status_code == 303
    answers = as_stored(app, plan).decided.answers
    assert answers is not None
    assert answers["columns"][""].keys() == {"J", "K"}, "both stand together now"
    stale = fields(owner.get(f"{plan}/list"), "/list/forget")
    editor.post(f"{plan}/list", {**fields(editor.get(f"{plan}/list"), ""), cant: "Cant"})
    assert owner.post(f"{plan}/list/forget", stale).status_code == 409


@pytest.mark.parametrize("path", ["/limits/choose", "/trains/forget", "/limits/file", "/trains/file"])
def test_what_is_taken_with_one_press_is_told_too(
    app: Flask, owner: Browser, editor: Browser, plan: str, path: str
) -> None:
    page = "/limits" if path.startswith("/limits") else "/trains"
    mine = fields(owner.get(f"{plan}{page}"), path)
    if page == "/limits":
        changed = {**fields(editor.get(f"{plan}/limits"), "/limits"), "0-remove": "yes"}
        table = b"Quantity,Normal,Unit\ncant,140,mm\n"
    else:
        changed = {**fields(editor.get(f"{plan}/trains"), ""), "0-speed_kmh": "155"}
        table = b"Class,Category,Speed (km/h)\nLocal,passenger,90\n"
    assert editor.post(f"{plan}{page}", changed).status_code == 303
    before = as_stored(app, plan)
    sent: dict[str, object] = {**mine, "source": "set:typical"}

    def with_file(known: dict[str, str]) -> dict[str, object]:
        return {**sent, **known, **({"file": (io.BytesIO(table), "t.csv")} if "file" in path else {})}

    told = owner.post(f"{plan}{path}", with_file({}))
    assert told.status_code == 409
    assert "Bea Moss changed" in told.text
    assert as_stored(app, plan) == before
    again = fields(told, path)
    assert owner.post(f"{plan}{path}", with_file(again)).status_code == 303
    assert len(as_stored(app, plan).history) == len(before.history) + 1


def test_cants_are_not_asked_for_under_what_was_not_seen(app: Flask, owner: Browser) -> None:
    made = owner.post("/plans", {"file": (io.BytesIO(CURVES.encode()), "aldmere.csv")})
    plan = made.headers["Location"].removesuffix("/list")
    owner.post(f"{plan}/trains", dict(TRAINS))
    owner.post(f"{plan}/limits/choose", {"source": "set:typical"})
    editor = opened(Browser(app), share(owner, plan, "edit"), who="Bea Moss")
    mine = fields(owner.get(f"{plan}/limits"), "/confirm")
    editor.post(f"{plan}/choice", {**fields(editor.get(f"{plan}/limits"), "/choice"), "method": "balanced"})
    told = owner.post(f"{plan}/confirm", mine)
    assert told.status_code == 409
    assert not as_stored(app, plan).decided.confirmed
    assert owner.post(f"{plan}/confirm", fields(told, "/confirm")).status_code == 303


def test_cants_held_on_two_curves_both_hold_and_on_one_are_told(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    pages = {n: fields(owner.get(f"{plan}/curves/{n}"), f"/curves/{n}/hold") for n in (1, 2)}
    theirs = fields(editor.get(f"{plan}/curves/1"), "/curves/1/hold")
    taken = {**theirs, "cant": "55", "because": "ballast", "who": "Bea Moss"}
    assert editor.post(f"{plan}/curves/1/hold", taken).status_code == 303
    sent = {"cant": "70", "because": "drainage", "who": "Ann"}
    assert owner.post(f"{plan}/curves/2/hold", {**pages[2], **sent}).status_code == 303
    told = owner.post(f"{plan}/curves/1/hold", {**pages[1], **sent})
    assert told.status_code == 409
    assert "Bea Moss changed this curve" in told.text
    assert re.search(r"cant held at 55\s+mm", told.text)
    again = fields(told, "/curves/1/hold")
    assert (again["cant"], again["because"], again["who"]) == ("70", "drainage", "Ann")
    assert len(as_stored(app, plan).decided.changes) == 2
    assert owner.post(f"{plan}/curves/1/hold", again).status_code == 303
    words = [" ".join(one.words.split()) for one in as_stored(app, plan).decided.changes]
    assert sorted(words) == ["Curve A1: cant held at 70 mm", "Curve A2: cant held at 70 mm"]
    events = [one for one in as_stored(app, plan).history if one.kind == "change"]
    assert [one.who for one in events] == ["Bea Moss", "Ann", "Ann"]


def test_a_proposal_is_not_kept_over_what_came_meanwhile(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    mine = fields(owner.get(f"{plan}/limits"), "/choice")
    shown = owner.post(f"{plan}/choice", {**mine, "method": "balanced", "compare": "yes"})
    assert shown.status_code == 200
    keep = FormFields(shown.text, "/keep-proposal").sent
    theirs = fields(editor.get(f"{plan}/limits"), "/choice")
    editor.post(f"{plan}/choice", {**theirs, "method": "fraction"})
    told = owner.post(f"{plan}/keep-proposal", {**keep, "because": "calmer", "who": "Ann"})
    assert told.status_code == 409
    assert "Bea Moss changed how cants are chosen" in told.text
    found = as_stored(app, plan).decided.settings
    assert found is not None
    assert found.method == "fraction"
    again = FormFields(told.text, "/keep-proposal").sent
    assert again["because"] == "calmer"
    assert owner.post(f"{plan}/keep-proposal", again).status_code == 303
    assert kinds(app, plan)[-2:] == [("settings", "Bea Moss"), ("settings", "Ann")]


def test_the_same_decision_twice_is_no_clash_and_other_kinds_are_none(
    app: Flask, owner: Browser, editor: Browser, plan: str
) -> None:
    mine = fields(owner.get(f"{plan}/limits"), "/choice")
    trains = fields(owner.get(f"{plan}/trains"), "")
    theirs = fields(editor.get(f"{plan}/limits"), "/choice")
    editor.post(f"{plan}/choice", {**theirs, "method": "balanced"})
    assert owner.post(f"{plan}/choice", {**mine, "method": "balanced"}).status_code == 303
    assert owner.post(f"{plan}/trains", {**trains, "0-speed_kmh": "120"}).status_code == 303
    assert kinds(app, plan)[-2:] == [("settings", "Bea Moss"), ("traffic", "")]


@pytest.mark.parametrize("known", ["x", "-1", "99999999999", "", "999"])
def test_forged_counts_are_those_of_now(app: Flask, owner: Browser, plan: str, known: str) -> None:
    sent = {"known": known, "base": known, "method": "balanced"}
    assert owner.post(f"{plan}/choice", sent).status_code == 303


def test_of_two_at_the_same_moment_one_is_told(app: Flask, owner: Browser, plan: str) -> None:
    stored = as_stored(app, plan)
    store = running_of(app).store
    with running_of(app).database.sessions() as session:
        who = session.scalars(select(PlanRow.owner)).one()
    known = len(stored.history)
    sets = [limits_text(limit_sets.load(name)) for name in limit_sets.names()[:4]]
    other = [text for text in sets if text != stored.decided.texts["limits"]][:3]

    def decide(content: str) -> bool:
        try:
            store.decide(who, stored.address, {"limits": content}, known=known)
        except MeanwhileError:
            return False
        return True

    with ThreadPoolExecutor(3) as pool:
        kept = list(pool.map(decide, other))
    assert sorted(kept) == [False] * (len(other) - 1) + [True]
    assert len(as_stored(app, plan).history) == known + 1


def test_a_program_that_tells_what_it_knows_is_told(app: Flask) -> None:
    program = app.test_client(use_cookies=False)
    made = program.post("/api/v1/plans", data={"file": (io.BytesIO(CURVES.encode()), "a.csv")}).json
    assert made is not None
    key = {"Authorization": f"Bearer {made['key']}"}
    path = f"/api/v1/plans/{made['address']}"
    one, other = {"name": "typical"}, {"name": limit_sets.names()[-1]}
    assert program.put(f"{path}/limits?known={made['steps']}", headers=key, json=one).status_code == 200
    refused = program.put(f"{path}/limits?known={made['steps']}", headers=key, json=other)
    assert refused.status_code == 409
    assert refused.json is not None
    assert "changed the limits" in refused.json["error"]["message"]
    assert program.put(f"{path}/limits?known=soon", headers=key, json=other).status_code == 422
    steps = (program.get(path, headers=key).json or {})["steps"]
    assert program.put(f"{path}/limits?known={steps}", headers=key, json=other).status_code == 200
    assert program.put(f"{path}/limits", headers=key, json=one).status_code == 200
