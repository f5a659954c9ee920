"""Whether who asks may do what a page is for: asked before anything is computed, and by the store again."""

from __future__ import annotations

from flask import request

from webapp.context import stored
from webapp.keeping.access import Access, check_access
from webapp.keeping.store import StoredPlan

COMPARE = "compare"
"""Field of a form that shows what would change, and keeps nothing."""


def to_change(address: str) -> StoredPlan:
    """Give a plan on which who asks may decide; NotThereError, NotAllowedError."""
    return _with(address, Access.EDIT)


def to_change_or_compare(address: str) -> StoredPlan:
    """Give a plan for a form that decides, or only shows what it would change, which a reader may see."""
    plan = stored(address)
    if not compares(plan):
        check_access(plan.access, Access.EDIT)
    return plan


def compares(plan: StoredPlan) -> bool:
    """Tell whether the form at hand only shows what it would change."""
    return COMPARE in request.form and plan.decided.confirmed


def of_my_own(address: str) -> StoredPlan:
    """Give a plan that belongs to who asks; NotThereError, NotAllowedError."""
    return _with(address, Access.OWN)


def _with(address: str, need: Access) -> StoredPlan:
    plan = stored(address)
    check_access(plan.access, need)
    return plan
