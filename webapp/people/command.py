"""The command ``cant accounts``: what the operator does with accounts, at the database that is configured.

Each change is said on standard output and noted as an event; a password for a single use is shown once, to be
handed over by a way on which the operator knows the person.
"""

from __future__ import annotations

import logging
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta

import click

from cant.errors import InputError
from webapp.config import Config
from webapp.keeping.accounts import ROLES, Account
from webapp.keeping.database import Database
from webapp.people import passwords
from webapp.people.events import tell
from webapp.people.people import People, checked_account_name, folded

LONGEST_FULL_NAME = 80
EVERYBODY = "everybody"


@click.group()
def accounts() -> None:
    """Make, list and change the accounts of the web service."""


@accounts.command()
@click.argument("name")
@click.option("--full-name", default="", help="Name as it stands under a plan.")
@click.option("--roles", default="prepare", show_default=True, help=f"Of {', '.join(ROLES)}; by commas.")
def add(name: str, full_name: str, roles: str) -> None:
    """Make the account NAME, and show its password for a single use."""
    with _people() as people:
        given, full = _roles(roles.split(",")), _full_name(full_name)
        name = checked_account_name(name if people.settings.header else folded(name))
        if name == EVERYBODY:
            message = f"'{EVERYBODY}' stands for all accounts; give the account another name"
            raise InputError(message)
        if people.settings.header:
            people.accounts.add(name, full, given)
            click.echo(f"Made: {name}, who signs in at the proxy.")
        else:
            password, expires = _single_use()
            people.accounts.add(name, full, given, passwords.hashed(password), expires)
            _show(name, password)
        tell("account made", account=name, roles=" ".join(sorted(given)))


@accounts.command(name="list")
def show() -> None:
    """List the accounts."""
    with _people() as people:
        found = people.accounts.all()
        for one in found:
            roles = ", ".join(role for role in ROLES if role in one.roles) or "no role"
            seen = f"last signed in {one.seen:%Y-%m-%d %H:%M} UTC" if one.seen else "never signed in"
            marks = [roles, seen]
            marks += ["second factor"] if one.second_factor else []
            marks += ["password for a single use"] if one.must_change else []
            marks += ["disabled"] if one.disabled else []
            click.echo(f"{one.name}  {one.full_name or '-'}  {'; '.join(marks)}")
        if not found:
            click.echo("There are no accounts.")


@accounts.command()
@click.argument("name")
@click.argument("roles", nargs=-1)
def roles(name: str, roles: tuple[str, ...]) -> None:
    """Give the account NAME these ROLES and no others (prepare, check, approve; without any: none)."""
    with _people() as people:
        account, given = _account(people, name), _roles(part for text in roles for part in text.split(","))
        people.accounts.change(account.id, roles=given)
        tell("roles changed", account=account.name, roles=" ".join(sorted(given)))
        click.echo(f"{account.name}: {', '.join(role for role in ROLES if role in given) or 'no role'}.")


@accounts.command()
@click.argument("name")
def disable(name: str) -> None:
    """Let the account NAME sign in no more, and end its sign-ins and keys."""
    _switch(name, disabled=True)


@accounts.command()
@click.argument("name")
def enable(name: str) -> None:
    """Let the account NAME sign in again."""
    _switch(name, disabled=False)


@accounts.command()
@click.argument("name")
def reset(name: str) -> None:
    """Show a new password for a single use; sign-ins, keys and the second factor of NAME end."""
    with _people() as people:
        account = _account(people, name)
        if account.name != folded(account.name):
            message = (
                f"'{account.name}' signs in at the proxy; make an account '{folded(account.name)}' instead"
            )
            raise InputError(message)
        password, expires = _single_use()
        people.accounts.set_second_factor(account.id, "")
        people.accounts.set_password(account.id, passwords.hashed(password), expires)
        tell("account reset", account=account.name)
        _show(account.name, password)


@accounts.command(name="sign-out")
@click.argument("name")
def sign_out(name: str) -> None:
    """End all sign-ins and keys of the account NAME, or of all with the word 'everybody'."""
    with _people() as people:
        account = None if name == EVERYBODY else _account(people, name)
        count = people.sign_ins.end_all(None if account is None else account.id)
        tell("sign-ins ended", account=account.name if account else None, count=count)
        click.echo(f"{count} sign-ins and keys have ended.")


def _switch(name: str, *, disabled: bool) -> None:
    with _people() as people:
        account = _account(people, name)
        people.accounts.change(account.id, disabled=disabled)
        tell("account disabled" if disabled else "account enabled", account=account.name)
        click.echo(f"{account.name} is {'disabled, and signed out everywhere' if disabled else 'enabled'}.")


@contextmanager
def _people() -> Iterator[People]:
    """Open the people of the database that is configured."""
    logging.basicConfig(level=logging.INFO, format="%(asctime)s %(levelname)s %(message)s")
    logging.getLogger("alembic").setLevel(logging.WARNING)
    config = Config.from_environment()
    database = Database(config.database)
    try:
        yield People(database, config.sign_in)
    finally:
        database.close()


def _account(people: People, name: str) -> Account:
    """Give the account of a name, as the proxy writes it or without regard to capitals."""
    found = people.accounts.named(name) or people.accounts.named(folded(name))
    if found is None:
        message = f"there is no account '{name}'; 'cant accounts list' lists them"
        raise InputError(message)
    return found


def _roles(given: Iterator[str] | list[str]) -> frozenset[str]:
    found = frozenset(word for word in (text.strip().casefold() for text in given) if word)
    if wrong := sorted(found - set(ROLES)):
        message = f"'{wrong[0]}' is no role; the roles are {', '.join(ROLES)}"
        raise InputError(message)
    return found


def _full_name(text: str) -> str:
    name = " ".join(text.split())
    if len(name) > LONGEST_FULL_NAME or not name.isprintable():
        message = f"a full name has at most {LONGEST_FULL_NAME} printable characters"
        raise InputError(message)
    return name


def _single_use() -> tuple[str, datetime]:
    return passwords.single_use(), datetime.now(UTC) + timedelta(hours=passwords.SINGLE_USE_HOURS)


def _show(name: str, password: str) -> None:
    click.echo(f"{name} signs in with this password once, within {passwords.SINGLE_USE_HOURS} hours:")
    click.echo(f"  {password}")
    click.echo("Give it to the person himself, by a way on which you know him; it is not shown again.")
