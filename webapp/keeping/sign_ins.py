"""Sign-ins and keys in the database, and what a browser made before somebody signed in.

Of a secret only its SHA-256 is kept, so that who reads the database cannot be anybody; a row that is deleted
is a sign-in that has ended, whatever cookie is still about.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, func, select, update

from webapp.keeping.accounts import Account, account_of
from webapp.keeping.database import Database
from webapp.keeping.records import AccountRow, GrantRow, KeptLimitsRow, PlanRow, SignInRow

SEEN_EVERY = timedelta(minutes=1)
"""A sign-in in use is noted no more often than that."""
LONGEST_BROWSER = 120


@dataclass(frozen=True)
class SignedIn:
    """A sign-in in a browser, or a key for programs.

    Attributes
    ----------
    id : int
    account : Account
    is_key : bool
    browser : str
        What the browser says of itself, or what the key is called.
    made, seen, expires : datetime
    """

    id: int
    account: Account
    is_key: bool
    browser: str
    made: datetime
    seen: datetime
    expires: datetime


def digest_of(secret: str) -> str:
    """Give the digest under which a secret is known."""
    return hashlib.sha256(secret.encode("utf-8", "surrogatepass")).hexdigest()


class SignIns:
    """Sign-ins and keys of all accounts.

    Parameters
    ----------
    database : Database
    idle : timedelta
        A sign-in that was not used for so long has ended; a key has not.
    """

    def __init__(self, database: Database, idle: timedelta) -> None:
        self._database = database
        self._idle = idle

    def open(
        self, account_id: int, secret: str, browser: str, lasts: timedelta, *, is_key: bool = False
    ) -> None:
        """Note a sign-in, or a key."""
        now = datetime.now(UTC)
        with self._database.sessions.begin() as session:
            session.execute(delete(SignInRow).where(SignInRow.expires <= now))
            session.add(
                SignInRow(
                    secret_digest=digest_of(secret),
                    account_id=account_id,
                    is_key=is_key,
                    browser=browser[:LONGEST_BROWSER],
                    made=now,
                    seen=now,
                    expires=now + lasts,
                )
            )

    def find(self, secret: str, *, is_key: bool = False) -> SignedIn | None:
        """Give the sign-in of a secret that holds now; its account is not disabled."""
        now = datetime.now(UTC)
        with self._database.sessions() as session:
            found = session.execute(
                select(SignInRow, AccountRow)
                .join(AccountRow, AccountRow.id == SignInRow.account_id)
                .where(
                    SignInRow.secret_digest == digest_of(secret),
                    SignInRow.is_key == is_key,
                    SignInRow.expires > now,
                    AccountRow.disabled.is_(False),
                )
            ).first()
        if found is None:
            return None
        row, account = found
        if not is_key and row.seen <= now - self._idle:
            self.end_secret(secret)
            return None
        if row.seen <= now - SEEN_EVERY:  # no request but one in a minute waits for the right to write
            with self._database.sessions.begin() as session:
                session.execute(update(SignInRow).where(SignInRow.id == row.id).values(seen=now))
        return _signed_in(row, account_of(account))

    def of(self, account: Account, *, keys: bool) -> list[SignedIn]:
        """Give the sign-ins of an account that hold, or its keys, the last used first."""
        now = datetime.now(UTC)
        wanted = select(SignInRow).where(
            SignInRow.account_id == account.id, SignInRow.is_key == keys, SignInRow.expires > now
        )
        if not keys:
            wanted = wanted.where(SignInRow.seen > now - self._idle)
        with self._database.sessions() as session:
            rows = session.scalars(wanted.order_by(SignInRow.seen.desc(), SignInRow.id.desc()))
            return [_signed_in(row, account) for row in rows]

    def end(self, account_id: int, number: int, *, is_key: bool) -> bool:
        """End a sign-in or withdraw a key of an account; False where it has none of that number."""
        with self._database.sessions.begin() as session:
            ended = session.execute(
                delete(SignInRow)
                .where(SignInRow.account_id == account_id, SignInRow.id == number, SignInRow.is_key == is_key)
                .returning(SignInRow.id)
            ).scalar()
            return ended is not None

    def end_secret(self, secret: str) -> None:
        """End the sign-in of a secret."""
        with self._database.sessions.begin() as session:
            session.execute(delete(SignInRow).where(SignInRow.secret_digest == digest_of(secret)))

    def end_all(self, account_id: int | None = None, *, but: int = 0, keys: bool = True) -> int:
        """End the sign-ins of an account, or of everybody, but for one; give how many."""
        ended = delete(SignInRow).where(SignInRow.id != but)
        if account_id is not None:
            ended = ended.where(SignInRow.account_id == account_id)
        if not keys:
            ended = ended.where(SignInRow.is_key.is_(False))
        with self._database.sessions.begin() as session:
            return len(session.scalars(ended.returning(SignInRow.id)).all())

    def plans_of(self, owner: str) -> int:
        """Give how many plans that are kept belong to an owner."""
        wanted = select(func.count()).where(PlanRow.owner == owner, PlanRow.expires > datetime.now(UTC))
        with self._database.sessions() as session:
            return session.scalar(wanted) or 0

    def take_over(self, owner: str, who: str) -> int:
        """Give what one owner has to another: plans, kept limits, and what is shared with him; count plans.

        Kept limits of a name that the other has already stay where they are, and expire.
        """
        with self._database.sessions.begin() as session:
            plans = session.scalars(
                update(PlanRow).where(PlanRow.owner == owner).values(owner=who).returning(PlanRow.id)
            ).all()
            mine = select(KeptLimitsRow.name).where(KeptLimitsRow.owner == who)
            session.execute(
                update(KeptLimitsRow)
                .where(KeptLimitsRow.owner == owner, KeptLimitsRow.name.not_in(mine))
                .values(owner=who)
                .execution_options(synchronize_session=False)
            )
            held = select(GrantRow.share_id).where(GrantRow.holder == who, GrantRow.share_id.is_not(None))
            session.execute(
                update(GrantRow)
                .where(
                    GrantRow.holder == owner, GrantRow.share_id.is_not(None), GrantRow.share_id.not_in(held)
                )
                .values(holder=who)
                .execution_options(synchronize_session=False)
            )
            return len(plans)


def _signed_in(row: SignInRow, account: Account) -> SignedIn:
    return SignedIn(row.id, account, row.is_key, row.browser, row.made, row.seen, row.expires)
