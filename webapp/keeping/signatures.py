"""The steps of signing off a plan in the database: added, and never changed but for being sent back.

Whether a step may be taken is judged by :mod:`webapp.people.signing`, inside the transaction that adds it,
over the plan as it is at that moment.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, or_, select, update
from sqlalchemy.orm import Session

from webapp.keeping.access import Access, NotThereError, find
from webapp.keeping.accounts import who_of
from webapp.keeping.database import Database, one_at_a_time
from webapp.keeping.records import GrantRow, PlanRow, SignatureRow
from webapp.keeping.store import StoredPlan, as_stored

PREPARED, CHECKED, APPROVED = "prepared", "checked", "approved"
SENT_BACK, HANDED_ON = "sent back", "handed on"
SIGNED = (PREPARED, CHECKED, APPROVED)


@dataclass(frozen=True)
class Entry:
    """One step of signing off.

    Attributes
    ----------
    step : str
        One of :data:`SIGNED`, :data:`SENT_BACK` or :data:`HANDED_ON`.
    account_id : int or None
        Whose step it is.
    name : str
        His name, as it was.
    note, statement : str
        His words, and ours that he signed.
    digest, program : str
        Of what it is over, and the version of the program.
    handed_to : int or None
        Whom the plan was handed to with it.
    made : datetime
    withdrawn : datetime or None
        When it was sent back.
    """

    step: str
    account_id: int | None
    name: str
    note: str
    statement: str
    digest: str
    program: str
    handed_to: int | None
    made: datetime
    withdrawn: datetime | None = None


@dataclass(frozen=True)
class Signable:
    """A plan with everything that is judged when a step is to be taken.

    Attributes
    ----------
    plan : StoredPlan
    entries : tuple of Entry
        The oldest first.
    editors : frozenset of str
        Who may change the plan: its owner, and who it is shared with to edit.
    """

    plan: StoredPlan
    entries: tuple[Entry, ...]
    editors: frozenset[str]


class SignOff:
    """Signing off of all plans.

    Parameters
    ----------
    database : Database
    keep_days : int
        Days for which a step keeps the plan.
    """

    def __init__(self, database: Database, keep_days: int) -> None:
        self._database = database
        self._keep = timedelta(days=keep_days)

    def of(self, who: str, address: str) -> Signable:
        """Give what is judged of a plan; NotThereError."""
        with self._database.sessions() as session:
            return _signable(session, *find(session, who, address))

    def add(self, who: str, address: str, judge: Callable[[Signable], Entry]) -> Entry:
        """Add a step that ``judge`` makes of the plan as it is now; its errors pass, and nothing is added.

        Whom it is handed to may read the plan from now on; who had it in hand and has signed nothing of it
        may not any more, where the plan was handed on. Sent back, what was signed until now holds no longer.
        """
        now = datetime.now(UTC)
        with self._database.sessions.begin() as session:
            one_at_a_time(session, f"sign-off {address}")
            row, access = find(session, who, address, for_change=True)
            entry = judge(_signable(session, row, access))
            if entry.step == SENT_BACK:
                session.execute(
                    update(SignatureRow)
                    .where(SignatureRow.plan_id == row.id, SignatureRow.withdrawn.is_(None))
                    .values(withdrawn=now)
                )
            if entry.step == HANDED_ON:
                _take_from_the_last(session, row)
            session.add(_row_of(entry, row.id, now))
            if entry.handed_to is not None:
                _let_read(session, row, who_of(entry.handed_to), now)
            row.expires = max(row.expires, now + self._keep)
            return entry

    def touching(self, account_id: int) -> list[Signable]:
        """Give the plans that somebody took a step of, or was handed, and that he may still see."""
        now = datetime.now(UTC)
        who = who_of(account_id)
        touched = select(SignatureRow.plan_id).where(
            or_(SignatureRow.handed_to == account_id, SignatureRow.account_id == account_id)
        )
        wanted = select(PlanRow).where(PlanRow.id.in_(touched), PlanRow.expires > now).order_by(PlanRow.id)
        with self._database.sessions() as session:
            addresses = [row.address for row in session.scalars(wanted)]
        found = []
        for address in addresses:
            with contextlib.suppress(NotThereError):
                found.append(self.of(who, address))
        return found


def entries_of(session: Session, plan: PlanRow) -> tuple[Entry, ...]:
    """Give the steps of a plan, the oldest first."""
    wanted = select(SignatureRow).where(SignatureRow.plan_id == plan.id).order_by(SignatureRow.id)
    return tuple(
        Entry(
            step=row.step,
            account_id=row.account_id,
            name=row.name,
            note=row.note,
            statement=row.statement,
            digest=row.digest,
            program=row.program,
            handed_to=row.handed_to,
            made=row.made,
            withdrawn=row.withdrawn,
        )
        for row in session.scalars(wanted)
    )


def entries_at(database: Database, address: str) -> tuple[Entry, ...]:
    """Give the steps of the plan of an address, for the service itself: whose it is was asked before."""
    with database.sessions() as session:
        plan = session.scalar(select(PlanRow).where(PlanRow.address == address))
        return () if plan is None else entries_of(session, plan)


def _signable(session: Session, row: PlanRow, access: Access) -> Signable:
    may_edit = select(GrantRow.holder).where(GrantRow.plan_id == row.id, GrantRow.may_edit.is_(True))
    editors = frozenset({row.owner, *session.scalars(may_edit)})
    return Signable(as_stored(row, access), entries_of(session, row), editors)


def _row_of(entry: Entry, plan_id: int, now: datetime) -> SignatureRow:
    return SignatureRow(
        plan_id=plan_id,
        account_id=entry.account_id,
        step=entry.step,
        name=entry.name,
        note=entry.note,
        statement=entry.statement,
        digest=entry.digest,
        program=entry.program,
        handed_to=entry.handed_to,
        made=now,
        withdrawn=None,
    )


def _let_read(session: Session, plan: PlanRow, who: str, now: datetime) -> None:
    own = (GrantRow.plan_id == plan.id, GrantRow.holder == who, GrantRow.share_id.is_(None))
    if plan.owner != who and session.scalar(select(GrantRow.id).where(*own).limit(1)) is None:
        session.add(GrantRow(plan_id=plan.id, share_id=None, holder=who, may_edit=False, made=now))


def _take_from_the_last(session: Session, plan: PlanRow) -> None:
    entries = entries_of(session, plan)
    last = next((one.handed_to for one in reversed(entries) if one.handed_to is not None), None)
    if last is not None and all(one.account_id != last for one in entries):
        session.execute(
            delete(GrantRow).where(
                GrantRow.plan_id == plan.id, GrantRow.holder == who_of(last), GrantRow.share_id.is_(None)
            )
        )
