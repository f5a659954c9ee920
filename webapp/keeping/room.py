"""Whether there is room for one more file or decision: of its owner, in the store as a whole, on the disk.

Asked inside the transaction that stores it, so that what does not fit leaves no trace. Decisions have a
bound of their own, because all of a plan's are taken into memory whenever it is looked at.
"""

from __future__ import annotations

import shutil
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from webapp.busy import FullError
from webapp.guarding.bounds import Bounds
from webapp.keeping.database import one_at_a_time
from webapp.keeping.records import DecisionRow, KeptLimitsRow, PlanRow

MB = 1_000_000
WRITTEN_TIMES = 2
"""A file is written into the log of an SQLite database, and from there into the database."""


@dataclass(frozen=True)
class Room:
    """The room of a store.

    Attributes
    ----------
    bounds : Bounds
    folder : Path or None
        Where an embedded database lies; None where the disk is that of a server.
    """

    bounds: Bounds = field(default_factory=Bounds)
    folder: Path | None = None

    def check_disk(self, size: int = 0) -> None:
        """Refuse what would leave too little room on the disk; FullError."""
        if self.folder is None:
            return
        free = shutil.disk_usage(self.folder).free
        if free - WRITTEN_TIMES * size < self.bounds.mb_kept_free * MB:
            message = (
                "there is no room left on the disk of this service, so nothing has been stored; "
                "delete plans that are not needed, and tell who runs the service"
            )
            raise FullError(message)

    def check(self, session: Session, owner: str) -> None:
        """Refuse where an owner's plans, with the one just made, are too many or too large; FullError."""
        count, size = session.execute(
            select(func.count(), func.coalesce(func.sum(PlanRow.file_size), 0)).where(PlanRow.owner == owner)
        ).one()
        if count > self.bounds.plans_per_person:
            message = (
                f"you keep {self.bounds.plans_per_person} plans already, which is as many as one person may; "
                "nothing has been stored: delete one that you no longer need, then bring this list again"
            )
            raise FullError(message)
        if size > self.bounds.mb_per_person * MB:
            message = (
                f"the files of your plans would be larger than {self.bounds.mb_per_person} MB together, "
                "which is as much as one person may keep; nothing has been stored: delete a plan that you no "
                "longer need, then bring this list again"
            )
            raise FullError(message)
        self._check_all(session)

    def check_decided(self, session: Session, owner: str) -> None:
        """Refuse where decisions on an owner's plans and limits that he keeps are too large; FullError."""
        decided = select(func.sum(func.length(DecisionRow.content))).join(PlanRow)
        kept = select(func.sum(func.length(KeptLimitsRow.content))).where(KeptLimitsRow.owner == owner)
        size = (session.scalar(decided.where(PlanRow.owner == owner)) or 0) + (session.scalar(kept) or 0)
        if size > self.bounds.mb_decided_per_person * MB:
            message = (
                "the decisions on the plans of who made this one, and the limits that he keeps, would be "
                f"larger than {self.bounds.mb_decided_per_person} MB together, which is as much as one "
                "person may keep; nothing has been stored: delete plans or kept limits that nobody needs"
            )
            raise FullError(message)

    def _check_all(self, session: Session) -> None:
        if not self.bounds.mb_in_all:
            return
        one_at_a_time(session, "room of all")
        kept = session.scalar(select(func.coalesce(func.sum(PlanRow.file_size), 0))) or 0
        if kept > self.bounds.mb_in_all * MB:
            message = (
                "this service is full, so nothing has been stored; delete plans that are not needed, and "
                "tell who runs the service, who may give it more room"
            )
            raise FullError(message)
