"""Sharing a plan by links: its owner makes and withdraws them, whom they were sent to opens them."""

from __future__ import annotations

from datetime import date

from flask import Blueprint, Response, flash, redirect, render_template, request, session, url_for
from flask.typing import ResponseReturnValue

from cant.errors import CantError, InputError
from webapp.access import of_my_own
from webapp.context import running
from webapp.forms import Fields
from webapp.history_view import LONGEST_WHO, WHO
from webapp.keeping.shares import MOST_LINKS, Offer, Share, Shares
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.security import owner

pages = Blueprint("sharing", __name__)
OPEN = "sharing.open_link"
ACCESS = ("read", "edit")


def shares() -> Shares:
    """Give the links of the application that answers this request."""
    return Shares(running().database)


@pages.after_request
def tell_nobody(response: Response) -> Response:
    """Let no browser tell the address of a link, which holds its secret, to the page that it leads to.

    The name of the site is told: without it a browser hides in the form who made it, and it would be refused.
    """
    if request.endpoint == OPEN:
        response.headers["Referrer-Policy"] = "strict-origin"
    return response


@pages.get("/plans/<address>/shares")
def show(address: str) -> ResponseReturnValue:
    """Show which links of a plan there are, and a form that makes one."""
    return _page(of_my_own(address))


@pages.post("/plans/<address>/shares")
def make(address: str) -> ResponseReturnValue:
    """Make a link, and show it for the only time."""
    plan = of_my_own(address)
    try:
        share, secret = shares().make(
            owner(),
            address,
            request.form.get("label", ""),
            may_edit=_access_of(request.form.get("access", "")) == "edit",
            until=_day_of(request.form.get("until", "")),
        )
    except CantError as error:
        return _page(plan, problem=str(error), sent=request.form.to_dict()), 422
    link = url_for("sharing.open_link", secret=secret, _external=True)
    return _page(plan, made=share, link=link)


@pages.post("/plans/<address>/shares/<int:number>/withdraw")
def withdraw(address: str, number: int) -> ResponseReturnValue:
    """Withdraw a link: who opened it can open the plan no more."""
    of_my_own(address)
    share = shares().withdraw(owner(), address, number)
    flash(f"The link for {share.label} is withdrawn; nobody can open the plan by it any more.")
    return redirect(url_for("sharing.show", address=address), 303)


@pages.post("/plans/<address>/leave")
def leave(address: str) -> ResponseReturnValue:
    """Give up a plan that somebody else shared."""
    name = shares().leave(owner(), address)
    flash(f"{name} is no longer in your list; the link that you were sent opens it again.")
    return redirect(url_for("start.home"), 303)


@pages.route("/shared/<secret>", methods=["GET", "POST"])
def open_link(secret: str) -> ResponseReturnValue:
    """Show what a link offers; then take it, and lead to the plan.

    How often somebody may fail here is bounded by :mod:`webapp.guarding.rates`, by the name of this endpoint.
    """
    offer = shares().offer(owner(), secret)
    if request.method == "GET":
        return _offer_page(offer)
    who, problems = _name(offer)
    if problems:
        return _offer_page(offer, problems, who), 422
    shares().accept(owner(), secret)
    if who:
        session[WHO] = who
    return redirect(url_for("start.resume", address=offer.address), 303)


def _name(offer: Offer) -> tuple[str, dict[str, str]]:
    """Give the name under which somebody will decide, where he gave one."""
    fields = Fields(request.form, measures("metric"))
    who = fields.text(WHO) if offer.may_edit else ""
    if len(who) > LONGEST_WHO:
        fields.problems[WHO] = f"at most {LONGEST_WHO} characters"
    return who, fields.problems


def _access_of(text: str) -> str:
    if text not in ACCESS:
        message = "choose what the link lets do: to read, or to read and edit"
        raise InputError(message)
    return text


def _day_of(text: str) -> date | None:
    if not text.strip():
        return None
    try:
        return date.fromisoformat(text.strip())
    except ValueError as error:
        message = f"'{text[:40]}' is no day; write one such as 2030-05-31, or leave it blank"
        raise InputError(message) from error


def _page(
    plan: StoredPlan,
    made: Share | None = None,
    link: str = "",
    problem: str = "",
    sent: dict[str, str] | None = None,
) -> str:
    return render_template(
        "shares.html",
        found=shares().of_plan(owner(), plan.address),
        most=MOST_LINKS,
        made=made,
        link=link,
        problem=problem,
        sent=sent or {},
    )


def _offer_page(offer: Offer, problems: dict[str, str] | None = None, who: str = "") -> str:
    return render_template("shared.html", offer=offer, problems=problems or {}, who_sent=who)
