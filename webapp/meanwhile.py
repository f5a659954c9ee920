"""Two people at the same plan: what somebody decides over a page that has meanwhile become old.

Every page that decides carries how many decisions its reader knew of. Where another one of the same thing
has come since, his is not taken silently in its place: he is told, is shown both, and decides again.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from cant.errors import CantError
from webapp.decisions import CHANGE, Decision

WORDS = {
    "answers": "how the list is read",
    "traffic": "the trains",
    "limits": "the limits",
    "settings": "how cants are chosen",
}
"""What a decision of each kind changes."""
CONFIRMS = "confirmed"


@dataclass(frozen=True)
class Newer:
    """A decision that who decides now did not know of.

    Attributes
    ----------
    number : int
        Its step in the history, counted from 1.
    decision : Decision
    """

    number: int
    decision: Decision

    @property
    def words(self) -> str:
        """What it changed."""
        if self.decision.kind == CHANGE:
            event = json.loads(self.decision.content)
            return f"this curve ({event['take']['words'] if 'take' in event else event['words']})"
        return WORDS.get(self.decision.kind, self.decision.kind)


class MeanwhileError(CantError):
    """A decision that would silently replace one that its maker has not seen.

    Attributes
    ----------
    newer : tuple of Newer
        What came meanwhile, oldest first.
    """

    def __init__(self, newer: Sequence[Newer]) -> None:
        self.newer = tuple(newer)
        last = self.newer[-1]
        by = last.decision.who or "somebody"
        super().__init__(
            f"{by} changed {last.words} in step {last.number} of the history, on "
            f"{last.decision.made:%Y-%m-%d %H:%M} UTC, after you had opened this page; so nothing of yours "
            "has been kept: look at both, then decide again"
        )


def unseen(history: Sequence[Decision], known: int, decisions: Mapping[str, str]) -> tuple[Newer, ...]:
    """Give what a decision would replace without its maker having seen it.

    Parameters
    ----------
    history : sequence of Decision
        All decisions of the plan, oldest first.
    known : int
        How many of them he knew of.
    decisions : mapping of str to str
        What is decided: content by kind.
    """
    known = max(known, 0)
    later = [Newer(known + i + 1, decision) for i, decision in enumerate(history[known:])]
    ruling = {decision.kind: decision.content for decision in history}
    return tuple(
        newer
        for newer in later
        if any(
            _clashes(newer.decision, kind, content)
            for kind, content in decisions.items()
            if ruling.get(kind, "null") != content
        )
    )


def _clashes(later: Decision, kind: str, content: str) -> bool:
    """Tell whether a decision would replace a later one, or rest on what that changed."""
    if kind == CONFIRMS:
        return later.kind in WORDS
    if later.kind != kind:
        return False
    if kind != CHANGE:
        return True
    # What is taken adds up, but for what is done to the same curve.
    return bool(curve := _curve(content)) and curve == _curve(later.content)


def _curve(content: str) -> Any:
    """Give the curve that a change is taken on, None where one is taken back."""
    event = json.loads(content)
    return event["take"]["decision"]["changes"][0].get("on") if "take" in event else None
