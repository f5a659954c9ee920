"""Whether who asks may do what a page is for: asked before anything is computed, and by the store again."""

from __future__ import annotations

from webapp.context import stored
from webapp.keeping.store import Access, StoredPlan, check_access


def to_change(address: str) -> StoredPlan:
    """Give a plan on which who asks may decide; NotThereError, NotAllowedError."""
    return _with(address, Access.EDIT)


def of_my_own(address: str) -> StoredPlan:
    """Give a plan that belongs to who asks; NotThereError, NotAllowedError."""
    return _with(address, Access.OWN)


def _with(address: str, need: Access) -> StoredPlan:
    plan = stored(address)
    check_access(plan.access, need)
    return plan
