"""People who sign in, for tests: accounts with passwords, browsers that are signed in, codes of a device."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import datetime
from typing import Any, cast

import pyotp
from flask import Flask
from sqlalchemy import select, update
from web_tools import Browser

from webapp.context import EXTENSION
from webapp.keeping.accounts import Account
from webapp.keeping.database import Database
from webapp.keeping.records import AccountRow
from webapp.people import passwords
from webapp.people.people import EXTENSION as PEOPLE
from webapp.people.people import People

PASSWORD = "tapir cello moss kettle"  # noqa: S105 made up here
OTHER_PASSWORD = "walnut fjord 7 ribbon"  # noqa: S105
HASHES = {password: passwords.hashed(password) for password in (PASSWORD, OTHER_PASSWORD)}


def people_of(app: Flask) -> People:
    """Give the people of a service."""
    return cast("People", app.extensions[PEOPLE])


def database_of(app: Flask) -> Database:
    """Give the database of a service."""
    return cast("Database", app.extensions[EXTENSION].database)


def made(app: Flask, name: str, roles: Iterable[str] = ("prepare",), full_name: str = "") -> Account:
    """Make an account with :data:`PASSWORD`, which is its own."""
    people = people_of(app)
    account = people.accounts.add(name, full_name, roles)
    people.accounts.set_password(account.id, HASHES[PASSWORD])
    found = people.accounts.get(account.id)
    assert found is not None
    return found


def signed_in(app: Flask, name: str, password: str = PASSWORD, code: str = "") -> Browser:
    """Give a browser in which an account has signed in."""
    browser = Browser(app)
    browser.get("/sign-in")
    answer = browser.post("/sign-in", {"name": name, "password": password, "code": code})
    assert answer.status_code == 303, answer.text
    browser.get("/")
    return browser


def is_signed_in(browser: Browser) -> bool:
    """Tell whether a browser is signed in."""
    return browser.get("/account").status_code == 200


def set_account(app: Flask, name: str, **values: Any) -> None:
    """Change the row of an account, such as to let time pass."""
    with database_of(app).sessions.begin() as session:
        session.execute(update(AccountRow).where(AccountRow.name == name).values(**values))


def row_of(app: Flask, name: str) -> AccountRow:
    """Give the row of an account."""
    with database_of(app).sessions() as session:
        return session.scalars(select(AccountRow).where(AccountRow.name == name)).one()


def code_at(secret: str, moment: datetime | float) -> str:
    """Give the code that a device shows at a moment."""
    return pyotp.TOTP(secret).at(moment)  # type: ignore[arg-type]


def try_to_sign_in(browser: Browser, name: str, password: str, code: str = "") -> Any:
    """Send the form of the door."""
    browser.get("/sign-in")
    return browser.post("/sign-in", {"name": name, "password": password, "code": code})


def cookie_of(browser: Browser) -> str:
    """Give the cookie of a browser."""
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    return cookie.value
