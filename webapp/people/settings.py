"""How people sign in, as configured: not at all, with accounts of the service, or at the proxy before it."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from cant.errors import InputError
from webapp.guarding.bounds import whole_number

ACCOUNTS = "accounts"
YES = ("1", "yes", "true", "on")
HEADER = re.compile(r"[A-Za-z][A-Za-z0-9-]{0,60}")


@dataclass(frozen=True)
class SignIn:
    """How people sign in.

    Attributes
    ----------
    accounts : bool
        People sign in here, with a password.
    header : str
        Header in which the reverse proxy names who has signed in there; "" where none does.
    second_factor : bool
        Everybody needs a second factor; else each may turn it on.
    idle_hours : int
        A sign-in ends when it was not used for so long.
    days : int
        A sign-in ends at the latest so long after it was made.
    """

    accounts: bool = False
    header: str = ""
    second_factor: bool = False
    idle_hours: int = 8
    days: int = 7

    @property
    def on(self) -> bool:
        """Whether people sign in at all."""
        return self.accounts or bool(self.header)

    @classmethod
    def from_environment(cls, given: Mapping[str, str]) -> SignIn:
        """Take it from variables.

        ``CANT_SIGN_IN`` (blank or ``accounts``), ``CANT_SIGN_IN_HEADER`` (name of a header),
        ``CANT_SECOND_FACTOR`` (``yes``), ``CANT_SIGN_IN_IDLE_HOURS``, ``CANT_SIGN_IN_DAYS``.

        Raises
        ------
        InputError
            Where one cannot be followed, or two contradict each other.
        """
        way = given.get("CANT_SIGN_IN", "").strip()
        header = given.get("CANT_SIGN_IN_HEADER", "").strip()
        if way not in ("", ACCOUNTS):
            message = f"CANT_SIGN_IN is '{way}'; leave it out, or write {ACCOUNTS}"
            raise InputError(message)
        if header and not HEADER.fullmatch(header):
            message = (
                f"CANT_SIGN_IN_HEADER is '{header}'; the name of a header is needed, such as X-Remote-User"
            )
            raise InputError(message)
        if way and header:
            message = (
                "CANT_SIGN_IN and CANT_SIGN_IN_HEADER are both set: people sign in either here or at the "
                "proxy; leave out one of the two"
            )
            raise InputError(message)
        second_factor = given.get("CANT_SECOND_FACTOR", "").strip().lower() in YES
        if second_factor and not way:
            message = (
                f"CANT_SECOND_FACTOR is set without CANT_SIGN_IN={ACCOUNTS}: the service asks nobody for one"
            )
            raise InputError(message)
        return cls(
            accounts=way == ACCOUNTS,
            header=header,
            second_factor=second_factor,
            idle_hours=whole_number(given, "CANT_SIGN_IN_IDLE_HOURS", 8),
            days=whole_number(given, "CANT_SIGN_IN_DAYS", 7),
        )
