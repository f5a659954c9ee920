"""Limits that somebody keeps under a name for the next plan."""

from __future__ import annotations

import json
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

from sqlalchemy import delete, select
from sqlalchemy.exc import IntegrityError

from cant.errors import InputError
from cant.model.limits import LimitSet
from webapp.decisions import limits_from_plain, limits_text
from webapp.keeping.database import Database
from webapp.keeping.records import KeptLimitsRow
from webapp.keeping.room import Room
from webapp.keeping.store import checked_name

KEPT_FOR = 12
"""Times as long as a plan."""


@dataclass(frozen=True)
class KeptLimits:
    """Limits kept under a name."""

    name: str
    limits: LimitSet
    expires: datetime


class KeptLimitsStore:
    """Limits kept by all owners.

    Parameters
    ----------
    database : Database
    keep_days : int
        Days after the last change until a plan is deleted; limits stay :data:`KEPT_FOR` times as long.
    room : Room, optional
        Room of the store.
    """

    def __init__(self, database: Database, keep_days: int, room: Room | None = None) -> None:
        self._database = database
        self._room = room or Room()
        self._keep = KEPT_FOR * timedelta(days=keep_days)

    def keep(self, owner: str, name: str, limits: LimitSet) -> None:
        """Keep limits under a name, which replaces what had that name; FullError where there is no room."""
        name = checked_name(name)
        now = datetime.now(UTC)
        content = limits_text(limits)
        self._room.check_disk(len(content))
        try:
            with self._database.sessions.begin() as session:
                row = session.scalar(
                    select(KeptLimitsRow).where(KeptLimitsRow.owner == owner, KeptLimitsRow.name == name)
                )
                if row is None:
                    row = KeptLimitsRow(owner=owner, name=name)
                    session.add(row)
                row.content, row.changed, row.expires = content, now, now + self._keep
                session.flush()
                self._room.check_decided(session, owner)
        except IntegrityError as error:
            message = f"limits named '{name}' were being kept at the same moment; try once more"
            raise InputError(message) from error

    def of(self, owner: str) -> list[KeptLimits]:
        """Give the limits an owner keeps, by name."""
        wanted = select(KeptLimitsRow).where(
            KeptLimitsRow.owner == owner, KeptLimitsRow.expires > datetime.now(UTC)
        )
        with self._database.sessions() as session:
            return [
                KeptLimits(row.name, limits_from_plain(json.loads(row.content)), row.expires)
                for row in session.scalars(wanted.order_by(KeptLimitsRow.name))
            ]

    def forget(self, owner: str, name: str) -> None:
        """Delete limits kept under a name; nothing happens where there are none."""
        with self._database.sessions.begin() as session:
            session.execute(
                delete(KeptLimitsRow).where(KeptLimitsRow.owner == owner, KeptLimitsRow.name == name)
            )
