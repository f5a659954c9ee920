"""Links by which the owner of a plan lets others read it, or edit it, and what follows from opening one.

A link is a random secret, of which the digest alone is kept: it is shown when it is made and never again. Who
opens it gets a grant; withdrawing the link deletes it and every grant made by it, so that the next request of
its holders finds nothing. A secret that was guessed, withdrawn or has expired is the same as none at all.
"""

from __future__ import annotations

import hashlib
import secrets
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, time, timedelta

from sqlalchemy import ColumnElement, delete, func, or_, select
from sqlalchemy.orm import QueryableAttribute, Session

from cant.errors import InputError
from webapp.keeping.access import Access, NotThereError, find
from webapp.keeping.database import Database
from webapp.keeping.records import GrantRow, PlanRow, ShareRow
from webapp.keeping.store import StoredPlan, as_stored, checked_name

SECRET_BYTES = 24
MOST_LINKS = 50
MOST_HOLDERS = 200
LARGEST_NUMBER = 2**31 - 1
NO_LINK = "this link opens nothing: it may be incomplete, have expired, or have been withdrawn"


@dataclass(frozen=True)
class Share:
    """A link as its owner sees it; not the link itself.

    Attributes
    ----------
    number : int
    label : str
        For whom it was made.
    may_edit : bool
        To read and edit; else to read.
    made : datetime
    until : date or None
        The last day [UTC] on which it holds; None as long as the plan is kept.
    holders : int
        How many have opened it and still hold what it gave them.
    """

    number: int
    label: str
    may_edit: bool
    made: datetime
    until: date | None
    holders: int = 0


@dataclass(frozen=True)
class Offer:
    """What a link offers to who has it: nothing of the plan but its name.

    Attributes
    ----------
    address, name : str
        Of the plan.
    may_edit, is_own : bool
        What it lets do; whether the plan belongs to who asks anyway.
    until : date
        The last day on which it holds.
    """

    address: str
    name: str
    may_edit: bool
    is_own: bool
    until: date


@dataclass(frozen=True)
class SharedPlan:
    """A plan of somebody else that is shared with who asks, and the last day on which it is."""

    plan: StoredPlan
    until: date


class Shares:
    """Links and grants of all plans.

    Parameters
    ----------
    database : Database
    """

    def __init__(self, database: Database) -> None:
        self._database = database

    def make(
        self, owner: str, address: str, label: str, *, may_edit: bool, until: date | None = None
    ) -> tuple[Share, str]:
        """Make a link of a plan; give it, and its secret for the only time.

        Parameters
        ----------
        owner, address : str
            Of the plan.
        label : str
            For whom.
        may_edit : bool
        until : date, optional
            The last day [UTC] on which it holds; as long as the plan is kept where not given.

        Raises
        ------
        InputError
            The label or the day cannot be used, or there are as many links as may be.
        """
        label = checked_label(label)
        secret = secrets.token_urlsafe(SECRET_BYTES)
        now = datetime.now(UTC)
        with self._database.sessions.begin() as session:
            plan, _ = find(session, owner, address, Access.OWN, for_change=True)
            _check_day(until, now.date(), plan.expires.date())
            if len(_shares(session, plan, now)) >= MOST_LINKS:
                message = f"a plan has at most {MOST_LINKS} links; withdraw one that is no longer needed"
                raise InputError(message)
            row = ShareRow(
                plan_id=plan.id,
                secret_digest=digest_of(secret),
                label=label,
                may_edit=may_edit,
                made=now,
                expires=None if until is None else _end_of(until),
            )
            session.add(row)
            session.flush()
            return _as_share(row, 0), secret

    def of_plan(self, owner: str, address: str) -> list[Share]:
        """Give the links of a plan of one's own, the last made first."""
        now = datetime.now(UTC)
        with self._database.sessions() as session:
            plan, _ = find(session, owner, address, Access.OWN)
            found = _shares(session, plan, now)
            counts = dict(
                session.execute(
                    select(GrantRow.share_id, func.count())
                    .where(GrantRow.plan_id == plan.id, GrantRow.share_id.is_not(None))
                    .group_by(GrantRow.share_id)
                ).all()
            )
            return [_as_share(row, counts.get(row.id, 0)) for row in found]

    def withdraw(self, owner: str, address: str, number: int) -> Share:
        """Delete a link of a plan, and what everybody got by it."""
        with self._database.sessions.begin() as session:
            plan, _ = find(session, owner, address, Access.OWN)
            row = session.get(ShareRow, number) if 0 < number <= LARGEST_NUMBER else None
            if row is None or row.plan_id != plan.id:
                message = "there is no such link: it has been withdrawn already, or has expired"
                raise NotThereError(message)
            share = _as_share(row, 0)
            session.execute(delete(ShareRow).where(ShareRow.id == row.id))
        self._database.clear_away()
        return share

    def offer(self, who: str, secret: str) -> Offer:
        """Tell what a link offers; NotThereError where it opens nothing."""
        with self._database.sessions() as session:
            share, plan = _opened(session, secret)
            return _as_offer(share, plan, who)

    def accept(self, who: str, secret: str) -> Offer:
        """Take what a link offers, once however often it is opened.

        Raises
        ------
        NotThereError
            It opens nothing.
        InputError
            As many have opened it as may.
        """
        with self._database.sessions.begin() as session:
            share, plan = _opened(session, secret, for_change=True)
            offer = _as_offer(share, plan, who)
            held = select(func.count()).where(GrantRow.share_id == share.id)
            if offer.is_own or session.scalar(held.where(GrantRow.holder == who)):
                return offer
            if (session.scalar(held) or 0) >= MOST_HOLDERS:
                message = (
                    f"this link has been opened by {MOST_HOLDERS} already, which is as many as may; "
                    "ask who sent it for another one"
                )
                raise InputError(message)
            session.add(
                GrantRow(
                    plan_id=plan.id,
                    share_id=share.id,
                    holder=who,
                    may_edit=share.may_edit,
                    made=datetime.now(UTC),
                    expires=share.expires,
                )
            )
            return offer

    def shared_with(self, who: str) -> list[SharedPlan]:
        """Give the plans of others that somebody may see, the last changed first."""
        now = datetime.now(UTC)
        wanted = (
            select(PlanRow, GrantRow)
            .join(GrantRow, GrantRow.plan_id == PlanRow.id)
            .where(GrantRow.holder == who, PlanRow.owner != who, PlanRow.expires > now)
            .where(_holds(GrantRow.expires, now))
            .order_by(PlanRow.changed.desc(), PlanRow.id.desc())
        )
        by_plan: dict[int, tuple[PlanRow, list[GrantRow]]] = {}
        with self._database.sessions() as session:
            for plan, grant in session.execute(wanted):
                by_plan.setdefault(plan.id, (plan, []))[1].append(grant)
            return [_as_shared(plan, grants) for plan, grants in by_plan.values()]

    def leave(self, who: str, address: str) -> str:
        """Give up what one holds of a plan of somebody else; give the plan's name."""
        with self._database.sessions.begin() as session:
            plan, access = find(session, who, address)
            if access is Access.OWN:
                message = "this plan is your own; delete it where you do not need it any more"
                raise InputError(message)
            session.execute(delete(GrantRow).where(GrantRow.plan_id == plan.id, GrantRow.holder == who))
            return plan.name


def digest_of(secret: str) -> str:
    """Give the digest by which a secret is found; it has so many random bits that no salt is needed."""
    return hashlib.sha256(secret.encode(errors="replace")).hexdigest()


def checked_label(label: str) -> str:
    """Give for whom a link is without blanks around it; InputError where it cannot be used."""
    try:
        return checked_name(label)
    except InputError as error:
        message = "say for whom the link is, in 1 to 80 printable characters"
        raise InputError(message) from error


def _opened(session: Session, secret: str, *, for_change: bool = False) -> tuple[ShareRow, PlanRow]:
    now = datetime.now(UTC)
    wanted = (
        select(ShareRow, PlanRow)
        .join(PlanRow, PlanRow.id == ShareRow.plan_id)
        .where(ShareRow.secret_digest == digest_of(secret))
        .where(_holds(ShareRow.expires, now), PlanRow.expires > now)
    )
    if for_change:
        # The plan first, as who deletes it does: else each would wait for the other.
        mine = select(ShareRow.plan_id).where(ShareRow.secret_digest == digest_of(secret)).scalar_subquery()
        plans = select(PlanRow.id).where(PlanRow.id == mine)
        session.execute(plans.with_for_update(read=True, key_share=True))
        wanted = wanted.with_for_update(of=ShareRow)
    found = session.execute(wanted).one_or_none()
    if found is None:
        raise NotThereError(NO_LINK)
    share, plan = found
    return share, plan


def _shares(session: Session, plan: PlanRow, now: datetime) -> Sequence[ShareRow]:
    wanted = select(ShareRow).where(ShareRow.plan_id == plan.id, _holds(ShareRow.expires, now))
    return session.scalars(wanted.order_by(ShareRow.id.desc())).all()


def _holds(expires: QueryableAttribute[datetime | None], now: datetime) -> ColumnElement[bool]:
    return or_(expires.is_(None), expires > now)


def _check_day(until: date | None, today: date, last: date) -> None:
    if until is not None and not today <= until <= last:
        message = (
            f"the last day of a link must lie from today to {last:%Y-%m-%d}, when the plan itself ends; "
            "leave it blank for as long as the plan is kept"
        )
        raise InputError(message)


def _end_of(day: date) -> datetime:
    return datetime.combine(day, time(), UTC) + timedelta(days=1)


def _last_day(end: datetime) -> date:
    """Give the last day on which something holds that ends at a moment."""
    return (end - timedelta(microseconds=1)).date()


def _as_share(row: ShareRow, holders: int) -> Share:
    until = None if row.expires is None else _last_day(row.expires)
    return Share(row.id, row.label, row.may_edit, row.made, until, holders)


def _as_offer(share: ShareRow, plan: PlanRow, who: str) -> Offer:
    end = plan.expires if share.expires is None else min(share.expires, plan.expires)
    return Offer(plan.address, plan.name, share.may_edit, plan.owner == who, _last_day(end))


def _as_shared(plan: PlanRow, grants: list[GrantRow]) -> SharedPlan:
    edits = [grant for grant in grants if grant.may_edit]
    ends = [plan.expires if grant.expires is None else grant.expires for grant in edits or grants]
    end = min(max(ends), plan.expires)
    return SharedPlan(as_stored(plan, Access.EDIT if edits else Access.READ), _last_day(end))
