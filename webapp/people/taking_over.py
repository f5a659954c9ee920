"""What a browser made before somebody signed in there: offered to him, and taken over only if he says so."""

from __future__ import annotations

from flask import session

from webapp.people.guard import Person
from webapp.people.people import people
from webapp.security import OWNER

BEFORE = "before"


def before_signing_in() -> str:
    """Give the owner of the plans that this browser made before, "" where it has none."""
    before = session.get(BEFORE) or session.get(OWNER)
    return before if isinstance(before, str) and people().sign_ins.plans_of(before) else ""


def offered() -> int:
    """Give how many plans this browser made before."""
    before = before_signing_in()
    return people().sign_ins.plans_of(before) if before else 0


def take_over(who: Person) -> int:
    """Give what the browser made to who has signed in; give how many plans."""
    before = before_signing_in()
    forget()
    return people().sign_ins.take_over(before, who.owner) if before else 0


def forget() -> None:
    """Let the browser forget what it made; nobody can open it any more, and it expires."""
    session.pop(BEFORE, None)
    session.pop(OWNER, None)
