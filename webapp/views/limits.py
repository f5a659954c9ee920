"""The limits of a plan: from the workbook, a set, a file, kept ones, or edited; and how cants are chosen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from flask import Blueprint, Response, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant import limit_sets, service
from cant.errors import CantError, InputError
from cant.model.limits import QUANTITIES, LimitSet
from cant.model.settings import METHODS, Settings
from webapp import limits_form, settings_form
from webapp.access import compares, to_change, to_change_or_compare
from webapp.context import current_measures, planned_as, read_as, reading_of, running, stored
from webapp.decisions import as_text, limits_text, settings_text
from webapp.going_on import carry_on
from webapp.history_view import remembered_name
from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError
from webapp.measures import measures
from webapp.proposals import Proposal, proposal_of
from webapp.security import owner
from webapp.steps import KNOWN, Steps
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


@dataclass(frozen=True)
class _Sent:
    """A form of the page that was sent: of the limits or of the settings, and what its reader had seen."""

    form: str
    steps: Steps
    fields: Mapping[str, str]


def _page(
    plan: StoredPlan,
    problem: str = "",
    problems: dict[str, str] | None = None,
    sent: _Sent | None = None,
    code: int = 200,
    *,
    both: bool = False,
) -> ResponseReturnValue:
    """Give the page; with what was sent, and where asked what holds now beside it."""
    now = Steps.now(plan)
    steps = {"limits": now, "settings": now} | ({sent.form: sent.steps} if sent else {})
    fields = sent.fields if sent else {}
    beside = sent.form if sent and both else ""
    filled = _limits(steps["limits"].shown_with(plan))
    limits, shown_in = _limits(plan), current_measures()
    settings_now = settings_form.shown(_settings(plan), shown_in)
    shown = render_template(
        "limits.html",
        limits=limits,
        rows=limits_form.shown_rows(filled, shown_in) if filled else [],
        rows_now=limits_form.shown_rows(limits, shown_in) if limits and beside == "limits" else [],
        settings_now=settings_now if beside == "settings" else None,
        steps=steps,
        spare=limits_form.SPARE_ROWS,
        quantities=QUANTITIES,
        unit_symbols=limits_form.UNIT_SYMBOLS,
        settings={key: fields.get(key, value) for key, value in settings_now.items()},
        numbers=settings_form.NUMBERS,
        methods=METHODS,
        sets=[limit_sets.load(name) for name in limit_sets.names()],
        kept=running().kept_limits.of(owner()),
        in_file=reading_of(plan).limits is not None,
        chosen=plan.decided.limits is not None,
        has_trains=(plan.decided.traffic or reading_of(plan).traffic) is not None,
        problem=problem,
        problems=problems or {},
        sent=fields,
    )
    return Response(shown, code)


def _both(error: MeanwhileError, sent: _Sent | None = None) -> ResponseReturnValue:
    """Show what somebody else has decided meanwhile; of a form, with what was sent."""
    plan = stored(str((request.view_args or {})["address"]))
    if sent is not None:
        sent = replace(sent, steps=sent.steps.aware(plan))
    return _page(plan, str(error), {}, sent, 409, both=True)


@pages.get("/limits")
def show(address: str) -> ResponseReturnValue:
    """Show the limits in use, each value with its clause and note."""
    return _page(stored(address))


@pages.post("/limits/choose")
def choose(address: str) -> ResponseReturnValue:
    """Take the limits of the file, of a set, or kept under a name."""
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    source, _, name = request.form.get("source", "").partition(":")
    found = None if source == "file" else _found(source, name)
    if compares(plan):
        words = "The limits of the file" if found is None else f"The limits {found.title or found.name}"
        text = "null" if found is None else limits_text(found)
        return page_of_proposal(plan, Proposal(words, {"limits": text}, known=steps.known))
    try:
        if found is None:
            _decide(plan, {"limits": "null"}, steps)
        else:
            _keep(plan, limits_text(found), steps)
    except MeanwhileError as error:
        return _both(error)
    flash("The limits have been taken; look through them below.")
    return redirect(url_for("limits.show", address=address), 303)


def _found(source: str, name: str) -> LimitSet:
    if source == "set" and (found := service.limits_named(name)) is not None:
        return found
    for kept in running().kept_limits.of(owner()) if source == "kept" else ():
        if kept.name == name:
            return kept.limits
    message = "choose one of the limits on the page"
    raise InputError(message)


@pages.post("/limits")
def change(address: str) -> ResponseReturnValue:
    """Take edited values, and keep them under a name where one is given."""
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    before = _limits(steps.shown_with(plan))
    if before is None:
        message = "there are no limits yet to be edited; choose some first"
        raise InputError(message)
    shown_in = measures(request.form.get("units", "metric"))
    limits, problems = limits_form.parse(request.form, shown_in, before)
    sent = _Sent("limits", steps, request.form)
    if limits is None:
        return _page(plan, "Some fields cannot be used; each says why.", problems, sent, 422)
    try:
        if compares(plan):
            decisions = {"limits": limits_text(limits)}
            return page_of_proposal(plan, Proposal("Other limits", decisions, known=steps.known))
        _keep(plan, limits_text(limits), steps)
        name = request.form.get("keep-as", "").strip()
        if name:
            kept = limits.model_copy(update={"name": name})
            running().kept_limits.keep(owner(), name, kept)
            flash(f"The limits are kept as '{name}' for your next plans.")
    except MeanwhileError as error:
        return _both(error, sent)
    except CantError as error:
        return _page(plan, str(error), {}, sent, 422)
    flash("The limits have been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/limits/forget")
def forget(address: str) -> ResponseReturnValue:
    """Delete limits kept under a name; plans that use them are not touched."""
    stored(address)
    running().kept_limits.forget(owner(), request.form.get("name", ""))
    flash("The kept limits have been deleted; no plan has changed.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/limits/file")
def from_file(address: str) -> ResponseReturnValue:
    """Take the limits of a file."""
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    try:
        proposal = _of_file(plan, steps)
        if compares(plan):
            return page_of_proposal(plan, proposal)
        carry_on(
            url_for("limits.from_file", address=address),
            {"proposal": proposal.signed(plan), KNOWN: str(steps.known)},
        )
        _keep(plan, proposal.decisions["limits"], steps)
    except MeanwhileError as error:
        return _both(error)
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
    plan = to_change_or_compare(address)
    steps = Steps.sent(request.form, plan)
    shown_in = measures(request.form.get("units", "metric"))
    found, problems = settings_form.parse(request.form, shown_in, _settings(steps.shown_with(plan)))
    sent = _Sent("settings", steps, request.form)
    if found is None:
        return _page(plan, "Some fields cannot be used; each says why.", problems, sent, 422)
    decisions = {"settings": settings_text(found)}
    if compares(plan):
        words = f"Cants chosen otherwise: method {found.method}, limits {', '.join(found.tiers)}"
        return page_of_proposal(plan, Proposal(words, decisions, known=steps.known))
    try:
        if found != _settings(plan):
            _decide(plan, decisions, steps)
    except MeanwhileError as error:
        return _both(error, sent)
    flash("How cants are chosen has been taken.")
    return redirect(url_for("limits.show", address=address), 303)


@pages.post("/confirm")
def confirm(address: str) -> ResponseReturnValue:
    """Ask for the cants."""
    plan = to_change(address)
    steps = Steps.sent(request.form, plan)
    decisions = {"confirmed": as_text(True)}
    try:
        steps.check(plan, decisions)
        planned_as(plan)
        _decide(plan, decisions, steps)
    except MeanwhileError as error:
        return _both(error)
    return redirect(url_for("result.show", address=address), 303)


def _of_file(plan: StoredPlan, steps: Steps) -> Proposal:
    """Give what a file would change; where the list took long to read with it, the form sends that alone."""
    if "proposal" in request.form:
        return proposal_of(plan, request.form["proposal"])
    given = needed("file", "a workbook or a csv file with a limits table")
    _, limits, _ = service.tables_beside(limits=given)
    if limits is None:
        message = f"{given[1]} holds no limits table: headings Quantity, Normal and Unit are needed"
        raise InputError(message)
    return Proposal(f"The limits of {given[1]}", {"limits": limits_text(limits)}, known=steps.known)


def _keep(plan: StoredPlan, limits: str, steps: Steps) -> None:
    """Keep limits where the list can be read with them: a situation that no rule names is unknown."""
    before = _limits(plan)
    if before is not None and limits == limits_text(before):
        return
    steps.check(plan, {"limits": limits})
    read_as(plan, {"limits": limits})
    _decide(plan, {"limits": limits}, steps)


def _decide(plan: StoredPlan, decisions: dict[str, str], steps: Steps) -> None:
    running().store.decide(owner(), plan.address, decisions, who=remembered_name(), known=steps.known)
