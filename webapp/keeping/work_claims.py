"""The queue as those see it who do the work: a piece is claimed, told of, and settled by who holds it alone.

Everything is one conditional UPDATE, which means the same on every database: a piece that was cancelled,
taken up by somebody else or deleted with its plan is no longer its worker's, and nothing of him is stored.
"""

from __future__ import annotations

import secrets
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta
from typing import Any

from sqlalchemy import ColumnElement, CursorResult, delete, select, update
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from webapp.keeping.database import Database
from webapp.keeping.records import FileRow, WorkRow
from webapp.keeping.results import put
from webapp.keeping.work import DONE, FAILED, OPEN, UNDER_WAY, WAITING, Piece, in_turn

LOST_AFTER = timedelta(seconds=15)
ENDED_KEPT = timedelta(days=2)
MOST_ATTEMPTS = 3
"""Times a piece may end its own process."""
MOST_LOSSES = 10
"""Times a piece may be lost with its worker: that is mostly not its own fault, such as a service killed."""
TRIES = 8
NAME_BYTES = 12
GIVEN_UP = (
    "The work ended several times without a result and without saying why. "
    "Who runs this service finds more in its log."
)


class Claims:
    """The queue, for who works.

    Parameters
    ----------
    database : Database
    """

    def __init__(self, database: Database) -> None:
        self._database = database

    def take(self, kinds: Sequence[str]) -> Piece | None:
        """Claim the next piece of some kinds, None where none waits."""
        for _ in range(TRIES):
            with self._database.sessions() as session:
                number = session.scalar(in_turn(select(WorkRow.id).where(WorkRow.kind.in_(kinds))).limit(1))
            if number is None:
                return None
            mine = {
                "state": UNDER_WAY,
                "worker": secrets.token_urlsafe(NAME_BYTES),
                "attempts": WorkRow.attempts + 1,
                "beat": datetime.now(UTC),
                "share": 0.0,
                "doing": "",
            }
            with self._database.sessions.begin() as session:
                if _changed(session, (WorkRow.id == number, WorkRow.state == WAITING), mine):
                    return Piece.of(session.scalars(select(WorkRow).where(WorkRow.id == number)).one())
        return None

    def file(self, piece: Piece) -> bytes | None:
        """Give the bytes of the file of a piece's plan, None where the plan is gone."""
        with self._database.sessions() as session:
            return session.scalar(select(FileRow.data).where(FileRow.plan_id == piece.plan_id))

    def tell(self, piece: Piece, share: float, doing: str) -> bool:
        """Tell how far a piece is; False where it is no longer its worker's."""
        now = {"share": share, "doing": doing[:120], "beat": datetime.now(UTC)}
        with self._database.sessions.begin() as session:
            return _changed(session, _mine(piece), now)

    def finish(self, piece: Piece, data: bytes) -> bool:
        """Store the result and that it is done, both or neither; False where it is no longer its worker's."""
        done = {"state": DONE, "share": 1.0, "doing": "", "ended": datetime.now(UTC)}
        try:
            with self._database.sessions.begin() as session:
                if not _changed(session, _mine(piece), done):
                    return False
                put(session, piece.plan_id, piece.kind, piece.key, data)
        except IntegrityError:  # the plan was deleted at this moment
            return False
        return True

    def end(self, piece: Piece, state: str, message: str) -> bool:
        """End a piece without a result, and say why."""
        ended = {"state": state, "message": message, "ended": datetime.now(UTC), "doing": ""}
        with self._database.sessions.begin() as session:
            return _changed(session, _mine(piece), ended)

    def give_back(self, piece: Piece, *, counts: bool) -> None:
        """Put a piece back; an attempt that counts brings it nearer to being given up."""
        if counts and piece.attempts >= MOST_ATTEMPTS:
            self.end(piece, FAILED, GIVEN_UP)
            return
        back: dict[str, Any] = {"state": WAITING, "worker": "", "share": 0.0, "doing": ""}
        if not counts:
            back["attempts"] = WorkRow.attempts - 1
        with self._database.sessions.begin() as session:
            _changed(session, _mine(piece), back)

    def find_lost(self) -> None:
        """Put back what was under way with somebody who has said nothing for some time, or give it up."""
        lost = (WorkRow.state == UNDER_WAY, WorkRow.beat < datetime.now(UTC) - LOST_AFTER)
        with self._database.sessions() as session:
            if session.scalar(select(WorkRow.id).where(*lost).limit(1)) is None:
                return
        often = WorkRow.attempts >= MOST_LOSSES
        given_up = {"state": FAILED, "message": GIVEN_UP, "ended": datetime.now(UTC), "worker": ""}
        with self._database.sessions.begin() as session:
            _changed(session, (*lost, often), given_up)
            _changed(session, lost, {"state": WAITING, "worker": "", "share": 0.0, "doing": ""})

    def tidy(self) -> None:
        """Delete what ended some days ago."""
        before = datetime.now(UTC) - ENDED_KEPT
        with self._database.sessions.begin() as session:
            session.execute(delete(WorkRow).where(WorkRow.state.not_in(OPEN), WorkRow.ended < before))


def _mine(piece: Piece) -> tuple[ColumnElement[bool], ...]:
    return (WorkRow.id == piece.id, WorkRow.state == UNDER_WAY, WorkRow.worker == piece.worker)


def _changed(session: Session, where: Sequence[ColumnElement[bool]], values: dict[str, Any]) -> bool:
    done = session.execute(
        update(WorkRow).where(*where).values(**values).execution_options(synchronize_session=False)
    )
    return isinstance(done, CursorResult) and done.rowcount > 0
