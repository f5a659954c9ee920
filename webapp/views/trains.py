"""The traffic of a plan: from the workbook, from a file, or edited on the page."""

from __future__ import annotations

from flask import Blueprint, Response, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant.errors import CantError, InputError
from cant.model.traffic import Traffic
from webapp import trains_form
from webapp.context import current_measures, file_of, reading_of, running, stored
from webapp.deciding import check_reading
from webapp.decisions import traffic_text
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.proposals import Proposal
from webapp.security import owner
from webapp.tables import TRAFFIC_FILE, traffic_csv
from webapp.uploads import needed
from webapp.views.comparing import page_of_proposal

pages = Blueprint("trains", __name__, url_prefix="/plans/<address>")


def _traffic(plan: StoredPlan) -> Traffic | None:
    return plan.decided.traffic or reading_of(plan).traffic


def _rows(plan: StoredPlan) -> list[dict[str, str]]:
    named = list(reading_of(plan).curves.class_speeds)
    return trains_form.shown_rows(_traffic(plan), current_measures(), named)


def _page(
    plan: StoredPlan, rows: list[dict[str, str]], problems: dict[str, str], problem: str = "", code: int = 200
) -> ResponseReturnValue:
    shown = render_template(
        "trains.html",
        rows=rows,
        problems=problems,
        problem=problem,
        edited=plan.decided.traffic is not None,
        named=list(reading_of(plan).curves.class_speeds),
        has_traffic=_traffic(plan) is not None,
    )
    return Response(shown, code)


@pages.get("/trains")
def show(address: str) -> ResponseReturnValue:
    """Show the traffic as a form."""
    plan = stored(address)
    return _page(plan, _rows(plan), {})


@pages.post("/trains")
def change(address: str) -> ResponseReturnValue:
    """Take the edited traffic, or show what of it cannot be used."""
    plan = stored(address)
    shown_in = measures(request.form.get("units", "metric"))
    traffic, problems = trains_form.parse(request.form, shown_in, _traffic(plan))
    rows = trains_form.sent_rows(request.form)
    if traffic is None:
        return _page(plan, rows, problems, "Some fields cannot be used; each says why.", 422)
    if "more" in request.form:
        return _page(plan, [*rows, *(trains_form.blank_row() for _ in range(3))], {})
    try:
        if "compare" in request.form and plan.decided.confirmed:
            check_reading(plan, file_of(plan), traffic=traffic)
            return page_of_proposal(plan, Proposal("Other trains", {"traffic": traffic_text(traffic)}))
        _keep(plan, traffic)
    except CantError as error:
        return _page(plan, rows, {}, str(error), 422)
    flash("The trains have been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/trains/file")
def from_file(address: str) -> ResponseReturnValue:
    """Take the traffic of a file."""
    plan = stored(address)
    try:
        given = needed("file", "a workbook or a csv file with a traffic table")
        read = check_reading(plan, file_of(plan), traffic_file=given)
        if read.traffic is None:
            message = f"{given[1]} holds no traffic table: a heading 'Class' and one row a class are needed"
            raise InputError(message)
        if "compare" in request.form and plan.decided.confirmed:
            proposal = Proposal(f"The trains of {given[1]}", {"traffic": traffic_text(read.traffic)})
            return page_of_proposal(plan, proposal)
        _keep(plan, read.traffic)
    except CantError as error:
        return _page(plan, _rows(plan), {}, str(error), 422)
    flash(f"The trains of {given[1]} have been taken.")
    return redirect(url_for("trains.show", address=address), 303)


@pages.post("/trains/forget")
def forget(address: str) -> ResponseReturnValue:
    """Go back to the traffic of the workbook."""
    running().store.decide(owner(), address, {"traffic": "null"})
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


def _keep(plan: StoredPlan, traffic: Traffic) -> None:
    """Keep a traffic table where the list can be read with it."""
    before = _traffic(plan)
    if before is not None and traffic_text(traffic) == traffic_text(before):
        return
    check_reading(plan, file_of(plan), traffic=traffic)
    running().store.decide(owner(), plan.address, {"traffic": traffic_text(traffic)})
