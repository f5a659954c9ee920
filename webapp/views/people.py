"""The door: signing in with name, password and code, and signing out."""

from __future__ import annotations

from typing import cast

from flask import Blueprint, Response, make_response, redirect, render_template, request, session, url_for
from flask.typing import ResponseReturnValue
from flask_login import login_user, logout_user

from webapp.context import UNITS
from webapp.keeping.accounts import Account
from webapp.people.events import tell
from webapp.people.guard import AFTER, Person, needed_person, person
from webapp.people.people import WrongError, people
from webapp.people.taking_over import BEFORE, before_signing_in
from webapp.security import OWNER

pages = Blueprint("people", __name__)
FORGET = '"cache", "storage"'
FORGET_ALL = '"cache", "cookies", "storage"'


@pages.route("/sign-in", methods=["GET", "POST"])
def sign_in() -> ResponseReturnValue:
    """Show the form, or let somebody in who proves who he is."""
    if request.method == "GET":
        return render_template("sign_in.html") if person() is None else redirect(url_for("start.home"))
    name, password, code = (request.form.get(field, "") for field in ("name", "password", "code"))
    try:
        account = people().prove(name, password, code)
    except WrongError as error:
        return render_template("sign_in.html", problem=str(error), name=name[:64]), 401
    after = session.get(AFTER, "")
    enter(account)
    tell("sign-in ok", account=account.name, factors=2 if account.second_factor else 1)
    return redirect(after or url_for("start.home"), 303)


@pages.post("/sign-out")
def sign_out() -> ResponseReturnValue:
    """End the sign-in at the server, and let the browser forget what it was shown."""
    account = needed_person().account
    leave()
    tell("sign-out", account=account.name)
    answer: Response = make_response(redirect(url_for("people.sign_in"), 303))
    answer.headers["Clear-Site-Data"] = FORGET if session.get(OWNER) else FORGET_ALL
    return answer


def enter(account: Account) -> None:
    """Begin a sign-in in this browser: a new secret, and of what the browser had its units alone.

    Whose the plans were that it made before is kept aside, to be offered.
    """
    units, before = session.get(UNITS), before_signing_in()
    leave()
    session.clear()
    secret = people().open(account, request.user_agent.string)
    found = people().sign_ins.find(secret)
    login_user(Person(account, found, secret))
    for key, value in ((UNITS, units), (BEFORE, before)):
        if value:
            session[key] = value


def leave() -> None:
    """End the sign-in of this browser, where there is one; plans that it made before stay its own."""
    before = before_signing_in()
    secret = session.get("_user_id")
    if secret:
        people().sign_ins.end_secret(cast("str", secret))
    logout_user()
    session.clear()
    if before:
        session[OWNER] = before
        session.permanent = True
