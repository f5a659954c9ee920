"""Lets people sign in at an application where that is set; where not, adds nothing to it."""

from __future__ import annotations

from typing import Any

from flask import Flask, Response, g

from webapp.config import Config
from webapp.keeping.database import Database
from webapp.keeping.signatures import SignOff
from webapp.people.events import tell
from webapp.people.guard import guard, needed_person, person
from webapp.people.people import EXTENSION, People
from webapp.people.signing import due, signatures_of
from webapp.people.taking_over import offered
from webapp.views import account, people, signing


def add_people(app: Flask, config: Config, database: Database) -> None:
    """Let people sign in, as configured; before whatever asks whose a request is."""
    settings = config.sign_in
    if not settings.on:
        return
    app.extensions[EXTENSION] = People(database, settings)
    for part in (account, signing, *((people,) if settings.accounts else ())):
        app.register_blueprint(part.pages)
    guard(app)
    sign_off = SignOff(database, config.keep_days)

    @app.context_processor
    def shared() -> dict[str, Any]:
        return {
            "person": person(),
            "offered": offered,
            "due": lambda: due(sign_off, needed_person().account),
            "signatures": lambda: signatures_of(database, g.plan),
            "signs_in_here": settings.accounts,
        }

    @app.after_request
    def tell_of_refusal(answer: Response) -> Response:
        who = person()
        if answer.status_code == 403 and who is not None:
            tell("refused", account=who.account.name)
        return answer
