"""The application factory: puts the parts together, in the one place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import UTC, datetime, timedelta
from typing import Any

from flask import Flask, g, request, url_for

from cant.model.plan import STATUSES
from cant.version import __version__
from cant.writing.cautions import CAUTIONS, UNVERIFIED
from webapp import words
from webapp.api import api
from webapp.computing import Computations
from webapp.config import Config
from webapp.context import EXTENSION, Running, current_measures, running
from webapp.drawings import svg
from webapp.errors import add_error_answers
from webapp.guarding import health
from webapp.guarding.access_log import AccessLog, add_access_log
from webapp.guarding.proxies import Proxies
from webapp.guarding.rates import Rates, add_rates_of_addresses, add_rates_of_people
from webapp.guarding.texts import refuse_null
from webapp.guarding.turns import Turns, add_turns
from webapp.history_view import remembered_name
from webapp.keeping.database import Database
from webapp.keeping.kept_limits import KeptLimitsStore
from webapp.keeping.results import Results
from webapp.keeping.store import Store
from webapp.keeping.work import WorkQueue
from webapp.measures import SYSTEM_WORDS
from webapp.people.joining import add_people
from webapp.security import SECURE_SESSION_COOKIE, SESSION_COOKIE, check_form, form_token, protect
from webapp.views import (
    comparing,
    curves,
    deciding,
    downloads,
    help,
    limits,
    reading,
    result,
    sharing,
    start,
    trains,
    waiting,
)
from webapp.views.waiting import add_not_yet
from webapp.working.asking import Background
from webapp.working.sealing import Seal

COOKIE_DAYS = 400
MOST_FORM_BYTES = 4_000_000
MOST_FORM_PARTS = 20_000


def create_app(config: Config | Mapping[str, Any] | None = None) -> Flask:
    """Make the application.

    Parameters
    ----------
    config : Config or mapping, optional
        What is configured, or Flask's own keys (``TESTING``) with a ``CANT`` entry that holds it; from the
        environment where not given.

    Returns
    -------
    Flask
        With the database migrated and what has expired deleted.

    Raises
    ------
    CantError
        Where the configuration or the database cannot be used.
    """
    flask_keys: dict[str, Any] = {} if config is None or isinstance(config, Config) else dict(config)
    given = config if isinstance(config, Config) else flask_keys.pop("CANT", None)
    used: Config = given or Config.from_environment()
    app = Flask("webapp")
    app.config.update(
        SECRET_KEY=used.key(),
        MAX_CONTENT_LENGTH=used.upload_mb * 1_000_000,
        MAX_FORM_MEMORY_SIZE=MOST_FORM_BYTES,
        MAX_FORM_PARTS=MOST_FORM_PARTS,
        SESSION_COOKIE_NAME=SECURE_SESSION_COOKIE if used.https else SESSION_COOKIE,
        SESSION_COOKIE_HTTPONLY=True,
        SESSION_COOKIE_SAMESITE="Lax",
        SESSION_COOKIE_SECURE=used.https,
        PERMANENT_SESSION_LIFETIME=timedelta(days=COOKIE_DAYS),
        SEND_FILE_MAX_AGE_DEFAULT=timedelta(hours=1),
        TRUSTED_HOSTS=list(used.trusted_hosts) or None,
    )
    app.config.update(flask_keys)
    app.json.sort_keys = False  # type: ignore[attr-defined]
    database = Database(used.database)
    store = Store(database, used.keep_days, used.bounds)
    store.remove_expired()
    queue = WorkQueue(database, used.work.waiting_per_person, used.work.waiting_in_all)
    background = Background(queue, Results(database), Seal(used.key()))
    computations = Computations(
        used.plans_in_memory, used.work.curves_in_memory, background, 1000 * used.work.long_file_kb
    )
    app.extensions[EXTENSION] = Running(
        used,
        database,
        store,
        KeptLimitsStore(database, used.keep_days, store.room),
        computations,
        background,
        datetime.now(UTC),
    )
    for part in (
        start,
        reading,
        trains,
        limits,
        result,
        curves,
        deciding,
        comparing,
        downloads,
        sharing,
        help,
        health,
        waiting,
    ):
        app.register_blueprint(part.pages)
    app.register_blueprint(api)
    add_error_answers(app)
    add_not_yet(app)
    protect(app, https=used.https)
    add_access_log(app)
    rates = Rates(used.bounds)
    add_rates_of_addresses(app, rates)
    add_people(app, used, database)
    add_rates_of_people(app, rates)
    _add_guards(app)
    add_turns(app, Turns(used.bounds.turns, used.bounds.wait_seconds))
    _add_words(app)
    app.wsgi_app = AccessLog(Proxies(app.wsgi_app, used.proxies))  # type: ignore[method-assign]
    return app


def _add_guards(app: Flask) -> None:
    @app.before_request
    def guard() -> None:
        running().clean()
        refuse_null()
        if request.method == "POST" and request.blueprint != "api":
            check_form()


def _add_words(app: Flask) -> None:
    """Give the templates what they all need."""
    app.jinja_env.trim_blocks = app.jinja_env.lstrip_blocks = True
    app.jinja_env.globals["frozenset"] = frozenset
    app.jinja_env.filters.update(
        show=lambda value, kind: current_measures().show(kind, value),
        measure=lambda value, kind: current_measures().with_unit(kind, value),
        day=lambda moment: f"{moment:%Y-%m-%d}",
        moment=lambda moment: f"{moment:%Y-%m-%d %H:%M} UTC",
        sentence=words.sentence,
    )

    @app.context_processor
    def shared() -> dict[str, Any]:
        return {
            "cautions": CAUTIONS,
            "unverified": UNVERIFIED,
            "form_token": form_token,
            "measures": current_measures(),
            "systems": SYSTEM_WORDS,
            "statuses": STATUSES,
            "words": words,
            "version": __version__,
            "plan": g.get("plan"),
            "back_here": _back_here,
            "my_name": remembered_name,
            "marker": lambda number: svg.marker(number, (8.0, 8.0), 5.0, f"class-{number % 6}"),
            "keep_days": running().config.keep_days,
        }


def _back_here() -> str:
    """Give the address to which a change of units leads back."""
    if request.method == "GET":
        return request.full_path.rstrip("?")
    plan = g.get("plan")
    return url_for("start.resume", address=plan.address) if plan else url_for("start.home")
