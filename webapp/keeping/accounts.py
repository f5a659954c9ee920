"""Accounts in the database: who may sign in, with which roles, and how a wrong password slows the next try.

Knows digests and hashes alone: what a password or a second factor must be is the business of
:mod:`webapp.people`. Each question is one transaction, and what must not happen twice is one statement.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, select, update
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from cant.errors import InputError
from webapp.keeping.database import Database, write_anyway
from webapp.keeping.records import AccountRow, SignInRow
from webapp.keeping.store import ACCOUNT

ROLES = ("prepare", "check", "approve")
FREE_TRIES = 5
"""Wrong passwords in a row before the next try has to wait."""
FIRST_WAIT = 5
LONGEST_WAIT = 60
"""Seconds; so short that nobody can keep somebody else out for long, and yet 60 tries an hour at most."""
FORGIVEN = timedelta(days=1)
SEEN_EVERY = timedelta(hours=1)
"""Of who is signed in at the proxy it is noted no more often that he was here."""


@dataclass(frozen=True)
class Account:
    """Somebody who may sign in.

    Attributes
    ----------
    id : int
    name, full_name : str
    roles : frozenset of str
        Of :data:`ROLES`.
    password_hash : str
        "" where there is none: it is signed in at the proxy, or never.
    must_change : bool
        The password is one for a single use.
    password_expires : datetime or None
        When that password ends.
    second_factor : str
        Secret of the second factor, "" where there is none.
    disabled : bool
    made, seen : datetime
    """

    id: int
    name: str
    full_name: str
    roles: frozenset[str]
    password_hash: str
    must_change: bool
    password_expires: datetime | None
    second_factor: str
    disabled: bool
    made: datetime
    seen: datetime | None

    @property
    def who(self) -> str:
        """The account as owner of plans and holder of grants."""
        return who_of(self.id)

    @property
    def shown(self) -> str:
        """The account as people call it."""
        return f"{self.full_name} ({self.name})" if self.full_name else self.name


def who_of(account_id: int) -> str:
    """Give an account as owner of plans and holder of grants."""
    return f"{ACCOUNT}{account_id}"


class Accounts:
    """All accounts.

    Parameters
    ----------
    database : Database
    """

    def __init__(self, database: Database) -> None:
        self._database = database

    def add(
        self,
        name: str,
        full_name: str,
        roles: Iterable[str],
        password_hash: str = "",
        password_expires: datetime | None = None,
    ) -> Account:
        """Make an account; with a password, that is one for a single use.

        Raises
        ------
        InputError
            There is one of that name.
        """
        row = AccountRow(
            name=name,
            full_name=full_name,
            roles=_as_text(roles),
            password_hash=password_hash,
            must_change=bool(password_hash),
            password_expires=password_expires,
            made=datetime.now(UTC),
        )
        try:
            with self._database.sessions.begin() as session:
                session.add(row)
                session.flush()
                return account_of(row)
        except IntegrityError as error:
            message = f"there is an account '{name}' already"
            raise InputError(message) from error

    def all(self) -> list[Account]:
        """Give all accounts by name."""
        with self._database.sessions() as session:
            return [account_of(row) for row in session.scalars(select(AccountRow).order_by(AccountRow.name))]

    def of_role(self, role: str) -> list[Account]:
        """Give the accounts that may be used and have a role, by name."""
        return [one for one in self.all() if role in one.roles and not one.disabled]

    def named(self, name: str) -> Account | None:
        """Give the account of a name."""
        with self._database.sessions() as session:
            row = session.scalar(select(AccountRow).where(AccountRow.name == name))
            return None if row is None else account_of(row)

    def get(self, account_id: int) -> Account | None:
        """Give the account of a number."""
        with self._database.sessions() as session:
            row = session.get(AccountRow, account_id)
            return None if row is None else account_of(row)

    def at_first_sight(self, name: str) -> Account:
        """Give the account of a name that the proxy vouches for; it is made where there is none."""
        found = self.named(name)
        if found is not None:
            self._note_seen(found)
            return found
        try:
            return self.add(name, "", ("prepare",))
        except InputError:
            found = self.named(name)  # another request was quicker
            if found is None:
                raise
            return found

    def _note_seen(self, account: Account) -> None:
        """Note that an account was used, no more often than need be."""
        now = datetime.now(UTC)
        if account.seen is None or account.seen <= now - SEEN_EVERY:
            with self._database.sessions.begin() as session:
                session.execute(update(AccountRow).where(AccountRow.id == account.id).values(seen=now))

    def change(
        self, account_id: int, *, roles: Iterable[str] | None = None, disabled: bool | None = None
    ) -> None:
        """Change the roles, or whether the account may be used; a disabled one is signed out everywhere."""
        values: dict[str, object] = {}
        if roles is not None:
            values["roles"] = _as_text(roles)
        if disabled is not None:
            values["disabled"] = disabled
        with self._database.sessions.begin() as session:
            session.execute(update(AccountRow).where(AccountRow.id == account_id).values(**values))
            if disabled:
                session.execute(delete(SignInRow).where(SignInRow.account_id == account_id))

    def set_password(self, account_id: int, password_hash: str, expires: datetime | None = None) -> None:
        """Set a password; with a moment at which it ends it is one for a single use.

        Every sign-in and key of the account ends, and its failures are forgotten.
        """
        values = {
            "password_hash": password_hash,
            "must_change": expires is not None,
            "password_expires": expires,
            **_FORGOTTEN,
        }
        self._replace(account_id, values)

    def set_second_factor(self, account_id: int, secret: str, used: int = 0) -> None:
        """Set the second factor, "" for none, and the step of the code used last; sign-ins and keys end."""
        self._replace(account_id, {"second_factor": secret, "second_factor_used": used})

    def rehashed(self, account_id: int, old: str, new: str) -> None:
        """Keep the same password under a stronger hash, where it is still that password."""
        with self._database.sessions.begin() as session:
            held = (AccountRow.id == account_id, AccountRow.password_hash == old)
            session.execute(update(AccountRow).where(*held).values(password_hash=new))

    def count_try(self, name: str) -> Account | None:
        """Count a try to prove that somebody is who he says, before it is judged.

        Counted first, so that tries at the same moment cannot all see the count from before.

        Returns
        -------
        Account or None
            None where no such account may be tried now: there is none, it is disabled, or it has to wait.
        """
        now = datetime.now(UTC)
        with self._database.sessions.begin() as session:
            self._forgive(session, name, now)
            counted = session.execute(
                update(AccountRow)
                .where(
                    AccountRow.name == name,
                    AccountRow.disabled.is_(False),
                    AccountRow.locked_until.is_(None) | (AccountRow.locked_until <= now),
                )
                .values(failed=AccountRow.failed + 1)
                .returning(AccountRow.id)
            ).scalar()
            row = None if counted is None else session.get(AccountRow, counted)
            if row is None:
                write_anyway(session)  # a name that is none takes as long as one that is counted
                return None
            if row.failed >= FREE_TRIES:
                row.locked_until = now + timedelta(seconds=wait_after(row.failed))
            return account_of(row)

    def _forgive(self, session: Session, name: str, now: datetime) -> None:
        """Start counting anew where the last wait is long over."""
        session.execute(
            update(AccountRow)
            .where(AccountRow.name == name, AccountRow.locked_until <= now - FORGIVEN)
            .values(**_FORGOTTEN)
        )

    def tried_well(self, account_id: int) -> None:
        """Forget the failures of an account: who tried is who he said."""
        with self._database.sessions.begin() as session:
            session.execute(
                update(AccountRow)
                .where(AccountRow.id == account_id)
                .values(seen=datetime.now(UTC), **_FORGOTTEN)
            )

    def use_code(self, account_id: int, step: int) -> bool:
        """Use the code of a time step; False where it, or a later one, was used before."""
        with self._database.sessions.begin() as session:
            used = session.execute(
                update(AccountRow)
                .where(AccountRow.id == account_id, AccountRow.second_factor_used < step)
                .values(second_factor_used=step)
                .returning(AccountRow.id)
            ).scalar()
            return used is not None

    def _replace(self, account_id: int, values: dict[str, object]) -> None:
        with self._database.sessions.begin() as session:
            session.execute(update(AccountRow).where(AccountRow.id == account_id).values(**values))
            session.execute(delete(SignInRow).where(SignInRow.account_id == account_id))


def wait_after(failed: int) -> int:
    """Give the seconds to wait after so many failures in a row: growing, and never for good."""
    return min(FIRST_WAIT * 2 ** min(failed - FREE_TRIES, 10), LONGEST_WAIT) if failed >= FREE_TRIES else 0


_FORGOTTEN: dict[str, object] = {"failed": 0, "locked_until": None}


def _as_text(roles: Iterable[str]) -> str:
    given = set(roles)
    return " ".join(role for role in ROLES if role in given)


def account_of(row: AccountRow) -> Account:
    """Give an account from its row."""
    return Account(
        id=row.id,
        name=row.name,
        full_name=row.full_name,
        roles=frozenset(row.roles.split()),
        password_hash=row.password_hash,
        must_change=row.must_change,
        password_expires=row.password_expires,
        second_factor=row.second_factor,
        disabled=row.disabled,
        made=row.made,
        seen=row.seen,
    )
