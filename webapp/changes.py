"""Changes that an engineer takes over the list as read: a cant held by hand, an option where nothing fits.

Each is one event of the plan's history, taken or taken back; what holds is the list that the events leave.
Two that are made at the same moment both hold, because no event repeats what another says.
"""

from __future__ import annotations

import secrets
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from cant.explaining import CantHeld, CurveKey, Decision, read_decision

KEY_BYTES = 9


@dataclass(frozen=True)
class Taken:
    """A change that holds.

    Attributes
    ----------
    key : str
        By which it is taken back.
    words : str
        What it is, in one sentence.
    decision : Decision
    """

    key: str
    words: str
    decision: Decision

    @property
    def on(self) -> CurveKey:
        """The curve that it is for."""
        return self.decision.changes[0].on

    @property
    def holds_cant(self) -> bool:
        """Whether it is a cant held by hand."""
        return isinstance(self.decision.changes[0], CantHeld)

    def as_plain(self) -> dict[str, Any]:
        """Give it as JSON values."""
        return {"key": self.key, "words": self.words, "decision": self.decision.as_json()}

    @classmethod
    def from_plain(cls, plain: Mapping[str, Any]) -> Taken:
        """Give what :meth:`as_plain` wrote."""
        return cls(plain["key"], plain["words"], read_decision(plain["decision"]))


def take(words: str, decision: Decision) -> dict[str, Any]:
    """Give the event that takes a change."""
    return {"take": Taken(secrets.token_urlsafe(KEY_BYTES), words, decision).as_plain()}


def with_reason(event: dict[str, Any], reason: str) -> dict[str, Any]:
    """Give an event with the engineer's reason in the cant that it holds, where that has none yet."""
    if "take" not in event:
        return event
    plain = event["take"]
    changes = [
        {**change, "because": change["because"] or reason} if change["what"] == "cant held" else change
        for change in plain["decision"]["changes"]
    ]
    return {"take": {**plain, "decision": {"changes": changes}}}


def take_back(key: str, words: str) -> dict[str, Any]:
    """Give the event that takes a change back."""
    return {"back": key, "words": words}


def follow(held: Sequence[Taken], event: dict[str, Any]) -> tuple[Taken, ...]:
    """Give the changes that hold after one more event.

    A cant held by hand takes the place of one that was held on the same curve before.
    """
    if "back" in event:
        return tuple(one for one in held if one.key != event["back"])
    new = Taken.from_plain(event["take"])
    rest = (one for one in held if not (new.holds_cant and one.holds_cant and one.on == new.on))
    return (*rest, new)


def together(held: Sequence[Taken]) -> Decision | None:
    """Give all changes that hold as one decision, None where there is none."""
    changes = tuple(change for one in held for change in one.decision.changes)
    return Decision(changes=changes) if changes else None
