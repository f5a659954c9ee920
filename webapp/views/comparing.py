"""Two plans side by side, and what is taken after a look at it: a proposal is compared, then kept or left."""

from __future__ import annotations

import json
from dataclasses import replace

from flask import Blueprint, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant.errors import InputError
from cant.explaining import read_decision
from webapp.access import to_change
from webapp.changes import take, with_reason
from webapp.computing import Computed
from webapp.context import computed_of, current_measures, planned_as, running, stored, unconfirmed
from webapp.decisions import CHANGE, as_text
from webapp.difference_view import page_of_difference, pair_words
from webapp.going_on import carry_on
from webapp.history_view import moment_of, moments, signed_by
from webapp.keeping.access import NotThereError
from webapp.keeping.shares import Shares
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError
from webapp.proposals import Proposal, at_moment, proposal_of
from webapp.security import owner
from webapp.steps import Steps

pages = Blueprint("comparing", __name__, url_prefix="/plans/<address>")


@pages.get("/compare")
def show(address: str) -> ResponseReturnValue:
    """Compare two moments of a plan, or a plan with another one, such as a revision of its list."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed_of(plan)
    others = [p for p in _mine_and_shared() if p.decided.confirmed and p.address != address]
    asked = request.args.get("with", "")
    before: StoredPlan | None = None
    after = plan
    if asked:
        before = next((p for p in others if p.address == asked), None)
        if before is None:
            message = "the other plan is not there, or its cants have not been asked for"
            raise NotThereError(message)
        titles = (before.name, plan.name)
    elif "from" in request.args:
        first, last = moment_of(request.args.get("from", "")), moment_of(request.args.get("to", ""))
        before, after = at_moment(plan, plan.history[:first]), at_moment(plan, plan.history[:last])
        titles = (f"after step {first}" if first else "the list as it came", f"after step {last}")
    else:
        return render_template("compare.html", found=None, others=others, steps=moments(plan))
    return _page(planned_as(before), planned_as(after), titles, others=others, steps=moments(plan))


@pages.post("/compare")
def look(address: str) -> ResponseReturnValue:
    """Show once more what a proposal would change, on another page of its curves."""
    plan = stored(address)
    proposal = proposal_of(plan, request.form.get("proposal", ""))
    return page_of_proposal(plan, proposal)


@pages.post("/keep-proposal")
def keep(address: str) -> ResponseReturnValue:
    """Keep what a proposal would change, with reason and name."""
    plan = to_change(address)
    proposal = proposal_of(plan, request.form.get("proposal", ""))
    reason, who, problems = signed_by(request.form)
    if problems:
        return page_of_proposal(plan, proposal, problems)
    planned_as(proposal.on(plan))
    decisions = dict(proposal.decisions)
    if CHANGE in decisions:
        decisions[CHANGE] = as_text(with_reason(json.loads(decisions[CHANGE]), reason))
    try:
        running().store.decide(owner(), address, decisions, reason, who, proposal.known)
    except MeanwhileError as error:
        plan = stored(address)
        aware = replace(proposal, reason=reason, known=len(plan.history))
        return page_of_proposal(plan, aware, problem=str(error))
    flash(f"Kept: {proposal.words}")
    return redirect(url_for("result.show", address=address), 303)


@pages.post("/curves/<int:number>/options/<int:option>")
def option(address: str, number: int, option: int) -> ResponseReturnValue:
    """Plan an option of a curve and compare it with the plan as it is."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    if not computed.listing.has(number - 1):
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    record = computed.record(number - 1, current_measures().system)
    if not 0 < option <= len(record["options"]):
        message = "the plan has changed and this option with it; look at the curve once more"
        raise InputError(message)
    chosen = record["options"][option - 1]
    words = f"Curve {record['curve']}: {chosen['text']}"
    event = take(words, read_decision(chosen["decision"]))
    known = Steps.sent(request.form, plan).known
    return page_of_proposal(plan, Proposal(words, {CHANGE: as_text(event)}, known=known))


def _mine_and_shared() -> list[StoredPlan]:
    shared = Shares(running().database).shared_with(owner())
    return [*running().store.plans(owner()), *(one.plan for one in shared)]


def page_of_proposal(
    plan: StoredPlan, proposal: Proposal, problems: dict[str, str] | None = None, problem: str = ""
) -> ResponseReturnValue:
    """Show what a proposal would change, and let it be kept."""
    number = request.form.get("page", "1")
    if "proposal" not in request.form:
        carry_on(url_for("comparing.look", address=plan.address), {"proposal": proposal.signed(plan)})
    before, after = computed_of(plan), planned_as(proposal.on(plan))
    titles = ("as it is", "with this")
    shown = _page(
        before,
        after,
        titles,
        number=int(number) if number.isascii() and number.isdigit() else 1,
        proposal=proposal,
        signed=proposal.signed(plan),
        problems=problems or {},
        problem=problem,
    )
    return shown, 409 if problem else 422 if problems else 200


def _page(
    before: Computed, after: Computed, titles: tuple[str, str], number: int | None = None, **more: object
) -> str:
    asked = request.args.get("page", "1")
    page = number or (int(asked) if asked.isascii() and asked.isdigit() and len(asked) < 7 else 1)
    return render_template(
        "compare.html",
        found=page_of_difference(before, after, page),
        titles=titles,
        pair=lambda values, kind: pair_words(values, kind, current_measures()),
        query={k: v for k, v in request.args.items() if k != "page"},
        **more,
    )
