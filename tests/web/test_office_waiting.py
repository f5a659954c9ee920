"""Long work as people and programs meet it: pages that wait, go on, cancel and begin again; 202 and after."""

from __future__ import annotations

import io
import json
import re
from collections.abc import Callable
from html import unescape
from pathlib import Path

import pytest
from flask import Flask
from openpyxl import load_workbook
from sqlalchemy import select, update
from web_tools import TRAINS, Browser, FormFields
from work_tools import EVERYTHING, parts_of, piece_shown, planned_sample, work_off, worked

from webapp.keeping.records import ResultRow, WorkRow
from webapp.working import orders
from webapp.working.settings import Work
from webapp.working.worker import do_waiting

NONSENSE = b"this is no table\n" * 40


@pytest.fixture
def long(start: Callable[..., Flask], database_url: str) -> Flask:
    """Give a service in which every list is long, on each kind of database."""
    return start(database_url, work=EVERYTHING)


def test_the_way_of_a_long_list_without_script(long: Flask, bare_list: Path) -> None:
    browser = Browser(long)
    path = browser.upload(bare_list)
    waiting = browser.get(f"{path}/list")
    assert waiting.status_code == 202
    assert f'content="2; url={path}/list"' in waiting.text
    assert "Reading the list" in browser.get("/").text
    assert worked(long, lambda: browser.get(f"{path}/list")).status_code == 200
    assert "Reading the list" not in browser.get("/").text
    sent = browser.post(f"{path}/trains", TRAINS)
    assert sent.status_code == 202
    assert work_off(long) == 1
    fields = FormFields(sent.text, "/trains").sent
    assert {k: v for k, v in fields.items() if k != "token"} == TRAINS
    assert browser.client.post(f"{path}/trains", data=fields).status_code == 303
    answer = worked(long, lambda: browser.post(f"{path}/limits/choose", {"source": "set:typical"}))
    assert answer.status_code == 303
    assert worked(long, lambda: browser.post(f"{path}/confirm")).status_code == 303
    page = browser.get(f"{path}/cants")
    assert page.status_code == 200, "what was confirmed has been planned"
    assert "Cants of 3 curves" in page.text


def test_background_and_request_give_the_same(
    start: Callable[..., Flask], long: Flask, database_url: str
) -> None:
    browser = Browser(long)
    path = planned_sample(long, browser)
    short = start(database_url)
    same = Browser(short)
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    same.client.set_cookie("cant", cookie.value)
    at_once = json.loads(same.get(f"{path}/plan.json").data)
    waiting = browser.get(f"{path}/plan.json")
    assert waiting.status_code == 302
    assert "Writing the plan as JSON" in browser.get(waiting.headers["Location"]).text
    work_off(long)
    ready = browser.get(waiting.headers["Location"])
    assert ready.status_code == 200
    assert f'href="{path}/plan.json"' in ready.text
    later = json.loads(browser.get(f"{path}/plan.json").data)
    assert later == at_once
    book = worked_away(long, browser, f"{path}/workbook?units=us")
    direct = load_workbook(io.BytesIO(same.get(f"{path}/workbook?units=us").data))
    made = load_workbook(io.BytesIO(book))
    assert made.sheetnames == direct.sheetnames
    for name in made.sheetnames:
        assert list(made[name].values) == list(direct[name].values)


def worked_away(app: Flask, browser: Browser, path: str) -> bytes:
    """Take a file away that is made in the background."""
    if browser.get(path).status_code == 302:
        assert work_off(app) > 0
    answer = browser.get(path)
    assert answer.status_code == 200
    assert "attachment" in answer.headers["Content-Disposition"]
    return bytes(answer.data)


def test_a_proposal_goes_on_after_its_work(long: Flask, tmp_path: Path) -> None:
    browser = Browser(long)
    path = planned_sample(long, browser)
    file = b"Quantity,Normal,Unit\ncant,160,mm\ncant deficiency,100,mm\ncant excess,90,mm\n"
    given = {"file": (io.BytesIO(file), "ours.csv"), "compare": "1"}
    waiting = browser.post(f"{path}/limits/file", given)
    assert waiting.status_code == 202
    form = FormFields(waiting.text, "/compare").sent
    assert set(form) == {"token", "proposal"}, "the file itself is not sent again"
    answer = worked(long, lambda: browser.client.post(f"{path}/compare", data=form))
    assert answer.status_code == 200
    assert "What this would change" in answer.text
    assert "ours.csv" in answer.text
    keep = {**FormFields(answer.text, "/keep-proposal").sent, "because": "agreed with the office"}
    assert worked(long, lambda: browser.client.post(f"{path}/keep-proposal", data=keep)).status_code == 303
    assert worked(long, lambda: browser.get(f"{path}/cants")).status_code == 200
    plain = {"file": (io.BytesIO(file.replace(b"160", b"150")), "mine.csv")}
    waiting = browser.post(f"{path}/limits/file", plain)
    form = FormFields(waiting.text, "/limits/file").sent
    assert worked(long, lambda: browser.client.post(f"{path}/limits/file", data=form)).status_code == 303
    assert "150" in browser.get(f"{path}/limits").text


def test_cancel_and_start_again_by_hand(long: Flask) -> None:
    browser = Browser(long)
    path = browser.sample()
    waiting = browser.get(f"{path}/cants")
    action = piece_shown(waiting).removeprefix("/api/v1")
    stop = FormFields(waiting.text, "/stop").sent
    cancelled = browser.client.post(f"{action}/stop", data=stop)
    assert cancelled.status_code == 409
    assert "was cancelled" in cancelled.text
    assert work_off(long) == 0
    shown = browser.get(f"{path}/cants")
    assert shown.status_code == 409
    form = FormFields(shown.text, "/again").sent
    again = browser.client.post(f"{action}/again", data=form)
    assert (again.status_code, again.headers["Location"]) == (303, f"{path}/cants")
    assert worked(long, lambda: browser.get(f"{path}/cants")).status_code == 200


def test_a_cancelled_form_is_carried_on_when_it_starts_again(long: Flask) -> None:
    browser = Browser(long)
    path = planned_sample(long, browser)
    waiting = browser.post(f"{path}/limits/choose", {"source": "set:typical", "compare": "1"})
    action = piece_shown(waiting).removeprefix("/api/v1")
    stopped = browser.client.post(f"{action}/stop", data=FormFields(waiting.text, "/stop").sent)
    again = browser.client.post(f"{action}/again", data=FormFields(stopped.text, "/again").sent)
    assert again.status_code == 202
    form = FormFields(again.text, "/compare").sent
    answer = worked(long, lambda: browser.client.post(f"{path}/compare", data=form))
    assert "What this would change" in answer.text


@pytest.mark.parametrize(
    "then",
    ["//elsewhere.example/", "https://elsewhere.example/", "/plans/other/cants", "{path}/../other/cants"],
)
def test_a_waiting_page_leads_nowhere_else(long: Flask, then: str) -> None:
    browser = Browser(long)
    path = browser.sample()
    then = then.format(path=path)
    work = piece_shown(browser.get(f"{path}/cants")).removeprefix("/api/v1")
    for answer in (
        browser.get(work, query_string={"then": then}),
        browser.post(f"{work}/again", {"then": then}),
    ):
        shown = re.sub(r'name="back" value="[^"]*"', "", answer.text) + answer.headers.get("Location", "")
        assert "elsewhere" not in shown
        assert "other/cants" not in shown


def test_failed_work_says_why_and_can_start_again(long: Flask, monkeypatch: pytest.MonkeyPatch) -> None:
    browser = Browser(long)
    path = browser.sample()
    assert browser.get(f"{path}/cants").status_code == 202

    def fail(*_given: object, **_more: object) -> None:
        message = "<b>a secret of the program</b>"
        raise ZeroDivisionError(message)

    with monkeypatch.context() as broken:
        broken.setattr("cant.service.make_plan", fail)
        assert work_off(long) == 1
    shown = browser.get(f"{path}/cants")
    assert shown.status_code == 409
    assert "reference" in shown.text
    assert "secret" not in shown.text
    action = FormFields(shown.text, "/again")
    work = next(piece for piece in browser.get(f"/api/v1{path}/pieces").get_json()["work"])
    assert work["state"] == "failed"
    assert browser.client.post(f"{path}/pieces/{work['id']}/again", data=action.sent).status_code == 303
    assert worked(long, lambda: browser.get(f"{path}/cants")).status_code == 200


def test_another_version_does_not_do_the_work(long: Flask, monkeypatch: pytest.MonkeyPatch) -> None:
    browser = Browser(long)
    path = browser.sample()
    assert browser.get(f"{path}/cants").status_code == 202
    with monkeypatch.context() as upgraded:
        upgraded.setattr(orders, "program", lambda: "a later version")
        assert work_off(long) == 1
    shown = browser.get(f"{path}/cants")
    assert shown.status_code == 409
    assert "another version" in shown.text


def test_a_long_list_that_cannot_be_read_says_why_and_can_be_deleted(long: Flask, tmp_path: Path) -> None:
    browser = Browser(long)
    file = tmp_path / "wrong.csv"
    file.write_bytes(NONSENSE)
    path = browser.upload(file)
    assert browser.get(f"{path}/list").status_code == 202
    work_off(long)
    shown = browser.get(f"{path}/list")
    assert shown.status_code == 422
    assert "no curve table found" in unescape(shown.text)
    assert f"{path}/delete" in shown.text
    assert browser.get(f"{path}/original").data == NONSENSE
    answer = worked(long, lambda: browser.get(f"/api/v1{path}/result"))
    assert answer.status_code == 422
    assert "no curve table found" in answer.get_json()["error"]["message"]
    assert browser.post(f"{path}/delete").status_code == 303
    assert browser.get(f"{path}/list").status_code == 404


def test_a_program_asks_and_comes_back(long: Flask, bare_list: Path) -> None:
    client = long.test_client()
    traffic = (
        b"Class,Category,Speed,Trains per day,Mass\nFast,passenger,140,20,400\nGoods,freight,80,30,1500\n"
    )
    limits = b"Quantity,Normal,Unit\ncant,160,mm\ncant deficiency,100,mm\ncant excess,90,mm\n"
    given = {
        "file": (io.BytesIO(bare_list.read_bytes()), "list.csv"),
        "traffic": (io.BytesIO(traffic), "traffic.csv"),
        "limits": (io.BytesIO(limits), "limits.csv"),
    }
    made = client.post("/api/v1/plans", data=given)
    assert made.status_code == 201
    plan = made.get_json()
    key = {"Authorization": f"Bearer {plan['key']}"}
    base = f"/api/v1/plans/{plan['address']}"
    listed = client.get(f"{base}/pieces", headers=key).get_json()["work"]
    assert [one["what"] for one in listed] == ["reading the list"], "reading begins without being asked for"
    answer = client.get(f"{base}/result", headers=key)
    assert answer.status_code == 202
    assert int(answer.headers["Retry-After"]) > 0
    told = answer.get_json()
    assert (told["state"], told["share"], told["before"]) == ("waiting", 0.0, 1)
    at = answer.headers["Location"]
    assert at == told["links"]["self"]
    assert client.delete(at, headers=key).get_json()["state"] == "cancelled"
    refused = client.get(f"{base}/result", headers=key)
    assert refused.status_code == 409
    assert at in refused.get_json()["error"]["message"]
    assert client.post(at, headers=key).get_json()["state"] == "waiting"
    work_off(long)
    assert client.get(at, headers=key).get_json()["state"] == "done"
    result = client.get(f"{base}/result", headers=key)
    assert result.status_code == 202, "the plan is there, and now its JSON is made"
    work_off(long)
    assert len(client.get(f"{base}/result", headers=key).get_json()["curves"]) == 3
    assert client.get(f"{base}/curves", headers=key).get_json()["total"] == 3
    other = {"rows": [{"name": "Fast", "category": "passenger", "speed_kmh": 120}]}
    assert client.put(f"{base}/traffic", json=other, headers=key).status_code == 202
    work_off(long)
    assert client.put(f"{base}/traffic", json=other, headers=key).status_code == 200
    stranger = {
        "Authorization": f"Bearer {long.test_client().post('/api/v1/plans', data=again()).get_json()['key']}"
    }
    for method, path in (("get", f"{base}/pieces"), ("get", at), ("delete", at), ("post", at)):
        assert getattr(long.test_client(), method)(path, headers=stranger).status_code == 404


def again() -> dict[str, tuple[io.BytesIO, str]]:
    """Give a list to upload."""
    return {"file": (io.BytesIO(b"Curve,Radius (m)\n1,500\n"), "x.csv")}


def test_a_tampered_result_is_not_used(long: Flask) -> None:
    browser = Browser(long)
    path = planned_sample(long, browser)
    database = parts_of(long).database
    with database.sessions.begin() as session:
        row = session.scalars(select(ResultRow).where(ResultRow.kind == "plan")).one()
        evil = row.data[:-1] + bytes([row.data[-1] ^ 1])
        session.execute(update(ResultRow).where(ResultRow.id == row.id).values(data=evil))
    parts_of(long).computations.__init__(8, 1000, parts_of(long).background, 0)  # type: ignore[misc]
    assert browser.get(f"{path}/cants").status_code == 202, "it is made anew"
    with database.sessions() as session:
        assert session.scalars(select(ResultRow.id).where(ResultRow.kind == "plan")).all() == []
    assert worked(long, lambda: browser.get(f"{path}/cants")).status_code == 200


def test_a_closed_page_loses_nothing(start: Callable[..., Flask], long: Flask, database_url: str) -> None:
    browser = Browser(long)
    path = browser.sample()
    assert browser.get(f"{path}/cants").status_code == 202
    assert "waiting" in browser.get("/").text
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    other_process = start(database_url, work=EVERYTHING)
    parts = parts_of(other_process)
    assert do_waiting(parts.config, parts.database) == 1
    later = Browser(other_process)
    later.client.set_cookie("cant", cookie.value)
    assert later.get(f"{path}/cants").status_code == 200
    assert browser.get(f"{path}/cants").status_code == 200


def test_too_much_waiting_is_a_clean_busy(start: Callable[..., Flask]) -> None:
    app = start(work=Work(long_file_kb=0, waiting_per_person=2))
    browser = Browser(app)
    for _ in range(2):
        assert browser.get(f"{browser.sample()}/cants").status_code == 202
    path = browser.sample()
    full = browser.get(f"{path}/cants")
    assert full.status_code == 503
    assert int(full.headers["Retry-After"]) > 0
    key = {"Accept": "application/json"}
    assert browser.get(f"{path}/cants", headers=key).get_json()["error"]["status"] == 503
    work_off(app)
    assert browser.get(f"{path}/cants").status_code == 202, "the plan was stored whole and is taken up now"


def test_a_short_list_waits_for_nothing(start: Callable[..., Flask]) -> None:
    app = start()
    browser = Browser(app)
    path = browser.sample()
    for page in ("cants", "workbook", "plan.json"):
        assert browser.get(f"{path}/{page}").status_code == 200
    with parts_of(app).database.sessions() as session:
        assert session.scalars(select(WorkRow)).all() == []


def test_a_comparison_waits_for_the_other_plan(long: Flask, tmp_path: Path, sample_file: Path) -> None:
    browser = Browser(long)
    older = browser.sample()
    file = tmp_path / "revised.xlsx"
    file.write_bytes(sample_file.read_bytes() + b"\0")
    revised = browser.upload(file)
    assert worked(long, lambda: browser.post(f"{revised}/confirm")).status_code == 303
    path = f"{revised}/compare?with={older.removeprefix('/plans/')}"
    waiting = browser.get(path)
    assert waiting.status_code == 202
    work = piece_shown(waiting)
    assert work.startswith(f"/api/v1{older}/pieces/"), "the work is the other plan's"
    assert browser.get(work).get_json()["state"] == "waiting"
    stop = FormFields(waiting.text, "/stop").sent
    stopped = browser.client.post(f"{work.removeprefix('/api/v1')}/stop", data=stop)
    again = FormFields(stopped.text, "/again").sent
    back = browser.client.post(f"{work.removeprefix('/api/v1')}/again", data=again)
    assert (back.status_code, back.headers["Location"]) == (303, path)
    assert "Two plans compared" in worked(long, lambda: browser.get(path)).text
