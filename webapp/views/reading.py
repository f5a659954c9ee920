"""How a list was read: columns with their samples, questions, problems by cell; answers and corrections."""

from __future__ import annotations

from collections.abc import Sequence

from flask import Blueprint, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant.errors import CantError
from cant.model.reading import Reading
from webapp import reading_form
from webapp.access import to_change
from webapp.context import read_as, reading_of, running, stored
from webapp.decisions import as_text
from webapp.history_view import remembered_name
from webapp.keeping.access import NotAllowedError, NotThereError
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError
from webapp.security import owner
from webapp.steps import Steps

pages = Blueprint("reading", __name__, url_prefix="/plans/<address>")
SHOWN_PROBLEMS = 200


@pages.get("/list")
def show(address: str) -> ResponseReturnValue:
    """Show how the list is understood; of a long one that was stored before it was read, why it is not."""
    try:
        return _page(address, "")
    except (NotThereError, NotAllowedError):
        raise
    except CantError as error:
        return render_template("unreadable.html", problem=str(error)), 422


def _page(address: str, problem: str, not_kept: Sequence[str] = ()) -> str:
    plan = stored(address)
    reading = reading_of(plan)
    asked = {question.question for question in reading.questions}
    refused = [row for row in reading.rejected if row.problem not in asked]
    return render_template(
        "reading.html",
        reading=reading,
        sheets=reading_form.shown_sheets(reading),
        others=reading_form.other_sheets(reading),
        questions=reading_form.shown_questions(reading),
        problem=problem,
        not_kept=not_kept,
        rejected=refused[:SHOWN_PROBLEMS],
        refused=len(refused),
        waiting=len(reading.rejected) - len(refused),
        good=int((~reading.curves.rejected).sum()),
        complete=_complete(plan, reading),
        answered=bool(plan.decided.answers),
    )


def _complete(plan: StoredPlan, reading: Reading) -> str:
    """Name the limits in use where trains and limits are known; "" where something is missing."""
    limits = plan.decided.limits or reading.limits
    traffic = plan.decided.traffic or reading.traffic
    if limits is None or traffic is None:
        return ""
    return f"{len(traffic.class_names)} classes, {limits.title or limits.name}"


@pages.post("/list")
def answer(address: str) -> ResponseReturnValue:
    """Take answers and corrections; those that the file cannot follow are not kept."""
    plan = to_change(address)
    steps = Steps.sent(request.form, plan)
    shown = steps.shown_with(plan)
    reading = reading_of(shown)
    decisions = {"answers": as_text(reading_form.answers(request.form, reading, shown.decided.answers))}
    try:
        steps.check(plan, decisions)
        read_as(plan, decisions)
        _decide(address, decisions, steps)
    except MeanwhileError as error:
        return _page(address, str(error), reading_form.words_of(request.form, reading)), 409
    except CantError as error:
        return _page(address, str(error)), 422
    flash("The list has been read again with your answers.")
    return redirect(url_for("reading.show", address=address), 303)


@pages.post("/list/forget")
def forget(address: str) -> ResponseReturnValue:
    """Take all answers and corrections back."""
    plan = to_change(address)
    try:
        _decide(address, {"answers": "null"}, Steps.sent(request.form, plan))
    except MeanwhileError as error:
        return _page(address, str(error)), 409
    flash("Your answers have been taken back; the list is read as it was first.")
    return redirect(url_for("reading.show", address=address), 303)


def _decide(address: str, decisions: dict[str, str], steps: Steps) -> None:
    running().store.decide(owner(), address, decisions, who=remembered_name(), known=steps.known)
