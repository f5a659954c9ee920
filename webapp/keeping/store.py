"""Plans in the database: their files, the decisions on them, how long they stay.

Every question names who asks, so that no caller can forget to (:mod:`webapp.keeping.access`). A change is one
transaction, whole or not at all.
"""

from __future__ import annotations

import hashlib
import secrets
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, func, select

from cant.errors import InputError
from webapp.decisions import KINDS, Decided, Decision
from webapp.guarding.bounds import Bounds
from webapp.keeping.access import Access, NotThereError, find
from webapp.keeping.database import Database, one_at_a_time
from webapp.keeping.records import (
    DecisionRow,
    FileRow,
    GrantRow,
    KeptLimitsRow,
    PlanRow,
    ShareRow,
    SignInRow,
)
from webapp.keeping.room import Room
from webapp.meanwhile import MeanwhileError, unseen

ADDRESS_BYTES = 24
LONGEST_NAME = 80
ACCOUNT = "account:"
"""With what the account of who has signed in begins, as owner of plans."""


@dataclass(frozen=True)
class StoredPlan:
    """A plan as stored, without the bytes of its file.

    Attributes
    ----------
    address : str
        192 random bits, the plan's name in every URL.
    name, file_name, file_digest : str
    file_size : int
        Bytes.
    created, changed, expires : datetime
        UTC.
    decided : Decided
        What holds after all decisions.
    history : tuple of Decision
        All decisions, oldest first.
    access : Access
        What who asked for it may do with it.
    """

    address: str
    name: str
    file_name: str
    file_digest: str
    file_size: int
    created: datetime
    changed: datetime
    expires: datetime
    decided: Decided
    history: tuple[Decision, ...]
    access: Access = Access.OWN

    @property
    def may_edit(self) -> bool:
        """Whether who asked may decide on it."""
        return self.access >= Access.EDIT

    @property
    def is_own(self) -> bool:
        """Whether it belongs to who asked."""
        return self.access is Access.OWN


class Store:
    """Plans of all owners.

    Parameters
    ----------
    database : Database
    keep_days : int
        Days after the last change until a plan is deleted.
    bounds : Bounds, optional
        How much is kept.
    """

    def __init__(self, database: Database, keep_days: int, bounds: Bounds | None = None) -> None:
        self._database = database
        file = database.file
        self.room = Room(bounds or Bounds(), None if file is None else file.parent)
        self._keep = timedelta(days=keep_days)

    def add(
        self, owner: str, file_name: str, data: bytes, decisions: dict[str, str] | None = None
    ) -> StoredPlan:
        """Store a file as a new plan, with first decisions by kind, and give the plan.

        FullError where there is no room for it.
        """
        self.room.check_disk(len(data))
        now = datetime.now(UTC)
        plan = PlanRow(
            address=secrets.token_urlsafe(ADDRESS_BYTES),
            owner=owner,
            name=file_name[:200],
            file_name=file_name[-255:],
            file_digest=hashlib.sha256(data).hexdigest(),
            file_size=len(data),
            created=now,
            changed=now,
            expires=now + self._keep,
            decisions=[
                DecisionRow(
                    number=i, kind=kind, content=content, reason="", made=now, account=_account(owner)
                )
                for i, (kind, content) in enumerate((decisions or {}).items())
            ],
        )
        with self._database.sessions.begin() as session:
            one_at_a_time(session, owner)
            session.add(plan)
            session.flush()
            self.room.check(session, owner)
            self.room.check_decided(session, owner)
            session.add(FileRow(plan_id=plan.id, data=data))
        return as_stored(plan)

    def plans(self, owner: str) -> list[StoredPlan]:
        """Give the plans of an owner, the last changed first."""
        wanted = (
            select(PlanRow)
            .where(PlanRow.owner == owner, PlanRow.expires > datetime.now(UTC))
            .order_by(PlanRow.changed.desc(), PlanRow.id.desc())
        )
        with self._database.sessions() as session:
            return [as_stored(plan) for plan in session.scalars(wanted)]

    def plan(self, owner: str, address: str) -> StoredPlan:
        """Give a plan; NotThereError where this owner has none of that address."""
        with self._database.sessions() as session:
            return as_stored(*find(session, owner, address))

    def file(self, owner: str, address: str) -> bytes:
        """Give the bytes of a plan's file, as they were uploaded."""
        with self._database.sessions() as session:
            row = session.get(FileRow, find(session, owner, address)[0].id)
            if row is None:
                message = "the file of this plan is no longer kept"
                raise NotThereError(message)
            return row.data

    def decide(
        self,
        owner: str,
        address: str,
        decisions: dict[str, str],
        reason: str = "",
        who: str = "",
        known: int | None = None,
    ) -> StoredPlan:
        """Add decisions, by kind, in one transaction; one that changes nothing is not added.

        Any decision starts the days until the plan expires anew. MeanwhileError where one would replace what
        came after the first ``known`` decisions of the plan, which are those that who decides has seen.
        FullError where there is no room for them.
        """
        self.room.check_disk(sum(map(len, decisions.values())))
        unknown = set(decisions) - set(KINDS)
        if unknown:
            message = f"unknown kind of decision: {', '.join(sorted(unknown))}"
            raise InputError(message)
        with self._database.sessions.begin() as session:
            plan, access = find(session, owner, address, Access.EDIT, for_change=True)
            stored = as_stored(plan, access)
            if known is not None and (newer := unseen(stored.history, known, decisions)):
                raise MeanwhileError(newer)
            now = datetime.now(UTC)
            ruling = {d.kind: d.content for d in plan.decisions}
            number = max((d.number for d in plan.decisions), default=-1)
            for kind, content in decisions.items():
                if ruling.get(kind, "null") == content:
                    continue
                number += 1
                plan.decisions.append(
                    DecisionRow(
                        number=number,
                        kind=kind,
                        content=content,
                        reason=reason,
                        made=now,
                        who=who,
                        account=_account(owner),
                    )
                )
            plan.changed, plan.expires = now, now + self._keep
            session.flush()
            self.room.check_decided(session, plan.owner)
            return as_stored(plan, access)

    def keep_longer(self, owner: str, address: str) -> StoredPlan:
        """Start the days until a plan of one's own expires anew."""
        with self._database.sessions.begin() as session:
            plan, _ = find(session, owner, address, Access.OWN, for_change=True)
            plan.changed = datetime.now(UTC)
            plan.expires = plan.changed + self._keep
            session.flush()
            return as_stored(plan)

    def rename(self, owner: str, address: str, name: str) -> StoredPlan:
        """Call a plan otherwise; InputError where the name is blank or long."""
        name = checked_name(name)
        with self._database.sessions.begin() as session:
            plan, _ = find(session, owner, address, Access.OWN, for_change=True)
            plan.name = name
            session.flush()
            return as_stored(plan)

    def remove(self, owner: str, address: str) -> None:
        """Delete a plan with its file and decisions."""
        with self._database.sessions.begin() as session:
            plan, _ = find(session, owner, address, Access.OWN)
            session.execute(delete(PlanRow).where(PlanRow.id == plan.id))
        self._database.clear_away()

    def remove_expired(self) -> int:
        """Delete what has expired, and overwrite it; give the number of plans."""
        now = datetime.now(UTC)
        gone = 0
        with self._database.sessions.begin() as session:
            count = session.scalar(select(func.count()).where(PlanRow.expires <= now)) or 0
            for table in (PlanRow, KeptLimitsRow, GrantRow, ShareRow, SignInRow):
                made = session.execute(delete(table).where(table.expires <= now))
                gone += getattr(made, "rowcount", 0)
        if gone or self._database.must_clear:
            self._database.clear_away()
        return count


def checked_name(name: str) -> str:
    """Give a name without blanks around it; InputError where it is blank, long or not printable."""
    name = name.strip()
    if not name or len(name) > LONGEST_NAME or not name.isprintable():
        message = f"a name needs 1 to {LONGEST_NAME} printable characters"
        raise InputError(message)
    return name


def _account(owner: str) -> str:
    """Give the account among owners; "" for a browser, whose number is nobody's business."""
    return owner if owner.startswith(ACCOUNT) else ""


def as_stored(plan: PlanRow, access: Access = Access.OWN) -> StoredPlan:
    """Give a plan from its row and what who asked may do with it."""
    history = tuple(Decision(d.kind, d.content, d.reason, d.made, d.who, d.account) for d in plan.decisions)
    return StoredPlan(
        address=plan.address,
        name=plan.name,
        file_name=plan.file_name,
        file_digest=plan.file_digest,
        file_size=plan.file_size,
        created=plan.created,
        changed=plan.changed,
        expires=plan.expires,
        decided=Decided.of(history),
        history=history,
        access=access,
    )
