"""Signing off a plan: three people, each over the plan as it is; void with the next decision, never gone."""

from __future__ import annotations

import io
import json
import re
import threading
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from typing import Any

import pytest
from flask import Flask
from openpyxl import load_workbook
from people_tools import PASSWORD, database_of, made, people_of, row_of, set_account, signed_in
from sharing_tools import opened, share
from sqlalchemy import delete, select, update
from test_web_guards import PAGES, POSTS
from web_tools import TRAINS, Browser
from work_tools import EVERYTHING, work_off, worked

from webapp.keeping.access import NotAllowedError
from webapp.keeping.records import AccountRow, GrantRow, PlanRow, SignatureRow
from webapp.keeping.signatures import SignOff
from webapp.people import signing
from webapp.people.settings import SignIn

Crew = dict[str, Browser]
NASTY = '=HYPERLINK("http://x")<script>alert(1)</script>{{ 7*7 }}\''


@pytest.fixture
def crew(office: Flask) -> Crew:
    """Give four people: Anna prepares, Bo checks, Cleo approves, Dora has every role."""
    made(office, "bo", ["check"], "Bo Lind")
    made(office, "cleo", ["approve"], "Cleo Marsh")
    made(office, "dora", ["prepare", "check", "approve"])
    return {name: signed_in(office, name) for name in ("anna", "bo", "cleo", "dora")}


@pytest.fixture
def plan(crew: Crew) -> str:
    """Give the address of a plan of Anna's."""
    return crew["anna"].sample()


def number_of(app: Flask, name: str) -> str:
    """Give the number of an account."""
    return str(row_of(app, name).id)


def sign(browser: Browser, plan: str, to: str = "", **sent: str) -> Any:
    """Sign what the page shows, and hand the plan on."""
    page = browser.get(f"{plan}/sign-off").text
    digest = re.search(r'name="digest" value="(\w{64})"', page)
    form = {"digest": digest.group(1) if digest else "", "password": PASSWORD, "to": to, **sent}
    return browser.post(f"{plan}/sign-off", form)


def signed_off(office: Flask, crew: Crew, plan: str) -> None:
    """Let Anna, Bo and Cleo sign."""
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303
    assert sign(crew["bo"], plan, number_of(office, "cleo")).status_code == 303
    assert sign(crew["cleo"], plan).status_code == 303


def decide(browser: Browser, plan: str) -> None:
    """Decide something on a plan."""
    sent = {"units": "metric", "cant": "50", "because": "as agreed"}
    answer = browser.post(f"{plan}/curves/1/hold", sent)
    assert answer.status_code == 303, answer.text


def fates(browser: Browser, plan: str) -> list[str]:
    """Give what the history says of each signature, the last first."""
    return re.findall(r"<strong[^>]*>([^<]+)</strong></p>", browser.get(f"{plan}/sign-off").text)


def block_of(browser: Browser, plan: str) -> list[list[Any]]:
    """Give the block of signatures in the workbook."""
    sheet = load_workbook(io.BytesIO(browser.get(f"{plan}/workbook").data))["Plan summary"]
    assert not [cell for row in sheet.iter_rows() for cell in row if cell.data_type == "f"]
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    return rows[next(i for i, row in enumerate(rows) if row[1] == "Name") :]


def test_three_people_sign_and_the_signatures_go_into_workbook_and_print(
    office: Flask, crew: Crew, plan: str
) -> None:
    anna, bo, cleo = crew["anna"], crew["bo"], crew["cleo"]
    assert bo.get(f"{plan}/cants").status_code == 404
    offered = anna.get(f"{plan}/sign-off").text
    assert "Bo Lind (bo)" in offered
    assert "Cleo" not in offered
    assert sign(anna, plan, number_of(office, "bo"), note="please by Friday").status_code == 303
    start = bo.get("/").text
    assert "For you to check" in start
    assert "please by Friday" in start
    assert "For you to" not in cleo.get("/").text
    assert bo.get(f"{plan}/cants").status_code == 200
    assert sign(bo, plan, number_of(office, "cleo")).status_code == 303
    assert "For you to check" not in bo.get("/").text
    assert "For you to approve" in cleo.get("/").text
    assert sign(cleo, plan).status_code == 303
    page = anna.get(f"{plan}/sign-off").text
    assert "prepared, checked and approved" in page
    assert fates(anna, plan) == ["holds"] * 3
    today = f"{datetime.now(UTC):%Y-%m-%d}"
    names = ["Anna Holt (anna)", "Bo Lind (bo)", "Cleo Marsh (cleo)"]
    block = block_of(anna, plan)
    assert [(row[0], row[1], row[5]) for row in block[1:4]] == [
        (step, name, today) for step, name in zip(("Prepared", "Checked", "Approved"), names, strict=True)
    ]
    digest = re.search(r"<code>(\w{64})</code>", page).group(1)
    assert any(digest in str(value) for row in block for value in row)
    for address in ("/print", "/cants"):
        shown = anna.get(f"{plan}{address}").text
        assert all(name in shown for name in names), address


def test_digest_is_over_file_decisions_and_program(crew: Crew, plan: str, office: Flask) -> None:
    store = office.extensions["cant"].store
    before = store.plan(people_of(office).accounts.named("anna").who, plan.rpartition("/")[2])
    digest = signing.digest_of(before)
    decide(crew["anna"], plan)
    after = store.plan(people_of(office).accounts.named("anna").who, before.address)
    assert len({digest, signing.digest_of(after), signing.digest_of(before, "0.0.0")}) == 3
    other = crew["anna"].sample().rpartition("/")[2]
    assert signing.digest_of(store.plan(people_of(office).accounts.named("anna").who, other)) != digest


def test_decision_makes_every_signature_void_and_none_disappears(
    office: Flask, crew: Crew, plan: str
) -> None:
    anna = crew["anna"]
    signed_off(office, crew, plan)
    decide(anna, plan)
    assert fates(anna, plan) == ["void: the plan changed after it"] * 3
    assert "The plan as it is now has not been signed." in anna.get(f"{plan}/sign-off").text
    assert not any(row[1] for row in block_of(anna, plan)[1:4])
    key = re.search(r"/changes/([^/]+)/back", anna.get(f"{plan}/history").text).group(1)
    assert anna.post(f"{plan}/changes/{key}/back").status_code == 303
    assert fates(anna, plan) == ["void: the plan changed after it"] * 3  # taken back is one decision more
    assert sign(anna, plan, number_of(office, "bo")).status_code == 303
    assert fates(anna, plan) == ["holds"] + ["void: the plan changed after it"] * 3


@pytest.mark.parametrize(
    ("page", "sent"),
    [
        ("/choice", {"method": "least", "tiers": "normal", "units": "metric"}),
        ("/limits/choose", {"source": "set:typical"}),
        ("/trains", TRAINS),
    ],
)
def test_every_kind_of_decision_voids(
    office: Flask, crew: Crew, plan: str, page: str, sent: dict[str, str]
) -> None:
    assert sign(crew["anna"], plan).status_code == 303
    answer = crew["anna"].post(f"{plan}{page}", dict(sent))
    assert answer.status_code == 303, answer.text
    assert fates(crew["anna"], plan) == ["void: the plan changed after it"]


def test_another_version_of_the_program_voids(
    office: Flask, crew: Crew, plan: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert sign(crew["anna"], plan).status_code == 303
    old = signing.__version__
    monkeypatch.setattr(signing, "__version__", "99.0")
    monkeypatch.setattr(signing.digest_of, "__defaults__", ("99.0",))
    said = f"void: signed with version {old} of the program, and this is 99.0"
    assert fates(crew["anna"], plan) == [said]
    assert sign(crew["anna"], plan).status_code == 303


def test_name_and_days_of_a_plan_are_no_decision(office: Flask, crew: Crew, plan: str) -> None:
    assert sign(crew["anna"], plan).status_code == 303
    assert crew["anna"].post(f"{plan}/name", {"name": "another name"}).status_code == 303
    assert crew["anna"].post(f"{plan}/keep").status_code == 303
    assert fates(crew["anna"], plan) == ["holds"]


# Four eyes


def test_who_prepared_neither_checks_nor_approves(office: Flask, crew: Crew) -> None:
    """Whatever roles he has, and whoever hands it to him."""
    dora = crew["dora"]
    plan = dora.sample()
    assert f'<option value="{number_of(office, "dora")}">' not in dora.get(f"{plan}/sign-off").text
    assert sign(dora, plan, number_of(office, "dora")).status_code == 422
    assert sign(dora, plan, number_of(office, "bo")).status_code == 303
    assert sign(dora, plan).status_code == 403
    assert sign(crew["bo"], plan, number_of(office, "dora")).status_code == 422
    assert sign(crew["bo"], plan, number_of(office, "cleo")).status_code == 303
    assert sign(dora, plan).status_code == 403
    assert sign(crew["cleo"], plan).status_code == 303


def test_who_checked_does_not_approve(office: Flask, crew: Crew, plan: str) -> None:
    dora = crew["dora"]
    assert sign(crew["anna"], plan, number_of(office, "dora")).status_code == 303
    assert sign(dora, plan, number_of(office, "dora")).status_code == 422
    assert sign(dora, plan).status_code == 303
    assert sign(dora, plan).status_code == 403
    hand_on = {"to": number_of(office, "dora")}
    assert dora.post(f"{plan}/sign-off/hand-on", hand_on).status_code == 422
    assert len(fates(dora, plan)) == 2


def test_who_may_change_a_plan_does_not_check_it(office: Flask, crew: Crew, plan: str) -> None:
    dora = crew["dora"]
    assert sign(crew["anna"], plan, number_of(office, "dora")).status_code == 303
    with database_of(office).sessions.begin() as session:
        grant = session.scalars(select(GrantRow)).one()
        session.add(
            GrantRow(
                plan_id=grant.plan_id, share_id=None, holder=grant.holder, may_edit=True, made=grant.made
            )
        )
    answer = sign(dora, plan)
    assert answer.status_code == 403
    assert "does not sign it as checked" in answer.text


def test_who_may_change_a_plan_no_more_does_not_sign_it_as_prepared(
    office: Flask, crew: Crew, plan: str
) -> None:
    """Until an expired link is cleared away its grant is still there; it lets nobody sign."""
    link, other = share(crew["anna"], plan, "edit"), share(crew["anna"], plan, "read")
    opened(opened(crew["dora"], link), other)
    with database_of(office).sessions.begin() as session:
        past = datetime.now(UTC) - timedelta(minutes=1)
        session.execute(update(GrantRow).where(GrantRow.may_edit.is_(True)).values(expires=past))
    answer = sign(crew["dora"], plan, number_of(office, "bo"))
    assert answer.status_code == 403
    assert "Only who may change a plan" in answer.text
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303


def test_who_has_decided_on_a_plan_does_not_check_it_later(office: Flask, crew: Crew, plan: str) -> None:
    """Though he may change it no more: a link to edit was withdrawn after he had used it."""
    dora = crew["dora"]
    with database_of(office).sessions.begin() as session:
        session.add(
            GrantRow(
                plan_id=session.scalars(select(PlanRow.id)).one(),
                share_id=None,
                holder=people_of(office).accounts.named("dora").who,
                may_edit=True,
                made=datetime.now(UTC),
            )
        )
    decide(dora, plan)
    with database_of(office).sessions.begin() as session:
        session.execute(delete(GrantRow))
    assert sign(crew["anna"], plan, number_of(office, "dora")).status_code == 422
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303


def test_owner_does_not_check_what_another_prepared_for_him(office: Flask, crew: Crew) -> None:
    plan = crew["dora"].sample()
    with database_of(office).sessions.begin() as session:
        anna = people_of(office).accounts.named("anna")
        number = session.scalars(select(PlanRow.id)).one()
        session.add(
            GrantRow(plan_id=number, share_id=None, holder=anna.who, may_edit=True, made=datetime.now(UTC))
        )
    assert sign(crew["anna"], plan, number_of(office, "dora")).status_code == 422
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303
    assert sign(crew["dora"], plan).status_code == 403


# Who may what, by every route


def test_without_the_role_nobody_signs(office: Flask, crew: Crew, plan: str) -> None:
    anna = crew["anna"]
    people_of(office).accounts.change(row_of(office, "anna").id, roles=["check", "approve"])
    assert sign(anna, plan).status_code == 403
    people_of(office).accounts.change(row_of(office, "anna").id, roles=["prepare"])
    assert sign(anna, plan, number_of(office, "bo")).status_code == 303
    people_of(office).accounts.change(row_of(office, "bo").id, roles=["prepare", "approve"])
    assert sign(crew["bo"], plan).status_code == 403
    people_of(office).accounts.change(row_of(office, "bo").id, roles=["check"])
    assert sign(crew["bo"], plan, number_of(office, "cleo")).status_code == 303
    people_of(office).accounts.change(row_of(office, "cleo").id, roles=["prepare", "check"])
    assert sign(crew["cleo"], plan).status_code == 403
    assert len(fates(anna, plan)) == 2


def test_only_in_whose_hand_it_is_signs(office: Flask, crew: Crew, plan: str) -> None:
    """Dora has every role, and reads the plan by a grant; it was not handed to her."""
    made(office, "emil", ["check"])
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303
    with database_of(office).sessions.begin() as session:
        grant = session.scalars(select(GrantRow)).one()
        for name in ("dora", "emil"):
            holder = people_of(office).accounts.named(name).who
            session.add(
                GrantRow(plan_id=grant.plan_id, share_id=None, holder=holder, may_edit=False, made=grant.made)
            )
    for browser in (crew["dora"], signed_in(office, "emil")):
        assert browser.get(f"{plan}/sign-off").status_code == 200
        assert sign(browser, plan).status_code == 403
        assert browser.post(f"{plan}/sign-off/back", {"note": "no"}).status_code == 403
        assert browser.post(f"{plan}/sign-off/hand-on", {"to": number_of(office, "emil")}).status_code == 403


def test_stranger_finds_nothing_to_sign(office: Flask, crew: Crew, plan: str) -> None:
    bo = crew["bo"]
    assert bo.get(f"{plan}/sign-off").status_code == 404
    for page in ("/sign-off", "/sign-off/back", "/sign-off/hand-on"):
        assert bo.post(f"{plan}{page}", {"password": PASSWORD, "note": "x"}).status_code == 404


def test_who_was_handed_a_plan_looks_at_everything_and_changes_nothing(
    office: Flask, crew: Crew, plan: str
) -> None:
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303
    bo = crew["bo"]
    crew["anna"].get("/")
    history = crew["anna"].get(f"{plan}/history").text
    for page in PAGES:
        wanted = (403,) if page in ("/delete", "/shares") else (200, 302)
        assert bo.get(f"{plan}{page}").status_code in wanted, page
    for page in POSTS:
        if page not in ("/compare", "/leave"):  # a look, and his own list
            assert bo.post(f"{plan}{page}", dict(TRAINS)).status_code < 500, page
    key = people_of(office).new_key(people_of(office).accounts.named("bo"), "x", 30)
    api, headers = office.test_client(), {"Authorization": f"Bearer {key}"}
    address = plan.rpartition("/")[2]
    assert api.get(f"/api/v1/plans/{address}", headers=headers).status_code == 200
    assert api.delete(f"/api/v1/plans/{address}", headers=headers).status_code == 403
    body = {"name": "typical"}
    assert api.put(f"/api/v1/plans/{address}/limits", headers=headers, json=body).status_code == 403
    assert without_tokens(crew["anna"].get(f"{plan}/history").text) == without_tokens(history)
    assert fates(crew["anna"], plan) == ["holds"]


def without_tokens(text: str) -> str:
    """Give a page without what differs every time."""
    return re.sub(r'value="[^"]{40,}"', "", text)


def test_key_of_a_program_does_not_sign(office: Flask, crew: Crew, plan: str) -> None:
    key = people_of(office).new_key(people_of(office).accounts.named("anna"), "x", 30)
    answer = office.test_client().post(f"{plan}/sign-off", headers={"Authorization": f"Bearer {key}"})
    assert answer.status_code == 401
    assert fates(crew["anna"], plan) == []


# What is asked of a signature


def test_plan_is_not_signed_before_its_cants_are_confirmed(office: Flask, crew: Crew, bare_list: Any) -> None:
    plan = crew["anna"].upload(bare_list)
    assert crew["anna"].get(f"{plan}/sign-off").headers["Location"] == f"{plan}/list"
    assert sign(crew["anna"], plan).status_code == 403
    with database_of(office).sessions() as session:
        assert session.scalars(select(SignatureRow)).all() == []


def test_plan_that_changed_since_it_was_shown_is_not_signed(office: Flask, crew: Crew, plan: str) -> None:
    anna = crew["anna"]
    page = anna.get(f"{plan}/sign-off").text
    digest = re.search(r'name="digest" value="(\w{64})"', page).group(1)
    decide(anna, plan)
    answer = anna.post(f"{plan}/sign-off", {"digest": digest, "password": PASSWORD})
    assert answer.status_code == 422
    assert "changed since you opened this page" in answer.text
    assert fates(anna, plan) == []


def test_signature_takes_the_password(office: Flask, crew: Crew, plan: str) -> None:
    for password in ("", "wrong"):
        assert sign(crew["anna"], plan, password=password).status_code == 422
    assert fates(crew["anna"], plan) == []


@pytest.mark.parametrize("to", ["999999", "-1", "x", "1e3", "٣", "9" * 30])
def test_plan_is_handed_to_nobody_who_is_not_there(office: Flask, crew: Crew, plan: str, to: str) -> None:
    assert sign(crew["anna"], plan, to).status_code == 422
    assert fates(crew["anna"], plan) == []


def test_plan_is_not_handed_to_who_is_disabled_or_lacks_the_role(
    office: Flask, crew: Crew, plan: str
) -> None:
    set_account(office, "bo", disabled=True)
    for name in ("bo", "cleo"):
        assert sign(crew["anna"], plan, number_of(office, name)).status_code == 422
    with database_of(office).sessions() as session:
        assert session.scalars(select(GrantRow)).all() == []


def test_sent_back_with_a_note_it_is_signed_anew(office: Flask, crew: Crew, plan: str) -> None:
    anna, bo = crew["anna"], crew["bo"]
    assert sign(anna, plan, number_of(office, "bo")).status_code == 303
    assert bo.post(f"{plan}/sign-off/back", {"note": "  "}).status_code == 422
    assert bo.post(f"{plan}/sign-off/back", {"note": "curve 104: why 90?"}).status_code == 303
    start = anna.get("/").text
    assert "Sent back to you" in start
    assert "curve 104: why 90?" in start
    assert fates(anna, plan) == ["holds no longer: the plan was sent back"]
    assert not any(row[1] for row in block_of(anna, plan)[1:4])
    assert sign(bo, plan).status_code == 403
    assert sign(anna, plan, number_of(office, "bo")).status_code == 303
    assert "Sent back to you" not in anna.get("/").text
    assert sign(bo, plan).status_code == 303
    assert fates(anna, plan) == ["holds", "holds", "holds no longer: the plan was sent back"]


def test_approver_sends_it_back_too_and_takes_back_his_own(office: Flask, crew: Crew, plan: str) -> None:
    signed_off(office, crew, plan)
    for name in ("anna", "bo"):
        assert crew[name].post(f"{plan}/sign-off/back", {"note": "no"}).status_code == 403
    assert crew["cleo"].post(f"{plan}/sign-off/back", {"note": "found a fault"}).status_code == 303
    assert fates(crew["anna"], plan) == ["holds no longer: the plan was sent back"] * 3


def test_handed_to_another_colleague_the_first_sees_it_no_more(office: Flask, crew: Crew, plan: str) -> None:
    made(office, "emil", ["check"])
    emil = signed_in(office, "emil")
    assert sign(crew["anna"], plan, number_of(office, "bo")).status_code == 303
    to = {"to": number_of(office, "emil")}
    assert crew["anna"].post(f"{plan}/sign-off/hand-on", to).status_code == 303
    assert crew["bo"].get(f"{plan}/cants").status_code == 404
    assert "For you to check" in emil.get("/").text
    assert sign(emil, plan).status_code == 303
    assert "Handed on" in emil.get(f"{plan}/sign-off").text


def test_names_and_notes_are_text_everywhere(office: Flask, crew: Crew) -> None:
    made(office, "fay", ["prepare"], NASTY[:80])
    set_account(office, "bo", full_name="@SUM(A1)<img src=x>")
    fay = signed_in(office, "fay")
    plan = fay.sample()
    assert sign(fay, plan, number_of(office, "bo"), note=NASTY).status_code == 303
    for browser, page in (
        (fay, "/"), (fay, "/account"), (fay, f"{plan}/sign-off"), (fay, f"{plan}/print"),
        (fay, f"{plan}/cants"), (crew["bo"], "/"), (crew["bo"], f"{plan}/sign-off"),
    ):  # fmt: skip
        text = browser.get(page).text
        assert "<script>alert" not in text, page
        assert "<img" not in text.replace('<img src="/static/', ""), page
        assert "49" not in re.findall(r"alert\(1\).{0,40}", text), page
    assert "&lt;script&gt;" in crew["bo"].get("/").text
    assert "{{ 7*7 }}" in crew["bo"].get("/").text
    block = block_of(fay, plan)
    assert block[1][1] == f"{NASTY[:80]} (fay)"


@pytest.mark.parametrize("note", ["x" * 301, "a\x07b", "line\u2028break\x07"])
def test_note_that_cannot_be_kept_is_refused(office: Flask, crew: Crew, plan: str, note: str) -> None:
    assert sign(crew["anna"], plan, note=note).status_code == 422
    assert fates(crew["anna"], plan) == []


def test_signatures_go_with_the_plan_and_outlast_the_account(office: Flask, crew: Crew, plan: str) -> None:
    signed_off(office, crew, plan)
    with database_of(office).sessions.begin() as session:
        session.execute(delete(AccountRow).where(AccountRow.name == "cleo"))
    assert "Cleo Marsh (cleo)" in crew["anna"].get(f"{plan}/sign-off").text
    assert crew["anna"].post(f"{plan}/delete").status_code == 303
    with database_of(office).sessions() as session:
        assert session.scalars(select(SignatureRow)).all() == []
        assert session.scalars(select(GrantRow)).all() == []


def test_who_decided_is_who_has_signed_in(office: Flask, crew: Crew, plan: str) -> None:
    sent = {"units": "metric", "cant": "50", "because": "as agreed", "who": "somebody else"}
    assert crew["anna"].post(f"{plan}/curves/1/hold", sent).status_code == 303
    history = crew["anna"].get(f"{plan}/history").text
    assert "Anna Holt (anna)" in history
    assert "somebody else" not in history


def test_workbook_made_in_the_background_is_kept_under_its_signatures() -> None:
    """What a result is kept under differs where a signature does."""
    from cant.model.signatures import Signature, Signatures
    from webapp.basis import Basis
    from webapp.decisions import Decided
    from webapp.working.orders import WORKBOOK, Order

    signed = Signatures("ab" * 32, (Signature("prepared", "Anna", datetime.now(UTC).date()),))
    basis = Basis("x.csv", "cd" * 32, Decided())
    plain, under = Order(WORKBOOK, basis), Order(WORKBOOK, basis, (("signatures", signed.as_text()),))
    assert plain.key != under.key
    back = Order.of(WORKBOOK, under.content)
    assert Signatures.from_text(back.told("signatures")) == signed
    assert json.loads(under.content)["more"] == {"signatures": signed.as_text()}


def test_who_signs_twice_at_the_same_moment_signs_once(office: Flask, crew: Crew, plan: str) -> None:
    people, address = people_of(office), plan.rpartition("/")[2]
    anna, done = people.accounts.named("anna"), []
    sign_off = SignOff(database_of(office), 30)
    seen = signing.standing_of(sign_off.of(anna.who, address)).digest

    def put() -> None:
        try:
            sign_off.add(anna.who, address, lambda signable: signing.signed(signable, anna, seen, None, ""))
            done.append(True)
        except NotAllowedError:
            done.append(False)

    threads = [threading.Thread(target=put) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(done) == [False] * 5 + [True]
    assert fates(crew["anna"], plan) == ["holds"]


def test_long_plan_is_signed_and_its_workbook_made_in_the_background(start: Callable[..., Flask]) -> None:
    """A workbook that was made before somebody signed is not given for the one that is wanted now."""
    house = start(sign_in=SignIn(accounts=True), work=EVERYTHING)
    made(house, "anna", full_name="Anna Holt")
    made(house, "bo", ["check"], "Bo Lind")
    anna = signed_in(house, "anna")
    plan = anna.post("/plans/sample").headers["Location"].removesuffix("/cants")
    waiting = anna.post(f"{plan}/sign-off", {"password": PASSWORD})
    assert waiting.headers["Location"] == f"{plan}/sign-off"  # a password waits in no page
    assert worked(house, lambda: anna.get(f"{plan}/sign-off")).status_code == 200

    def names() -> set[str]:
        answer = anna.get(f"{plan}/workbook")
        if answer.status_code == 302:  # to the page that waits for it
            assert work_off(house) > 0
            answer = anna.get(f"{plan}/workbook")
        assert answer.status_code == 200, answer.text
        sheet = load_workbook(io.BytesIO(answer.data))["Plan summary"]
        return {str(cell) for row in sheet.iter_rows(values_only=True) for cell in row}

    assert "Anna Holt (anna)" not in names()
    assert sign(anna, plan, number_of(house, "bo")).status_code == 303
    assert "Anna Holt (anna)" in names()
    assert sign(signed_in(house, "bo"), plan).status_code == 303
    assert {"Anna Holt (anna)", "Bo Lind (bo)"} <= names()
