"""The history of a plan in words: what was decided, when, by whom and why; moments that can be compared."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass

from flask import g, session

from webapp.decisions import CHANGE, Decision
from webapp.forms import Fields
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.security import PERSON

WHO = "who"
LONGEST_WHO = 80
KIND_WORDS = {
    "answers": "How the list is read",
    "traffic": "The trains",
    "limits": "The limits",
    "settings": "How cants are chosen",
    "confirmed": "The cants asked for",
}


@dataclass(frozen=True)
class Step:
    """One decision of the history: its number from 1, and its words."""

    number: int
    words: str
    decision: Decision


def moments(plan: StoredPlan) -> list[Step]:
    """Give the decisions of a plan, oldest first."""
    return [Step(i + 1, words_of(decision), decision) for i, decision in enumerate(plan.history)]


def words_of(decision: Decision) -> str:
    """Say what was decided."""
    if decision.kind == CHANGE:
        event = json.loads(decision.content)
        return str(event["take"]["words"]) if "take" in event else f"Taken back: {event['words']}"
    again = ": as in the file again" if decision.content == "null" else ""
    return f"{KIND_WORDS.get(decision.kind, decision.kind)}{again}"


def moment_of(text: str) -> int:
    """Give the number of a step that an address names, 0 where it names none."""
    return int(text) if text.isascii() and text.isdigit() and len(text) < 7 else 0


def signed_by(form: Mapping[str, str]) -> tuple[str, str, dict[str, str]]:
    """Give reason, name and problems of a form; the name is remembered for this browser's next form.

    Who has signed in decides under his own name, whatever the form says.
    """
    fields = Fields(form, measures("metric"))
    reason, who = fields.text("because", words="the reason", needed=True), fields.text(WHO)
    if g.get(PERSON) is not None:
        return reason, remembered_name(), fields.problems
    if len(who) > LONGEST_WHO:
        fields.problems[WHO] = f"at most {LONGEST_WHO} characters"
    if not fields.problems:
        session[WHO] = who
    return reason, who, fields.problems


def decider(given: str = "") -> str:
    """Give the name under which a program decides: of who has signed in, else what it gives."""
    return remembered_name() if g.get(PERSON) is not None else given


def remembered_name() -> str:
    """Give the name of who has signed in, else the name that this browser gave last."""
    if g.get(PERSON) is not None:
        return str(g.person.account.shown)[:LONGEST_WHO]
    return str(session.get(WHO, ""))
