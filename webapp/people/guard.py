"""Who asks, where people sign in; and that nobody else gets further than the door.

What is open without signing in is listed here; everything else is closed, a page that is added later too. A
sign-in is a random secret in the signed cookie; it holds as long as its row in the database does, so that
signing out, a disabled account and a withdrawn key end it at the server.
"""

from __future__ import annotations

import ipaddress
from dataclasses import dataclass
from typing import Any

from flask import Flask, g, redirect, request, session, url_for
from flask.typing import ResponseReturnValue
from flask_login import LoginManager, UserMixin, current_user
from werkzeug.exceptions import Forbidden, Unauthorized

from cant.errors import InputError
from webapp.context import running
from webapp.guarding.texts import is_own_path
from webapp.keeping.accounts import Account
from webapp.keeping.sign_ins import SignedIn, digest_of
from webapp.people.events import tell
from webapp.people.people import People, checked_account_name, people

LOOPBACK = ("127.0.0.1", "::1")
AFTER = "after"
"""Where a browser is led once it has signed in."""
ALIVE = "health"
"""The part that is open to everybody always: it tells whether the service lives, and nothing else."""
OPEN = frozenset(
    {"static", "people.sign_in", "start.template", "start.units", "api.description", "api.get_template"}
)
OPEN_PARTS = frozenset({"help"})
SIGN_OUT = "people.sign_out"
NAMELESS = "who asks is not told: the proxy before this service must name who has signed in"


@dataclass(frozen=True)
class Person(UserMixin):  # type: ignore[misc]
    """Somebody who has signed in, and how.

    Attributes
    ----------
    account : Account
    sign_in : SignedIn or None
        The sign-in or the key; None where the proxy vouches for him.
    secret : str
        What Flask-Login keeps of him in the cookie.
    """

    account: Account
    sign_in: SignedIn | None = None
    secret: str = ""

    def get_id(self) -> str:
        """Give what the cookie holds."""
        return self.secret

    @property
    def owner(self) -> str:
        """The person as owner of plans."""
        return self.account.who

    @property
    def name(self) -> str:
        """The person as others read it."""
        return self.account.full_name or self.account.name

    @property
    def form_owner(self) -> str:
        """Whose forms are good: this sign-in's, so that none outlives it."""
        return f"{self.owner}/{digest_of(self.secret)[:32]}" if self.secret else self.owner

    def has(self, role: str) -> bool:
        """Tell whether the person has a role."""
        return role in self.account.roles


def person() -> Person | None:
    """Give who has signed in, None where nobody has or people do not sign in here."""
    found: Person | None = g.get("person")
    return found


def needed_person() -> Person:
    """Give who has signed in; Unauthorized where nobody has."""
    found = person()
    if found is None:
        message = "sign in first"
        raise Unauthorized(message)
    return found


def guard(app: Flask) -> None:
    """Let only who has signed in come in."""
    manager = LoginManager()
    manager.session_protection = None
    manager.init_app(app, add_context_processor=False)
    manager.user_loader(_of_cookie)
    app.before_request(_who_asks)


def _of_cookie(secret: str) -> Person | None:
    found = people().sign_ins.find(secret)
    return None if found is None else Person(found.account, found, secret)


def _who_asks() -> ResponseReturnValue | None:
    if request.blueprint == ALIVE:
        return None
    settings = people().settings
    g.person = _named_by_proxy(settings.header) if settings.header else _signed_in()
    if g.person is None:
        return None if _is_open() else _to_the_door()
    return _to_get_ready(g.person)


def _is_open() -> bool:
    return request.endpoint is None or request.endpoint in OPEN or request.blueprint in OPEN_PARTS


def _signed_in() -> Person | None:
    key = request.authorization
    if key is not None and key.type == "bearer":
        found = people().sign_ins.find(key.token or "", is_key=True)
        if found is None or request.blueprint != "api":
            tell("key refused")
            message = "the key sent with this request is not valid"
            raise Unauthorized(message)
        return Person(found.account, found)
    found_by_cookie = current_user._get_current_object()
    return found_by_cookie if isinstance(found_by_cookie, Person) else None


def _to_the_door() -> ResponseReturnValue:
    if request.blueprint == "api":
        message = "send a key of your account as 'Authorization: Bearer KEY'; keys are made on its page"
        raise Unauthorized(message)
    if request.method == "GET" and is_own_path(request.full_path):
        session[AFTER] = request.full_path.rstrip("?")
    return redirect(url_for("people.sign_in"), 303)


def _to_get_ready(who: Person) -> ResponseReturnValue | None:
    """Lead somebody to what he has to do before anything else."""
    wanted = first_duty(who, people())
    if wanted is None or _is_open() or request.endpoint in (wanted, SIGN_OUT):
        return None
    if request.blueprint == "api":
        message = "sign in with a browser first: the account needs a new password or a second factor"
        raise Forbidden(message)
    return redirect(url_for(wanted), 303)


def first_duty(who: Person, all_people: People) -> str | None:
    """Give the page on which somebody has to choose a password or a second factor first, None for none."""
    settings = all_people.settings
    if not settings.accounts:
        return None
    if who.account.must_change:
        return "account.password"
    return "account.second_factor" if settings.second_factor and not who.account.second_factor else None


def _named_by_proxy(header: str) -> Person:
    """Give the account that the proxy names; refuse who does not come through it."""
    if not _comes_from_proxy():
        tell("refused", why="the request does not come from the proxy")
        message = "this service is reached through its proxy only"
        raise Forbidden(message)
    given = request.headers.getlist(header)
    if not given or not given[0].strip():
        raise Unauthorized(NAMELESS)
    try:
        name = given[0].encode("latin-1").decode("utf-8")
        if len(given) > 1:
            message = "the header was sent more than once"
            raise InputError(message)
        checked_account_name(name)
    except (InputError, UnicodeError) as error:
        tell("refused", why="what the proxy names is no account's name")
        raise Forbidden(NAMELESS) from error
    account = people().accounts.at_first_sight(name)
    if account.disabled:
        tell("refused", account=account.name, why="the account is disabled")
        message = "this account is disabled; ask who runs this service"
        raise Forbidden(message)
    return Person(account)


def _comes_from_proxy() -> bool:
    proxies = running().config.proxies or LOOPBACK
    before = request.environ.get("werkzeug.proxy_fix.orig", request.environ)
    try:
        address: Any = ipaddress.ip_address(before.get("REMOTE_ADDR") or "")
    except ValueError:
        return False
    plain = getattr(address, "ipv4_mapped", None) or address
    return any(plain in ipaddress.ip_network(one) for one in proxies)
