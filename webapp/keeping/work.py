"""The queue as those see it who ask for work: asked for once, looked at, cancelled, asked for again."""

from __future__ import annotations

import secrets
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from typing import Any

from sqlalchemy import ColumnElement, Select, delete, func, select, update
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session, aliased

from webapp.busy import BusyError
from webapp.keeping.access import Access, NotAllowedError, NotThereError, find
from webapp.keeping.database import Database, one_at_a_time
from webapp.keeping.records import PlanRow, WorkRow

WAITING, UNDER_WAY, DONE, REFUSED, FAILED, CANCELLED = (
    "waiting",
    "under way",
    "done",
    "refused",
    "failed",
    "cancelled",
)
"""States: ``refused`` is what the list itself does not allow, ``failed`` is what went wrong here."""
OPEN = (WAITING, UNDER_WAY)
STATES = (WAITING, UNDER_WAY, DONE, REFUSED, FAILED, CANCELLED)
ADDRESS_BYTES = 15
RECENTLY = timedelta(minutes=10)
NOBODY_AFTER = timedelta(seconds=60)
BUSY_RETRY_S = 30
MOST_ENDED = 30
"""Pieces of one plan that ended and are still known: each carries the decisions it was computed under."""


@dataclass(frozen=True)
class Piece:
    """A piece of work.

    Attributes
    ----------
    id, plan_id : int
    address : str
        Its name in URLs.
    key, kind, content : str
        What it is; see :mod:`webapp.working.orders`.
    state : str
        One of :data:`STATES`.
    share : float
        Share done, 0 to 1.
    doing, message : str
        What is being done; why it ended, where it was not done.
    attempts : int
        How often it was begun.
    worker : str
        Who does it; another name for every attempt.
    asked_by : str
    made : datetime
    """

    id: int
    plan_id: int
    address: str
    key: str
    kind: str
    content: str
    state: str
    share: float
    doing: str
    message: str
    attempts: int
    worker: str
    asked_by: str
    made: datetime

    @classmethod
    def of(cls, row: WorkRow) -> Piece:
        """Make it of a row."""
        return cls(**{name: getattr(row, name) for name in cls.__dataclass_fields__})

    @property
    def is_open(self) -> bool:
        """Whether it is still to be done."""
        return self.state in OPEN


class WorkQueue:
    """The queue, for who asks.

    Parameters
    ----------
    database : Database
    per_person, in_all : int
        Pieces that may wait at the same time.
    """

    def __init__(self, database: Database, per_person: int, in_all: int) -> None:
        self._database = database
        self._per_person, self._in_all = per_person, in_all

    def ask(self, who: str, address: str, kind: str, key: str, content: str) -> Piece:
        """Give the piece that makes a result of a plan; it is put into the queue where it is not there.

        One that ended without its result, other than done, is given as it is: who asks decides whether it is
        begun again.

        Raises
        ------
        NotThereError
            No such plan for ``who``.
        BusyError
            Too much is waiting.
        """
        with self._database.sessions() as session:
            plan_id = find(session, who, address)[0].id
            row = session.scalars(_same(plan_id, key)).first()
            if row is not None and row.state != DONE:
                return Piece.of(row)
        try:
            with self._database.sessions.begin() as session:
                row = session.scalars(_same(plan_id, key).with_for_update()).first()
                if row is not None and row.state != DONE:
                    return Piece.of(row)
                self._check_room(session, who)
                if row is None:
                    _forget_old(session, plan_id)
                    row = WorkRow(plan_id=plan_id, key=key, kind=kind, content=content)
                    row.address = secrets.token_urlsafe(ADDRESS_BYTES)
                    session.add(row)
                _begin_anew(row, who)
                session.flush()
                return Piece.of(row)
        except IntegrityError:
            # Somebody asked for the same at this moment, or the plan was deleted.
            with self._database.sessions() as session:
                find(session, who, address)
                return Piece.of(session.scalars(_same(plan_id, key)).one())

    def piece(self, who: str, address: str, work: str) -> Piece:
        """Give a piece of a plan by its address; NotThereError."""
        with self._database.sessions() as session:
            return Piece.of(_find(session, who, address, work))

    def of_plan(self, who: str, address: str) -> list[Piece]:
        """Give all pieces of a plan that are known, the latest first; NotThereError."""
        with self._database.sessions() as session:
            plan = find(session, who, address)[0]
            rows = select(WorkRow).where(WorkRow.plan_id == plan.id).order_by(WorkRow.made.desc())
            return [Piece.of(row) for row in session.scalars(rows)]

    def open_of(self, addresses: Sequence[str]) -> dict[str, list[Piece]]:
        """Give what is waiting or under way, by the address of its plan."""
        found: dict[str, list[Piece]] = {}
        with self._database.sessions() as session:
            rows = (
                select(PlanRow.address, WorkRow)
                .join(WorkRow, WorkRow.plan_id == PlanRow.id)
                .where(PlanRow.address.in_(addresses), WorkRow.state.in_(OPEN))
                .order_by(WorkRow.made)
            )
            for address, row in session.execute(rows):
                found.setdefault(address, []).append(Piece.of(row))
        return found

    def before(self, piece: Piece) -> int:
        """Give how many pieces are taken up before one that waits, as it looks now."""
        if piece.state != WAITING:
            return 0
        with self._database.sessions() as session:
            order = list(session.scalars(in_turn(select(WorkRow.id))))
        return order.index(piece.id) if piece.id in order else 0

    def nobody_works(self, piece: Piece) -> bool:
        """Tell whether a piece has been waiting for some time while nobody did anything."""
        now = datetime.now(UTC)
        if piece.state != WAITING or now - piece.made < NOBODY_AFTER:
            return False
        with self._database.sessions() as session:
            last = session.scalar(select(func.max(WorkRow.beat)))
        return last is None or now - last > NOBODY_AFTER

    def is_left_alone(self) -> bool:
        """Tell whether any work has been waiting for some time while nobody did anything."""
        now = datetime.now(UTC)
        with self._database.sessions() as session:
            oldest = session.scalar(select(func.min(WorkRow.made)).where(WorkRow.state == WAITING))
            last = session.scalar(select(func.max(WorkRow.beat)))
        return (
            oldest is not None and now - oldest > NOBODY_AFTER and (last is None or now - last > NOBODY_AFTER)
        )

    def cancel(self, who: str, address: str, work: str) -> Piece:
        """Cancel a piece that is not done; who may edit the plan can, and who asked for it.

        Raises
        ------
        NotThereError, NotAllowedError
        """
        with self._database.sessions.begin() as session:
            row = _find(session, who, address, work)
            if row.asked_by != who and find(session, who, address)[1] < Access.EDIT:
                message = "only who asked for this work, or may change the plan, can cancel it"
                raise NotAllowedError(message)
            ended = {"state": CANCELLED, "ended": datetime.now(UTC), "worker": ""}
            session.execute(
                update(WorkRow).where(WorkRow.id == row.id, WorkRow.state.in_(OPEN)).values(**ended)
            )
            session.refresh(row)
            return Piece.of(row)

    def again(self, who: str, address: str, work: str) -> Piece:
        """Put a piece that was cancelled or failed into the queue again; NotThereError, BusyError."""
        with self._database.sessions.begin() as session:
            row = _find(session, who, address, work, for_change=True)
            if row.state in (CANCELLED, FAILED):
                self._check_room(session, who)
                _begin_anew(row, who)
                session.flush()
            return Piece.of(row)

    def _check_room(self, session: Session, who: str) -> None:
        one_at_a_time(session, "room in the queue")
        waiting = select(func.count()).where(WorkRow.state == WAITING)
        if (session.scalar(waiting.where(WorkRow.asked_by == who)) or 0) >= self._per_person:
            message = "As much of yours is waiting as may; cancel something, or come back when some is done."
            raise BusyError(BUSY_RETRY_S, message)
        if (session.scalar(waiting) or 0) >= self._in_all:
            raise BusyError(BUSY_RETRY_S)


def in_turn(wanted: Select[Any]) -> Select[Any]:
    """Let a selection of rows be those that wait, in the order in which they are taken up.

    First of whom the fewest pieces are under way, then of whom the fewest were begun lately, then the oldest.
    """
    now = datetime.now(UTC)
    return wanted.where(WorkRow.state == WAITING).order_by(
        _count_of_asker(lambda row: row.state == UNDER_WAY),
        _count_of_asker(lambda row: row.beat > now - RECENTLY),
        WorkRow.made,
        WorkRow.id,
    )


def _count_of_asker(which: Any) -> ColumnElement[int]:
    other = aliased(WorkRow)
    counted = select(func.count(other.id)).where(other.asked_by == WorkRow.asked_by, which(other))
    return counted.correlate(WorkRow).scalar_subquery()


def _same(plan_id: int, key: str) -> Select[WorkRow]:
    return select(WorkRow).where(WorkRow.plan_id == plan_id, WorkRow.key == key)


def _find(session: Session, who: str, address: str, work: str, *, for_change: bool = False) -> WorkRow:
    plan = find(session, who, address)[0]
    wanted = select(WorkRow).where(WorkRow.plan_id == plan.id, WorkRow.address == work)
    row = session.scalar(wanted.with_for_update() if for_change else wanted)
    if row is None:
        message = "there is no such work of this plan: it was done some days ago, or never asked for"
        raise NotThereError(message)
    return row


def _forget_old(session: Session, plan_id: int) -> None:
    """Delete what ended longest ago of a plan, so that no more is known of it than may."""
    ended = select(WorkRow.id).where(WorkRow.plan_id == plan_id, WorkRow.state.not_in(OPEN))
    old = session.scalars(
        ended.order_by(WorkRow.ended.desc(), WorkRow.id.desc()).offset(MOST_ENDED - 1)
    ).all()
    if old:
        session.execute(delete(WorkRow).where(WorkRow.id.in_(old)))


def _begin_anew(row: WorkRow, who: str) -> None:
    row.state, row.share, row.doing, row.message = WAITING, 0.0, "", ""
    row.attempts, row.worker, row.asked_by = 0, "", who
    row.made, row.ended = datetime.now(UTC), None
