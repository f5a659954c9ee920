"""The traffic of a plan: from the workbook, from a file, or edited on the page."""

from __future__ import annotations

from flask import Blueprint, Response, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant import service
from cant.errors import CantError, InputError
from cant.model.traffic import Traffic
from webapp import trains_form
from webapp.access import compares, to_change, to_change_or_compare
from webapp.context import current_measures, read_as, reading_of, running, stored
from webapp.decisions import traffic_text
from webapp.going_on import carry_on
from webapp.history_view import remembered_name
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError
from webapp.measures import measures
from webapp.proposals import Proposal, proposal_of
from webapp.security import owner
from webapp.steps import KNOWN, Steps
from webapp.tables import TRAFFIC_FILE, traffic_csv
from webapp.uploads import needed
from webapp.views.comparing import page_of_proposal

pages = Blueprint("trains", __name__, url_prefix="/plans/<address>")


def _traffic(plan: StoredPlan) -> Traffic | None:
    return plan.decided.traffic or reading_of(plan).traffic


def _rows(plan: StoredPlan) -> list[dict[str, str]]:
    """Give the rows of the form as the plan has them."""
    named = list(reading_of(plan).curves.class_speeds)
    return trains_form.shown_rows(_traffic(plan), current_measures(), named)


def _page(
    plan: StoredPlan,
    rows: list[dict[str, str]],
    problems: dict[str, str] | None = None,
    problem: str = "",
    code: int = 200,
    steps: Steps | None = None,
    now: list[dict[str, str]] | None = None,
) -> ResponseReturnValue:
    shown = render_template(
        "trains.html",
        rows=rows,
        problems=problems or {},
        problem=problem,
        edited=plan.decided.traffic is not None,
        named=list(reading_of(plan).curves.class_speeds),
        has_traffic=_traffic(plan) is not None,
        steps=steps or Steps.now(plan),
        now=now,
    )
    return Response(shown, code)


def _both(
    error: MeanwhileError, rows: list[dict[str, str]] | None = None, steps: Steps | None = None
) -> ResponseReturnValue:
    """Show what was sent, and what somebody else has decided meanwhile."""
    plan = stored(str((request.view_args or {})["address"]))
    now = _rows(plan)
    if rows is None or steps is None:
        return _page(plan, now, problem=str(error), code=409)
    filled = [row for row in now if row["name"]]
    return _page(plan, rows, problem=str(error), code=409, steps=steps.aware(plan), now=filled)


@pages.get("/trains")
def show(address: str) -> ResponseReturnValue:
    """Show the traffic as a form."""
    plan = stored(address)
    return _page(plan, _rows(plan))


@pages.post("/trains")
def change(address: str) -> ResponseReturnValue:
    """Take the edited traffic, or show what of it cannot be used."""
    plan = stored(address) if "more" in request.form else to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    shown_in = measures(request.form.get("units", "metric"))
    traffic, problems = trains_form.parse(request.form, shown_in, _traffic(steps.shown_with(plan)))
    rows = trains_form.sent_rows(request.form)
    if traffic is None:
        return _page(plan, rows, problems, "Some fields cannot be used; each says why.", 422, steps)
    if "more" in request.form:
        return _page(plan, [*rows, *(trains_form.blank_row() for _ in range(3))], steps=steps)
    text = traffic_text(traffic)
    try:
        if compares(plan):
            return page_of_proposal(plan, Proposal("Other trains", {"traffic": text}, known=steps.known))
        _keep(plan, text, steps)
    except MeanwhileError as error:
        return _both(error, rows, steps)
    except CantError as error:
        return _page(plan, rows, problem=str(error), code=422, steps=steps)
    flash("The trains have been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/trains/file")
def from_file(address: str) -> ResponseReturnValue:
    """Take the traffic of a file."""
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    try:
        proposal = _of_file(plan, steps)
        if compares(plan):
            return page_of_proposal(plan, proposal)
        carry_on(
            url_for("trains.from_file", address=address),
            {"proposal": proposal.signed(plan), KNOWN: str(steps.known)},
        )
        _keep(plan, proposal.decisions["traffic"], steps)
    except MeanwhileError as error:
        return _both(error)
    except CantError as error:
        return _page(plan, _rows(plan), problem=str(error), code=422)
    flash(f"{proposal.words} have been taken.")
    return redirect(url_for("trains.show", address=address), 303)


@pages.post("/trains/forget")
def forget(address: str) -> ResponseReturnValue:
    """Go back to the traffic of the workbook."""
    plan = to_change(address)
    try:
        _decide(plan, "null", Steps.sent(request.form, plan))
    except MeanwhileError as error:
        return _both(error)
    flash("The trains are those of the file again.")
    return redirect(url_for("trains.show", address=address), 303)


@pages.get("/trains/file")
def as_file(address: str) -> ResponseReturnValue:
    """Give the traffic as a file."""
    traffic = _traffic(stored(address))
    if traffic is None:
        message = "this plan has no trains yet"
        raise InputError(message)
    made = Response(traffic_csv(traffic), mimetype="text/csv")
    made.headers["Content-Disposition"] = f'attachment; filename="{TRAFFIC_FILE}"'
    return made


def _of_file(plan: StoredPlan, steps: Steps) -> Proposal:
    """Give what a file would change; where the list took long to read with it, the form sends that alone."""
    if "proposal" in request.form:
        return proposal_of(plan, request.form["proposal"])
    given = needed("file", "a workbook or a csv file with a traffic table")
    traffic, _, _ = service.tables_beside(traffic=given)
    if traffic is None:
        message = f"{given[1]} holds no traffic table: a heading 'Class' and one row a class are needed"
        raise InputError(message)
    return Proposal(f"The trains of {given[1]}", {"traffic": traffic_text(traffic)}, known=steps.known)


def _keep(plan: StoredPlan, traffic: str, steps: Steps) -> None:
    """Keep a traffic table where the list can be read with it."""
    before = _traffic(plan)
    if before is not None and traffic == traffic_text(before):
        return
    steps.check(plan, {"traffic": traffic})
    read_as(plan, {"traffic": traffic})
    _decide(plan, traffic, steps)


def _decide(plan: StoredPlan, traffic: str, steps: Steps) -> None:
    decisions = {"traffic": traffic}
    running().store.decide(owner(), plan.address, decisions, who=remembered_name(), known=steps.known)
