"""The pages of one's own account: password, second factor, where one is signed in, keys for programs."""

from __future__ import annotations

from flask import Blueprint, flash, redirect, render_template, request, session, url_for
from flask.typing import ResponseReturnValue
from werkzeug.exceptions import NotFound

from cant.errors import CantError, InputError
from webapp.forms import Fields
from webapp.keeping.accounts import Account
from webapp.measures import measures
from webapp.people import second_factor as codes
from webapp.people import taking_over
from webapp.people.events import tell
from webapp.people.guard import Person, first_duty, needed_person
from webapp.people.people import people
from webapp.views.people import enter

pages = Blueprint("account", __name__)
NEW_FACTOR = "factor"
KEY_DAYS = (30, 90, 365)
LONGEST_LABEL = 80


@pages.get("/account")
def show() -> ResponseReturnValue:
    """Show the account, and what can be done with it."""
    return render_template("account.html", who=needed_person())


@pages.post("/account/take-over")
def take_over() -> ResponseReturnValue:
    """Take over what this browser made before, or leave it."""
    if request.form.get("choice") == "take":
        count = taking_over.take_over(needed_person())
        flash(f"{count} {'plan is' if count == 1 else 'plans are'} yours now.")
    else:
        taking_over.forget()
        flash("They were left; nobody can open them any more, and they will be deleted.")
    return redirect(url_for("start.home"), 303)


@pages.route("/account/password", methods=["GET", "POST"])
def password() -> ResponseReturnValue:
    """Change the password."""
    who = _with_password()
    if request.method == "GET":
        return render_template("password.html", who=who)
    new = request.form.get("new", "")
    try:
        account = _proven(who)
        if new != request.form.get("again", ""):
            message = "the two new passwords are not the same"
            raise InputError(message)
        people().change_password(account, new)
    except CantError as error:
        return render_template("password.html", who=who, problem=str(error)), 422
    _enter_anew(account)
    flash("The password is changed. Every other sign-in has ended, and every key.")
    return redirect(url_for("account.show"), 303)


@pages.route("/account/second-factor", methods=["GET", "POST"])
def second_factor() -> ResponseReturnValue:
    """Turn the second factor on: show its secret, and take a first code."""
    who = _with_password()
    if who.account.second_factor:
        return render_template("second_factor.html", who=who, must=people().settings.second_factor)
    secret = session.setdefault(NEW_FACTOR, codes.new_secret())
    if request.method == "GET":
        return _factor_page(who, secret)
    try:
        account = _proven(who)
        step = codes.step_of(secret, request.form.get("first", ""))
        if step is None:
            message = (
                "this code is not right now; wait for the next one, and see that the device's clock is right"
            )
            raise InputError(message)
    except CantError as error:
        return _factor_page(who, secret, str(error)), 422
    people().accounts.set_second_factor(account.id, secret, step)
    tell("second factor turned on", account=account.name)
    _enter_anew(account)
    flash("The second factor is on. Every other sign-in has ended, and every key.")
    return redirect(url_for("account.show"), 303)


@pages.post("/account/second-factor/off")
def second_factor_off() -> ResponseReturnValue:
    """Turn the second factor off, where it is one's own choice."""
    who, must = _with_password(), people().settings.second_factor
    try:
        if must:
            message = "everybody needs a second factor at this service; who runs it can reset yours"
            raise InputError(message)
        account = _proven(who)
    except CantError as error:
        return render_template("second_factor.html", who=who, must=must, problem=str(error)), 422
    people().accounts.set_second_factor(account.id, "")
    tell("second factor turned off", account=account.name)
    _enter_anew(account)
    flash("The second factor is off. Every other sign-in has ended, and every key.")
    return redirect(url_for("account.show"), 303)


@pages.get("/account/signed-in")
def signed_in() -> ResponseReturnValue:
    """Show where one is signed in."""
    return _signed_in_page(_with_password())


@pages.post("/account/signed-in/end")
def end() -> ResponseReturnValue:
    """End one sign-in, or all others."""
    who, which = _with_password(), request.form.get("which", "")
    own = who.sign_in.id if who.sign_in else 0
    try:
        _proven(who, with_code=False)
        if which == "others":
            count = people().sign_ins.end_all(who.account.id, but=own, keys=False)
        else:
            count = int(people().sign_ins.end(who.account.id, _number(which), is_key=False))
    except CantError as error:
        return _signed_in_page(who, str(error)), 422
    tell("sign-ins ended", account=who.account.name, count=count)
    flash(f"{count} {'sign-in has' if count == 1 else 'sign-ins have'} ended.")
    return redirect(url_for("account.signed_in"), 303)


@pages.get("/account/keys")
def keys() -> ResponseReturnValue:
    """Show the keys for programs."""
    return _keys_page(_with_password())


@pages.post("/account/keys")
def make_key() -> ResponseReturnValue:
    """Make a key, and show it for the only time."""
    who = _with_password()
    fields = Fields(request.form, measures("metric"))
    label = fields.text("label", words="what the key is for", needed=True)[:LONGEST_LABEL]
    days = _number(request.form.get("days", ""))
    try:
        if days not in KEY_DAYS:
            message = f"a key lasts {', '.join(map(str, KEY_DAYS))} days"
            raise InputError(message)
        if fields.problems:
            raise InputError(fields.problems["label"])
        account = _proven(who, with_code=False)
    except CantError as error:
        return _keys_page(who, str(error)), 422
    return _keys_page(who, made=people().new_key(account, label, days))


@pages.post("/account/keys/<int(max=2147483647):number>/end")
def end_key(number: int) -> ResponseReturnValue:
    """Withdraw a key."""
    who = _with_password()
    if not people().sign_ins.end(who.account.id, number, is_key=True):
        message = "there is no such key"
        raise NotFound(message)
    tell("key withdrawn", account=who.account.name)
    flash("The key is withdrawn.")
    return redirect(url_for("account.keys"), 303)


def _with_password() -> Person:
    """Give who has signed in where the password is kept here; NotFound where the proxy has it."""
    if not people().settings.accounts:
        message = "people sign in at the proxy before this service"
        raise NotFound(message)
    return needed_person()


def _proven(who: Person, *, with_code: bool = True) -> Account:
    """Let somebody who is signed in prove again who he is; WrongError."""
    given, code = request.form.get("password", ""), request.form.get("code", "")
    return people().prove(who.account.name, given, code, with_code=with_code)


def _enter_anew(account: Account) -> None:
    """Begin a new sign-in with what holds now of an account."""
    enter(people().accounts.get(account.id) or account)


def _factor_page(who: Person, secret: str, problem: str = "") -> str:
    return render_template(
        "second_factor.html",
        who=who,
        problem=problem,
        must=first_duty(who, people()) == "account.second_factor",
        secret=codes.in_groups(secret),
        picture=codes.picture_of(secret, who.account.name),
    )


def _signed_in_page(who: Person, problem: str = "") -> str:
    return render_template(
        "signed_in.html",
        who=who,
        found=people().sign_ins.of(who.account, keys=False),
        settings=people().settings,
        problem=problem,
    )


def _keys_page(who: Person, problem: str = "", made: str = "") -> str:
    return render_template(
        "keys.html",
        who=who,
        found=people().sign_ins.of(who.account, keys=True),
        days=KEY_DAYS,
        problem=problem,
        made=made,
    )


def _number(text: str) -> int:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 10 else 0
