"""Which decisions of a plan the reader of a form had seen, carried by the form itself.

A form is read against the plan that it was shown with, and decides for somebody who knows a number of its
decisions. Both are the plan of now when a page is opened; on a page that tells of another's decision the
fields stay as they were sent, and what is known is all there is.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from webapp.keeping.store import StoredPlan
from webapp.meanwhile import MeanwhileError, unseen
from webapp.proposals import at_moment

BASE, KNOWN = "base", "known"


@dataclass(frozen=True)
class Steps:
    """Decisions that a form and its reader know of.

    Attributes
    ----------
    base : int
        How many there were when the fields were filled.
    known : int
        How many who sends the form has seen.
    """

    base: int
    known: int

    @classmethod
    def now(cls, plan: StoredPlan) -> Steps:
        """Give those of a page that is opened."""
        return cls(len(plan.history), len(plan.history))

    @classmethod
    def sent(cls, form: Mapping[str, str], plan: StoredPlan) -> Steps:
        """Give those that a form was sent with; of now where it tells none."""
        return cls(_step(form.get(BASE, ""), plan), _step(form.get(KNOWN, ""), plan))

    def shown_with(self, plan: StoredPlan) -> StoredPlan:
        """Give the plan as it was when the fields were filled."""
        return plan if self.base == len(plan.history) else at_moment(plan, plan.history[: self.base])

    def aware(self, plan: StoredPlan) -> Steps:
        """Give those of a page with the same fields that tells of everything decided until now."""
        return replace(self, known=len(plan.history))

    def check(self, plan: StoredPlan, decisions: Mapping[str, str]) -> None:
        """Refuse early what the store would refuse; MeanwhileError."""
        if newer := unseen(plan.history, self.known, decisions):
            raise MeanwhileError(newer)


def _step(text: str, plan: StoredPlan) -> int:
    most = len(plan.history)
    return min(int(text), most) if text.isascii() and text.isdigit() and len(text) < 8 else most
