"""Lets people sign in at an application where that is set; where not, adds nothing to it."""

from __future__ import annotations

from typing import Any

from flask import Flask

from webapp.config import Config
from webapp.keeping.database import Database
from webapp.people.guard import guard, person
from webapp.people.people import EXTENSION, People
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

    @app.context_processor
    def shared() -> dict[str, Any]:
        return {"person": person(), "offered": offered, "signs_in_here": settings.accounts}
