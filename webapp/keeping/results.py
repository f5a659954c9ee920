"""Results of background work in the database: kept to be quick, made again where they are gone."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, select, update
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from webapp.keeping.access import find
from webapp.keeping.database import Database
from webapp.keeping.records import ResultRow

KEPT_DAYS = 2
USED_EVERY = timedelta(hours=1)
KEPT = {"reading": 6, "plan": 6, "workbook": 2, "document": 2}
"""Newest results of each kind that are kept of one plan."""


class Results:
    """Results of all plans.

    Parameters
    ----------
    database : Database
    """

    def __init__(self, database: Database) -> None:
        self._database = database

    def of(self, who: str, address: str, key: str) -> bytes | None:
        """Give a result of a plan, None where it is not kept; NotThereError where there is no such plan."""
        with self._database.sessions() as session:
            plan_id = find(session, who, address)[0].id
        return self.of_plan(plan_id, key)

    def of_plan(self, plan_id: int, key: str) -> bytes | None:
        """Give a result of a plan by the number of its row."""
        now = datetime.now(UTC)
        with self._database.sessions() as session:
            row = session.scalar(select(ResultRow).where(ResultRow.plan_id == plan_id, ResultRow.key == key))
        if row is None:
            return None
        if now - row.used > USED_EVERY:
            with self._database.sessions.begin() as session:
                session.execute(update(ResultRow).where(ResultRow.id == row.id).values(used=now))
        return row.data

    def keep(self, plan_id: int, kind: str, key: str, data: bytes) -> None:
        """Keep a result that another one is made of; nothing happens where its plan is gone."""
        try:
            with self._database.sessions.begin() as session:
                put(session, plan_id, kind, key, data)
        except IntegrityError:
            return

    def forget(self, key: str) -> None:
        """Delete a result that cannot be used."""
        with self._database.sessions.begin() as session:
            session.execute(delete(ResultRow).where(ResultRow.key == key))

    def tidy(self) -> None:
        """Delete what nobody has used for some days."""
        before = datetime.now(UTC) - timedelta(days=KEPT_DAYS)
        with self._database.sessions.begin() as session:
            session.execute(delete(ResultRow).where(ResultRow.used < before))


def put(session: Session, plan_id: int, kind: str, key: str, data: bytes) -> None:
    """Put a result into a transaction; older ones of its kind that are too many go with it."""
    now = datetime.now(UTC)
    mine = (ResultRow.plan_id == plan_id, ResultRow.kind == kind)
    session.execute(delete(ResultRow).where(ResultRow.plan_id == plan_id, ResultRow.key == key))
    older = session.scalars(
        select(ResultRow.id).where(*mine).order_by(ResultRow.made.desc()).offset(KEPT[kind] - 1)
    ).all()
    if older:
        session.execute(delete(ResultRow).where(ResultRow.id.in_(older)))
    session.add(ResultRow(plan_id=plan_id, kind=kind, key=key, data=data, size=len(data), made=now, used=now))
    session.flush()
