"""The limits of a plan: from the workbook, a set, a file, kept ones, or edited; and how cants are chosen."""

from __future__ import annotations

from flask import Blueprint, Response, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant import limit_sets, service
from cant.errors import CantError, InputError
from cant.model.limits import QUANTITIES, LimitSet
from cant.model.settings import METHODS, Settings
from webapp import limits_form, settings_form
from webapp.context import current_measures, planned_as, read_as, reading_of, running, stored
from webapp.decisions import as_text, limits_text, settings_text
from webapp.going_on import carry_on
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.proposals import Proposal, proposal_of
from webapp.security import owner
from webapp.tables import file_name, limits_csv
from webapp.uploads import needed
from webapp.views.comparing import page_of_proposal

pages = Blueprint("limits", __name__, url_prefix="/plans/<address>")


def _limits(plan: StoredPlan) -> LimitSet | None:
    return plan.decided.limits or reading_of(plan).limits


def _settings(plan: StoredPlan) -> Settings:
    limits = _limits(plan)
    fallback = Settings(units=limits.units if limits else "metric")
    return plan.decided.settings or reading_of(plan).settings or fallback


def _page(
    plan: StoredPlan,
    problem: str = "",
    problems: dict[str, str] | None = None,
    sent: dict[str, str] | None = None,
    code: int = 200,
) -> ResponseReturnValue:
    limits, shown_in = _limits(plan), current_measures()
    shown = render_template(
        "limits.html",
        limits=limits,
        rows=limits_form.shown_rows(limits, shown_in) if limits else [],
        spare=limits_form.SPARE_ROWS,
        quantities=QUANTITIES,
        unit_symbols=limits_form.UNIT_SYMBOLS,
        settings=settings_form.shown(_settings(plan), shown_in),
        numbers=settings_form.NUMBERS,
        methods=METHODS,
        sets=[limit_sets.load(name) for name in limit_sets.names()],
        kept=running().store.kept_limits(owner()),
        in_file=reading_of(plan).limits is not None,
        chosen=plan.decided.limits is not None,
        has_trains=(plan.decided.traffic or reading_of(plan).traffic) is not None,
        problem=problem,
        problems=problems or {},
        sent=sent or {},
    )
    return Response(shown, code)


@pages.get("/limits")
def show(address: str) -> ResponseReturnValue:
    """Show the limits in use, each value with its clause and note."""
    return _page(stored(address))


@pages.post("/limits/choose")
def choose(address: str) -> ResponseReturnValue:
    """Take the limits of the file, of a set, or kept under a name."""
    plan = stored(address)
    source, _, name = request.form.get("source", "").partition(":")
    found = None if source == "file" else _found(source, name)
    if "compare" in request.form and plan.decided.confirmed:
        words = "The limits of the file" if found is None else f"The limits {found.title or found.name}"
        text = "null" if found is None else limits_text(found)
        return page_of_proposal(plan, Proposal(words, {"limits": text}))
    if found is None:
        running().store.decide(owner(), address, {"limits": "null"})
    else:
        _keep(plan, limits_text(found))
    flash("The limits have been taken; look through them below.")
    return redirect(url_for("limits.show", address=address), 303)


def _found(source: str, name: str) -> LimitSet:
    if source == "set" and (found := service.limits_named(name)) is not None:
        return found
    for kept in running().store.kept_limits(owner()) if source == "kept" else ():
        if kept.name == name:
            return kept.limits
    message = "choose one of the limits on the page"
    raise InputError(message)


@pages.post("/limits")
def change(address: str) -> ResponseReturnValue:
    """Take edited values, and keep them under a name where one is given."""
    plan = stored(address)
    before = _limits(plan)
    if before is None:
        message = "there are no limits yet to be edited; choose some first"
        raise InputError(message)
    shown_in = measures(request.form.get("units", "metric"))
    limits, problems = limits_form.parse(request.form, shown_in, before)
    if limits is None:
        sent = request.form.to_dict()
        return _page(plan, "Some fields cannot be used; each says why.", problems, sent, 422)
    try:
        if "compare" in request.form and plan.decided.confirmed:
            return page_of_proposal(plan, Proposal("Other limits", {"limits": limits_text(limits)}))
        _keep(plan, limits_text(limits))
        name = request.form.get("keep-as", "").strip()
        if name:
            kept = limits.model_copy(update={"name": name})
            running().store.keep_limits(owner(), name, kept)
            flash(f"The limits are kept as '{name}' for your next plans.")
    except CantError as error:
        return _page(plan, str(error), {}, request.form.to_dict(), 422)
    flash("The limits have been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/limits/forget")
def forget(address: str) -> ResponseReturnValue:
    """Delete limits kept under a name; plans that use them are not touched."""
    stored(address)
    running().store.forget_limits(owner(), request.form.get("name", ""))
    flash("The kept limits have been deleted; no plan has changed.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/limits/file")
def from_file(address: str) -> ResponseReturnValue:
    """Take the limits of a file."""
    plan = stored(address)
    try:
        proposal = _of_file(plan)
        if "compare" in request.form and plan.decided.confirmed:
            return page_of_proposal(plan, proposal)
        carry_on(url_for("limits.from_file", address=address), {"proposal": proposal.signed(plan)})
        _keep(plan, proposal.decisions["limits"])
    except CantError as error:
        return _page(plan, str(error), code=422)
    flash(f"{proposal.words} have been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.get("/limits/file")
def as_file(address: str) -> ResponseReturnValue:
    """Give the limits as a file."""
    limits = _limits(stored(address))
    if limits is None:
        message = "this plan has no limits yet"
        raise InputError(message)
    made = Response(limits_csv(limits), mimetype="text/csv")
    name = file_name(f"Limits-{limits.name}", ".csv")
    made.headers["Content-Disposition"] = f'attachment; filename="{name}"'
    return made


@pages.post("/choice")
def settings(address: str) -> ResponseReturnValue:
    """Take how cants are chosen: method, tiers, tolerances."""
    plan = stored(address)
    shown_in = measures(request.form.get("units", "metric"))
    found, problems = settings_form.parse(request.form, shown_in, _settings(plan))
    if found is None:
        sent = request.form.to_dict()
        return _page(plan, "Some fields cannot be used; each says why.", problems, sent, 422)
    if "compare" in request.form and plan.decided.confirmed:
        words = f"Cants chosen otherwise: method {found.method}, limits {', '.join(found.tiers)}"
        return page_of_proposal(plan, Proposal(words, {"settings": settings_text(found)}))
    if found != _settings(plan):
        running().store.decide(owner(), address, {"settings": settings_text(found)})
    flash("How cants are chosen has been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/confirm")
def confirm(address: str) -> ResponseReturnValue:
    """Ask for the cants."""
    plan = stored(address)
    planned_as(plan)
    running().store.decide(owner(), address, {"confirmed": as_text(True)})
    return redirect(url_for("result.show", address=address), 303)


def _of_file(plan: StoredPlan) -> Proposal:
    """Give what a file would change; where the list took long to read with it, the form sends that alone."""
    if "proposal" in request.form:
        return proposal_of(plan, request.form["proposal"])
    given = needed("file", "a workbook or a csv file with a limits table")
    _, limits, _ = service.tables_beside(limits=given)
    if limits is None:
        message = f"{given[1]} holds no limits table: headings Quantity, Normal and Unit are needed"
        raise InputError(message)
    return Proposal(f"The limits of {given[1]}", {"limits": limits_text(limits)})


def _keep(plan: StoredPlan, limits: str) -> None:
    """Keep limits where the list can be read with them: a situation that no rule names is unknown."""
    before = _limits(plan)
    if before is not None and limits == limits_text(before):
        return
    read_as(plan, {"limits": limits})
    running().store.decide(owner(), plan.address, {"limits": limits})
