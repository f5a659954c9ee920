"""Who may do what with a plan: its owner everything, a holder of a grant what it says, nobody else anything.

The one place that decides it, so that every other question to the database asks here: what belongs to
somebody else and is not shared with him does not exist.
"""

from __future__ import annotations

from datetime import UTC, datetime
from enum import IntEnum

from sqlalchemy import or_, select
from sqlalchemy.orm import Session

from cant.errors import CantError
from webapp.keeping.records import GrantRow, PlanRow


class Access(IntEnum):
    """What somebody may do with a plan; each includes what stands before it."""

    READ = 1
    EDIT = 2
    OWN = 3


class NotThereError(CantError):
    """No such plan for who asks: never made, deleted, expired, or somebody else's and not shared."""


class NotAllowedError(CantError):
    """A plan that who asks may see, but not do this with."""


def find(
    session: Session, who: str, address: str, need: Access = Access.READ, *, for_change: bool = False
) -> tuple[PlanRow, Access]:
    """Give a plan's row and what somebody may do with it.

    Parameters
    ----------
    session : Session
    who : str
        Owner, or holder of a grant.
    address : str
    need : Access
        The least that must be allowed.
    for_change : bool
        Lock the row until the transaction ends.

    Raises
    ------
    NotThereError
        No such plan for ``who``.
    NotAllowedError
        ``who`` may see it, but ``need`` is more.
    """
    now = datetime.now(UTC)
    wanted = select(PlanRow).where(PlanRow.address == address, PlanRow.expires > now)
    plan = session.scalar(wanted.with_for_update() if for_change else wanted)
    access = None if plan is None else _access(session, plan, who, now)
    if plan is None or access is None:
        message = (
            "there is no such plan here: it may have expired, been deleted, belong to somebody else, or no "
            "longer be shared with you"
        )
        raise NotThereError(message)
    check_access(access, need)
    return plan, access


def check_access(access: Access, need: Access) -> None:
    """Refuse what is more than somebody may do with a plan; NotAllowedError."""
    if access < need:
        message = (
            "this plan is shared with you to read; nothing of it can be changed"
            if access is Access.READ and need is Access.EDIT
            else "only who made this plan can do this with it"
        )
        raise NotAllowedError(message)


def _access(session: Session, plan: PlanRow, who: str, now: datetime) -> Access | None:
    if plan.owner == who:
        return Access.OWN
    granted = session.scalars(
        select(GrantRow.may_edit).where(
            GrantRow.plan_id == plan.id,
            GrantRow.holder == who,
            or_(GrantRow.expires.is_(None), GrantRow.expires > now),
        )
    ).all()
    if not granted:
        return None
    return Access.EDIT if any(granted) else Access.READ
