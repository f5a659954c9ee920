"""The people of a running service: proving who somebody is, and the sign-ins that follow from it.

A proof takes the same work and gives the same answer whether the name is unknown, the password wrong, the
code wrong or used, the account disabled or waiting: who asks learns that it failed, and nothing else.
"""

from __future__ import annotations

import re
import secrets
import unicodedata
from datetime import UTC, datetime, timedelta
from typing import cast

from flask import current_app

from cant.errors import CantError, InputError
from webapp.keeping.accounts import Account, Accounts
from webapp.keeping.database import Database
from webapp.keeping.sign_ins import SignIns
from webapp.people import passwords, second_factor
from webapp.people.events import tell
from webapp.people.settings import SignIn

EXTENSION = "people"
SECRET_BYTES = 32
KEY_START = "cant-"
NAME = re.compile(r"[^\W_][\w.@+\\-]{0,63}")
FAILED = (
    "Name, password or code is not right; or there were too many tries in a row, and it takes a minute until "
    "the next one counts."
)


class WrongError(CantError):
    """Somebody could not prove who he is."""


class People:
    """Accounts and sign-ins of a service under its settings.

    Parameters
    ----------
    database : Database
    settings : SignIn
    """

    def __init__(self, database: Database, settings: SignIn) -> None:
        self.settings = settings
        self.accounts = Accounts(database)
        self.sign_ins = SignIns(database, timedelta(hours=settings.idle_hours))

    def prove(self, name: str, password: str, code: str = "", *, with_code: bool = True) -> Account:
        """Give the account that a name, password and code belong to.

        Parameters
        ----------
        name, password, code : str
            As typed.
        with_code : bool
            Whether an account with a second factor needs its code.

        Raises
        ------
        WrongError
            They belong to none, or none that may be tried now.
        """
        account = self.accounts.count_try(folded(name))
        right = passwords.matches(account.password_hash if account else "", password)
        if account is None or not right or not self._is_right_code(account, code, needed=with_code):
            known = self.accounts.named(folded(name))
            tell("sign-in failed", account=known.name if known else None)
            raise WrongError(FAILED)
        if account.password_expires is not None and account.password_expires <= datetime.now(UTC):
            tell("sign-in failed", account=account.name, why="the single-use password has expired")
            raise WrongError(FAILED)
        self.accounts.tried_well(account.id)
        if passwords.is_outdated(account.password_hash):
            self.accounts.rehashed(account.id, account.password_hash, passwords.hashed(password))
        return account

    def _is_right_code(self, account: Account, code: str, *, needed: bool) -> bool:
        if not account.second_factor or not needed:
            return True
        step = second_factor.step_of(account.second_factor, code)
        return step is not None and self.accounts.use_code(account.id, step)

    def open(self, account: Account, browser: str) -> str:
        """Make a sign-in of an account; give its secret."""
        secret = secrets.token_urlsafe(SECRET_BYTES)
        self.sign_ins.open(account.id, secret, browser, timedelta(days=self.settings.days))
        return secret

    def new_key(self, account: Account, label: str, days: int) -> str:
        """Make a key of an account for programs; give it, for the only time."""
        key = KEY_START + secrets.token_urlsafe(SECRET_BYTES)
        self.sign_ins.open(account.id, key, label, timedelta(days=days), is_key=True)
        tell("key made", account=account.name, days=days)
        return key

    def change_password(self, account: Account, password: str) -> None:
        """Set a new password that its owner chose; every sign-in and key ends."""
        passwords.check(password, (account.name, account.full_name))
        if passwords.matches(account.password_hash, password):
            message = "this is the password that you have; choose another"
            raise InputError(message)
        self.accounts.set_password(account.id, passwords.hashed(password))
        tell("password changed", account=account.name)


def people() -> People:
    """Give the people of the application that answers this request."""
    return cast("People", current_app.extensions[EXTENSION])


def folded(name: str) -> str:
    """Give a name as accounts of ours bear it: without regard to capitals."""
    return unicodedata.normalize("NFC", name.strip().casefold())


def checked_account_name(name: str) -> str:
    """Give the name of an account; InputError where it is none."""
    if not NAME.fullmatch(name) or unicodedata.normalize("NFC", name) != name:
        message = (
            "the name of an account has 1 to 64 letters, digits and the signs . _ @ + - \\, "
            "and begins with a letter or digit"
        )
        raise InputError(message)
    return name
