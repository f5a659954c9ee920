"""How often one address, or one person, may ask: generous to who works, tight to who guesses.

Counted in this process, in a sliding window of a minute. Of an IPv6 address the first half counts, which is
what one customer of a network is given.
"""

from __future__ import annotations

import hashlib
import ipaddress
import math
import time

from flask import Flask, Response, g, request
from limits import RateLimitItem, RateLimitItemPerMinute
from limits.storage import MemoryStorage
from limits.strategies import SlidingWindowCounterRateLimiter

from webapp.busy import TooManyError
from webapp.guarding.bounds import Bounds
from webapp.security import RefusedError, is_known, owner

NOT_COUNTED = frozenset({"health.alive", "health.ready", "static"})
"""Endpoints that are not counted: for watchers, and what makes a refusal look like a page."""
SIGN_IN = "people.sign_in"
OPEN_LINK = frozenset({"sharing.open_link", "api.open_shared_plan"})
ACCOUNT_FIELD = "name"
MAKES_A_PLAN = frozenset({"start.sample"})
"""Endpoints that make a plan without a file; every request that brings a file counts as an upload."""
ACCOUNTS_AN_ADDRESS = 6
WRONG = (401, 403, 404, 410)
IPV6_NETWORK = 64


class Rates:
    """Counts what is asked, and refuses what is too much.

    Parameters
    ----------
    bounds : Bounds
    """

    def __init__(self, bounds: Bounds) -> None:
        self.bounds = bounds
        self._counting = SlidingWindowCounterRateLimiter(MemoryStorage())

    def count(self, per_minute: int, *key: str) -> None:
        """Count one more; TooManyError where it is too much."""
        item = RateLimitItemPerMinute(per_minute)
        if not self._counting.hit(item, *key):
            self._refuse(item, key)

    def check(self, per_minute: int, *key: str) -> None:
        """Refuse where as many as may be have been counted; TooManyError."""
        item = RateLimitItemPerMinute(per_minute)
        if not self._counting.test(item, *key):
            self._refuse(item, key)

    def note(self, per_minute: int, *key: str) -> None:
        """Count one more that was wrong, for the next :meth:`check`."""
        self._counting.hit(RateLimitItemPerMinute(per_minute), *key)

    def _refuse(self, item: RateLimitItem, key: tuple[str, ...]) -> None:
        over = self._counting.get_window_stats(item, *key).reset_time
        seconds = min(max(math.ceil(over - time.time()), 1), 60)
        message = (
            f"Too much was asked in a short time, and this was not done. Try once more in {seconds} seconds."
        )
        raise TooManyError(seconds, message)


def asking_address() -> str:
    """Give the address that asks: the network of an IPv6 address."""
    text = request.remote_addr or ""
    try:
        address = ipaddress.ip_address(text)
    except ValueError:
        return text[:64]
    if address.version == 6 and address.ipv4_mapped is None:
        return str(ipaddress.ip_network((address, IPV6_NETWORK), strict=False))
    return str(address)


def add_rates_of_addresses(app: Flask, rates: Rates) -> None:
    """Count every request by its address, before anything else is done for it."""
    bounds = rates.bounds

    @app.before_request
    def count() -> None:
        if request.endpoint in NOT_COUNTED:
            return
        address = asking_address()
        rates.count(bounds.requests_per_minute_address, "requests from", address)
        if _is_upload():
            rates.count(bounds.uploads_per_minute_address, "uploads from", address)
        if request.endpoint == SIGN_IN and request.method == "POST":
            _count_sign_in(rates, address)
        for kind, most in _guesses(bounds):
            rates.check(most, kind, address)

    @app.after_request
    def note(response: Response) -> Response:
        if response.status_code in WRONG:
            for kind, most in _guesses(bounds):
                rates.note(most, kind, asking_address())
        return response


def add_rates_of_people(app: Flask, rates: Rates) -> None:
    """Count every request by who asks, once that is known."""
    bounds = rates.bounds

    @app.before_request
    def count() -> None:
        g.counted_as = _person()
        if g.counted_as:
            rates.count(bounds.requests_per_minute, "requests of", g.counted_as)
            if _is_upload():
                rates.count(bounds.uploads_per_minute, "uploads of", g.counted_as)


def _is_upload() -> bool:
    return request.mimetype == "multipart/form-data" or request.endpoint in MAKES_A_PLAN


def _count_sign_in(rates: Rates, address: str) -> None:
    most = rates.bounds.sign_ins_per_minute
    name = request.form.get(ACCOUNT_FIELD, "").strip().casefold()
    account = hashlib.sha256(name.encode(errors="replace")).hexdigest()
    rates.count(most, "sign-ins", address, account)
    rates.count(most * ACCOUNTS_AN_ADDRESS, "sign-ins from", address)


def _guesses(bounds: Bounds) -> list[tuple[str, int]]:
    """Give what a request guesses where it is refused (link, key, plan), and how often that may be."""
    found = []
    if request.endpoint in OPEN_LINK:
        found.append(("wrong links", bounds.wrong_links_per_minute))
    elif "address" in (request.view_args or {}):
        found.append(("wrong plans", bounds.wrong_plans_per_minute))
    if request.authorization is not None:
        found.append(("wrong keys", bounds.wrong_plans_per_minute))
    return found


def _person() -> str:
    """Give who asks, where that is known already; nobody is given a cookie for being counted."""
    try:
        return owner() if request.endpoint not in NOT_COUNTED and is_known() else ""
    except RefusedError:
        return ""
