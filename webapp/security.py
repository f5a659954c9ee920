"""Who asks, and whether a request may change anything.

The owner of a plan is a random number in a signed cookie, or in a signed key that a program sends. Forms
carry a signed token made for their owner; a request to the JSON interface with a cookie must come from the
same site. Every answer carries a strict content-security policy: nothing inline, nothing from elsewhere.
"""

from __future__ import annotations

import hashlib
import secrets
from typing import Any
from urllib.parse import urlsplit

from flask import Flask, Response, current_app, g, request, session
from flask.sessions import SecureCookieSessionInterface
from itsdangerous import BadSignature, URLSafeSerializer, URLSafeTimedSerializer

OWNER = "owner"
PERSON = "person"
"""Where :mod:`webapp.people.guard` puts who has signed in, for the time of a request."""
SESSION_COOKIE = "cant"
SECURE_SESSION_COOKIE = "__Host-cant"
"""Name under https: a browser takes such a cookie by https alone, for this host alone."""
OWNER_BYTES = 24
FORM_HOURS = 24
POLICY = "; ".join(
    (
        "default-src 'self'",
        "base-uri 'none'",
        "form-action 'self'",
        "frame-ancestors 'none'",
        "object-src 'none'",
    )
)
HEADERS = {
    "Content-Security-Policy": POLICY,
    "X-Content-Type-Options": "nosniff",
    "X-Frame-Options": "DENY",
    "Referrer-Policy": "same-origin",
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Embedder-Policy": "require-corp",
    "Cross-Origin-Resource-Policy": "same-origin",
    "Permissions-Policy": "camera=(), geolocation=(), microphone=()",
}

SIGNING: dict[str, Any] = {"key_derivation": "hmac", "digest_method": hashlib.sha256}
"""How all is signed that leaves the service and comes back: HMAC with SHA-256, a key for each purpose."""
BY_HTTPS_ALONE = "max-age=63072000; includeSubDomains"
"""Strict-Transport-Security: two years, with all names below the host's."""


class SignedCookies(SecureCookieSessionInterface):
    """Cookies, signed as all else."""

    digest_method = staticmethod(hashlib.sha256)


class RefusedError(Exception):
    """A request that may not change anything: a form without its token, or from another site."""


def owner() -> str:
    """Give the owner of the request: who has signed in, else a browser; a new browser gets its owner now."""
    if OWNER not in g:
        key = request.authorization
        if g.get(PERSON) is not None:
            g.owner, g.owner_is_new = g.person.owner, False
        elif key is not None and key.type == "bearer":
            g.owner, g.owner_is_new = _from_key(key.token or ""), False
        else:
            known = session.get(OWNER)
            g.owner_is_new = not isinstance(known, str)
            if g.owner_is_new:
                session.permanent = True
                known = session[OWNER] = secrets.token_urlsafe(OWNER_BYTES)
            g.owner = known
    found: str = g.owner
    return found


def is_known() -> bool:
    """Tell whether a request carries a key or the cookie of an owner, or somebody has signed in."""
    return (
        g.get(PERSON) is not None or request.authorization is not None or isinstance(session.get(OWNER), str)
    )


def new_key() -> str | None:
    """Give the key of an owner who came without cookie or key, so that a program can come back; else None."""
    asked = owner()
    return (
        URLSafeSerializer(_secret(), salt="key", signer_kwargs=SIGNING).dumps(asked)
        if g.owner_is_new
        else None
    )


def _from_key(key: str) -> str:
    try:
        found = URLSafeSerializer(_secret(), salt="key", signer_kwargs=SIGNING).loads(key)
    except BadSignature as error:
        message = "the key sent with this request is not valid"
        raise RefusedError(message) from error
    return str(found)


def form_token() -> str:
    """Give the token that a form of this owner must carry; of who has signed in, of this sign-in.

    A page that refuses a key that is not valid has forms that nobody can send: their token is "".
    """
    try:
        made_for = _form_owner()
    except RefusedError:
        return ""
    return URLSafeTimedSerializer(_secret(), salt="form", signer_kwargs=SIGNING).dumps(made_for)


def _form_owner() -> str:
    return owner() if g.get(PERSON) is None else str(g.person.form_owner)


def check_form() -> None:
    """Refuse a form that does not carry its owner's token; RefusedError."""
    try:
        made_for = URLSafeTimedSerializer(_secret(), salt="form", signer_kwargs=SIGNING).loads(
            request.form.get("token", ""), max_age=FORM_HOURS * 3600
        )
    except BadSignature as error:
        message = "this form is too old or was not made here; open the page anew and send it once more"
        raise RefusedError(message) from error
    if not secrets.compare_digest(str(made_for), _form_owner()):
        message = "this form was made for another browser; open the page anew and send it once more"
        raise RefusedError(message)
    check_same_site()


def check_same_site() -> None:
    """Refuse a request that another site made a browser send; RefusedError."""
    site = request.headers.get("Sec-Fetch-Site", "none")
    origin = request.headers.get("Origin")
    hidden = origin == "null"
    foreign = origin is not None and not hidden and urlsplit(origin).netloc != request.host
    if site in ("cross-site", "same-site") or foreign or (hidden and site != "same-origin"):
        message = "this request comes from another site"
        raise RefusedError(message)


def protect(app: Flask, *, https: bool = False) -> None:
    """Give every answer of an application its headers.

    Parameters
    ----------
    app : Flask
    https : bool
        The service is reached by https alone.
    """
    app.session_interface = SignedCookies()

    @app.after_request
    def headers(response: Response) -> Response:
        for name, value in HEADERS.items():
            response.headers.setdefault(name, value)
        if https:
            response.headers.setdefault("Strict-Transport-Security", BY_HTTPS_ALONE)
        if request.endpoint != "static":
            response.headers.setdefault("Cache-Control", "private, no-store")
        if (response.mimetype or "").endswith("xml") and "charset" not in response.mimetype_params:
            response.headers["Content-Type"] = f"{response.mimetype}; charset=utf-8"
        return response


def _secret() -> str:
    return str(current_app.secret_key)
