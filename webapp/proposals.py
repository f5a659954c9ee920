"""A change that is looked at before it is kept: carried by the page itself, signed for owner and plan.

Nothing is stored until the engineer keeps it, and what comes back is what was shown.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from datetime import UTC, datetime

from flask import current_app
from itsdangerous import BadSignature, URLSafeSerializer

from cant.errors import InputError
from webapp.decisions import Decided, Decision
from webapp.keeping.store import StoredPlan
from webapp.security import SIGNING, owner


@dataclass(frozen=True)
class Proposal:
    """What would be decided.

    Attributes
    ----------
    words : str
        What it is, in one sentence.
    decisions : dict of str to str
        Content by kind, as the store takes it.
    reason : str
        The engineer's reason, as far as he has given one.
    known : int or None
        How many decisions of the plan he knows of; None for all.
    """

    words: str
    decisions: dict[str, str]
    reason: str = ""
    known: int | None = None

    def signed(self, plan: StoredPlan) -> str:
        """Give it as text for a form of a plan's page."""
        return str(_signer(plan).dumps([self.words, self.decisions, self.reason, self.known]))

    def on(self, plan: StoredPlan) -> StoredPlan:
        """Give the plan as it would be."""
        now = datetime.now(UTC)
        new = (Decision(kind, content, self.reason, now) for kind, content in self.decisions.items())
        return at_moment(plan, (*plan.history, *new))


def proposal_of(plan: StoredPlan, text: str) -> Proposal:
    """Read a proposal that a form sent back; InputError where it was not made here for this plan."""
    try:
        words, decisions, reason, known = _signer(plan).loads(text)
    except (BadSignature, ValueError) as error:
        message = "this proposal was not made here for this plan; open the page anew and try once more"
        raise InputError(message) from error
    return Proposal(words, decisions, reason, known)


def at_moment(plan: StoredPlan, history: Iterable[Decision]) -> StoredPlan:
    """Give a plan with other decisions, such as the first of its history."""
    known = tuple(history)
    return replace(plan, history=known, decided=Decided.of(known))


def _signer(plan: StoredPlan) -> URLSafeSerializer:
    salt = f"proposal/{owner()}/{plan.address}"
    return URLSafeSerializer(str(current_app.secret_key), salt=salt, signer_kwargs=SIGNING)
