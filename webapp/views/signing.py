"""Signing off a plan: who prepared, checked and approved it, and whose turn it is."""

from __future__ import annotations

from flask import Blueprint, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant.errors import CantError, InputError
from webapp.context import computed_of, running, stored, unconfirmed
from webapp.forms import Fields
from webapp.keeping.access import NotAllowedError
from webapp.keeping.accounts import Account
from webapp.keeping.signatures import SENT_BACK, SIGNED, Signable, SignOff
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.people import signing
from webapp.people.events import tell
from webapp.people.guard import needed_person
from webapp.people.people import WrongError, people
from webapp.working.asking import NotYetError

pages = Blueprint("signing", __name__, url_prefix="/plans/<address>")
STEP_WORDS = {
    **{step: step.capitalize() for step in SIGNED},
    SENT_BACK: "Sent back",
    "handed on": "Handed on",
}


@pages.get("/sign-off")
def show(address: str) -> ResponseReturnValue:
    """Show who has signed the plan, and whose turn it is."""
    plan = stored(address)
    return unconfirmed(plan) or _page(plan)


@pages.post("/sign-off")
def sign(address: str) -> ResponseReturnValue:
    """Sign the next step, and hand the plan to a colleague."""
    plan, who = stored(address), needed_person().account
    try:
        if plan.decided.confirmed:
            computed_of(plan)  # what cannot be planned cannot be signed
    except NotYetError:  # the page waits for it; a form with a password does not
        return redirect(url_for("signing.show", address=address), 303)
    try:
        # Who may not sign is told so whatever else he sent.
        _check(signing.why_not_sign(_signable(plan), who))
        _prove(who)
        to, note, seen = _colleague(), _note(), request.form.get("digest", "")
        entry = _sign_off().add(
            who.who, address, lambda signable: signing.signed(signable, who, seen, to, note)
        )
    except (InputError, WrongError) as error:
        return _page(plan, str(error)), 422
    tell("plan signed", account=who.name, step=entry.step, digest=entry.digest)
    flash(f"Signed: {entry.step}." + (f" {to.shown} has the plan in hand now." if to else ""))
    return redirect(url_for("signing.show", address=address), 303)


@pages.post("/sign-off/back")
def send_back(address: str) -> ResponseReturnValue:
    """Send the plan back with a note; what was signed holds no longer."""
    plan, who = stored(address), needed_person().account
    try:
        _check(signing.why_not_send_back(_signable(plan), who))
        note = _note()
        entry = _sign_off().add(who.who, address, lambda signable: signing.sent_back(signable, who, note))
    except InputError as error:
        return _page(plan, str(error)), 422
    tell("plan sent back", account=who.name, digest=entry.digest)
    flash("The plan is sent back. What was signed until now holds no longer.")
    return redirect(url_for("signing.show", address=address), 303)


@pages.post("/sign-off/hand-on")
def hand_on(address: str) -> ResponseReturnValue:
    """Hand the plan to another colleague."""
    plan, who = stored(address), needed_person().account
    try:
        _check(signing.why_not_hand_on(_signable(plan), who))
        to, note = _colleague(), _note()
        _sign_off().add(who.who, address, lambda signable: signing.handed_on(signable, who, to, note))
    except InputError as error:
        return _page(plan, str(error)), 422
    flash(f"{to.shown if to else 'Nobody'} has the plan in hand now.")
    return redirect(url_for("signing.show", address=address), 303)


def _sign_off() -> SignOff:
    return SignOff(running().database, running().config.keep_days)


def _signable(plan: StoredPlan) -> Signable:
    return _sign_off().of(needed_person().owner, plan.address)


def _check(why_not: str) -> None:
    if why_not:
        raise NotAllowedError(why_not)


def _prove(who: Account) -> None:
    """Let who signs prove again who he is, where the password is kept here; WrongError."""
    if people().settings.accounts:
        people().prove(who.name, request.form.get("password", ""), with_code=False)


def _note() -> str:
    """Give the note of the form; InputError where it cannot be used."""
    fields = Fields(request.form, measures("metric"))
    note = fields.text("note")
    if fields.problems:
        message = f"the note: {fields.problems['note']}"
        raise InputError(message)
    return note


def _colleague() -> Account | None:
    """Give the colleague that was chosen, None where none was; InputError where there is none such."""
    chosen = request.form.get("to", "")
    if not chosen:
        return None
    found = (
        people().accounts.get(int(chosen))
        if chosen.isascii() and chosen.isdigit() and len(chosen) < 10
        else None
    )
    if found is None:
        message = "choose one of the colleagues that are offered"
        raise InputError(message)
    return found


def _page(plan: StoredPlan, problem: str = "") -> str:
    """Show the page; the plan must be confirmed."""
    who, signable = needed_person().account, _signable(plan)
    standing = signing.standing_of(signable)
    accounts = people().accounts.all()
    names = {one.id: one.shown for one in accounts}
    after = standing.next if not signing.why_not_sign(signable, who) else standing.last and standing.last.step
    return render_template(
        "sign_off.html",
        computed=_computed(plan),
        standing=standing,
        steps=SIGNED,
        step_words=STEP_WORDS,
        history=[(one, signing.fate_of(one, plan)) for one in signable.entries],
        names=names,
        may_sign=not signing.why_not_sign(signable, who),
        why_not=signing.why_not_sign(signable, who),
        may_send_back=not signing.why_not_send_back(signable, who),
        may_hand_on=not signing.why_not_hand_on(signable, who),
        is_own_last=standing.last is not None and standing.last.account_id == who.id,
        colleagues=signing.colleagues(signable, who, accounts, after or ""),
        role_after=signing.ROLE_AFTER.get(after or "", ""),
        statements=signing.STATEMENTS,
        problem=problem,
    )


def _computed(plan: StoredPlan) -> object:
    try:
        return computed_of(plan) if plan.decided.confirmed else None
    except CantError:
        return None
