"""Whether there is room for one more file: of its owner, in the store as a whole, and on the disk.

Asked inside the transaction that stores the file, so that what does not fit leaves no trace.
"""

from __future__ import annotations

import shutil
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from webapp.busy import FullError
from webapp.guarding.bounds import Bounds
from webapp.keeping.records import PlanRow

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

    def _check_all(self, session: Session) -> None:
        if not self.bounds.mb_in_all:
            return
        kept = session.scalar(select(func.coalesce(func.sum(PlanRow.file_size), 0))) or 0
        if kept > self.bounds.mb_in_all * MB:
            message = (
                "this service is full, so nothing has been stored; delete plans that are not needed, and "
                "tell who runs the service, who may give it more room"
            )
            raise FullError(message)
