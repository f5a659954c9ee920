"""What the engineer decides himself: a cant held by hand, taken back with one action; and the history."""

from __future__ import annotations

from flask import Blueprint, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant.errors import InputError
from cant.explaining import CantHeld, CurveKey, Decision
from webapp.access import compares, to_change, to_change_or_compare
from webapp.changes import take, take_back
from webapp.context import computed_of, running, stored, unconfirmed
from webapp.decisions import CHANGE, as_text
from webapp.forms import Fields
from webapp.history_view import moments, remembered_name, signed_by
from webapp.keeping.access import NotThereError
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError
from webapp.measures import measures
from webapp.proposals import Proposal
from webapp.security import owner
from webapp.steps import Steps
from webapp.views import curves
from webapp.views.comparing import page_of_proposal

pages = Blueprint("deciding", __name__, url_prefix="/plans/<address>")


@pages.post("/curves/<int:number>/hold")
def hold(address: str, number: int) -> ResponseReturnValue:
    """Hold a cant by hand, or compare the plan with it first."""
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    index = number - 1
    if not computed.listing.has(index):
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    shown_in = measures(request.form.get("units", "metric"))
    fields = Fields(request.form, shown_in)
    cant = fields.number("cant", "cant")
    if cant is None and "cant" not in fields.problems:
        fields.problems["cant"] = "the cant is missing"
    elif cant is not None and cant > 300:
        fields.problems["cant"] = f"may not be above {shown_in.with_unit('cant', 300.0)}"
    reason, who, problems = signed_by(request.form)
    if compares(plan):
        problems.pop("because", None)
    problems |= fields.problems
    if problems or cant is None:
        return curves.page_of_curve(plan, index, problems=problems, sent=request.form), 422
    listed = computed.planned.plan.curves
    change = CantHeld(on=CurveKey.of(listed, index), cant_mm=round(cant, 6), because=reason)
    words = f"Curve {listed.curve[index] or number}: cant held at {shown_in.with_unit('cant', cant)}"
    event = as_text(take(words, Decision(changes=(change,))))
    if compares(plan):
        return page_of_proposal(plan, Proposal(words, {CHANGE: event}, reason, steps.known))
    try:
        running().store.decide(owner(), address, {CHANGE: event}, reason, who, steps.known)
    except MeanwhileError as error:
        return curves.page_of_curve(stored(address), index, sent=request.form, problem=str(error)), 409
    flash(f"{words}. The plan around it has been made anew.")
    return redirect(url_for("curves.show", address=address, number=number), 303)


@pages.post("/changes/<key>/back")
def back(address: str, key: str) -> ResponseReturnValue:
    """Take a change back."""
    plan = to_change(address)
    found = next((one for one in plan.decided.changes if one.key == key), None)
    if found is None:
        message = "this has been taken back already"
        raise InputError(message)
    running().store.decide(
        owner(), address, {CHANGE: as_text(take_back(key, found.words))}, "", remembered_name()
    )
    flash(f"Taken back: {found.words}.")
    number = request.form.get("number", "")
    if number.isascii() and number.isdigit():
        return redirect(url_for("curves.show", address=address, number=int(number)), 303)
    return redirect(url_for("deciding.history", address=address), 303)


@pages.get("/history")
def history(address: str) -> ResponseReturnValue:
    """Show every decision with who, when and why, and what holds."""
    plan: StoredPlan = stored(address)
    return render_template("history.html", steps=moments(plan), held=plan.decided.changes)
