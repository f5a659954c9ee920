"""What every view needs of the running application: store, computations, the request's plan and units."""

from __future__ import annotations

import threading
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from typing import cast

from flask import current_app, g, redirect, request, session, url_for
from werkzeug.wrappers import Response

from cant.model.reading import Reading
from webapp.computing import Computations, Computed
from webapp.config import Config
from webapp.keeping.database import Database
from webapp.keeping.kept_limits import KeptLimitsStore
from webapp.keeping.results import Results
from webapp.keeping.store import Store, StoredPlan
from webapp.keeping.work_claims import Claims
from webapp.measures import SYSTEMS, Measures, measures
from webapp.people.signing import signatures_of
from webapp.proposals import Proposal
from webapp.security import owner
from webapp.working.asking import Background

EXTENSION = "cant"
UNITS = "units"
CLEANING_HOURS = 1
CLEARING_S = 5
LONG_AGO = datetime.min.replace(tzinfo=UTC)


@dataclass
class Running:
    """The parts of a running application."""

    config: Config
    database: Database
    store: Store
    kept_limits: KeptLimitsStore
    computations: Computations
    background: Background
    cleaned: datetime
    cleared: datetime = LONG_AGO
    stopping: threading.Event = field(default_factory=threading.Event)
    """Set when the service has been told to stop: it is not ready for more then."""

    def clean(self) -> None:
        """Delete what has expired, at most once an hour; clear away, soon, what readers kept from it."""
        now = datetime.now(UTC)
        if self.database.must_clear and now - self.cleared >= timedelta(seconds=CLEARING_S):
            self.cleared = now
            self.database.clear_away()
        if now - self.cleaned >= timedelta(hours=CLEANING_HOURS):
            self.cleaned = now
            self.store.remove_expired()
            Claims(self.database).tidy()
            Results(self.database).tidy()


def running() -> Running:
    """Give the parts of the application that answers this request."""
    return cast("Running", current_app.extensions[EXTENSION])


def current_measures() -> Measures:
    """Give the units of the request: as asked in its address, else as this browser chose, else the plan's."""
    if "measures" not in g:
        asked = request.args.get(UNITS) or session.get(UNITS)
        g.measures = measures(asked if asked in SYSTEMS else g.get("plan_units", "metric"))
    found: Measures = g.measures
    return found


def choose_units(system: str) -> None:
    """Let this browser's pages be in a system of units from now on."""
    session.permanent = True
    session[UNITS] = system
    g.pop("measures", None)


def stored(address: str) -> StoredPlan:
    """Give the owner's plan of an address; NotThereError."""
    plan = running().store.plan(owner(), address)
    g.plan = plan
    return plan


def file_of(plan: StoredPlan) -> bytes:
    """Give the bytes of a plan's file."""
    return running().store.file(owner(), plan.address)


def reading_of(plan: StoredPlan) -> Reading:
    """Give how a plan's file is read; pages are in its units where the browser has chosen none."""
    reading = running().computations.reading(plan, owner(), lambda: file_of(plan))
    settings = plan.decided.settings or reading.settings
    limits = plan.decided.limits or reading.limits
    if settings is not None or limits is not None:
        g.plan_units = settings.units if settings is not None else limits.units if limits else "metric"
    return reading


def computed_of(plan: StoredPlan) -> Computed:
    """Give a plan's result; pages are in its units where the browser has chosen none."""
    computed = planned_as(plan)
    g.plan_units = computed.planned.plan.settings.units
    return computed


def planned_as(plan: StoredPlan) -> Computed:
    """Give the result of a plan as it would be or has been, such as with a proposal."""
    return running().computations.planned(plan, owner(), lambda: file_of(plan))


def read_as(plan: StoredPlan, decisions: Mapping[str, str]) -> Reading:
    """Read a plan's list as if something else were decided; CantError where it cannot be read then.

    Parameters
    ----------
    plan : StoredPlan
    decisions : mapping of str to str
        Content by kind, as the store takes it; ``null`` takes back what was decided.
    """
    would_be = Proposal("", dict(decisions)).on(plan)
    return running().computations.reading(would_be, owner(), lambda: file_of(plan))


def workbook_of(plan: StoredPlan, computed: Computed, system: str) -> bytes:
    """Give the workbook of a plan, in a system of units; that of a long one is made in the background."""
    signed = signatures_of(running().database, plan)
    if _is_long(computed):
        return running().background.workbook(plan, owner(), system, signed)
    return computed.workbook(file_of(plan), plan.file_name, system, signed).data


def document_of(plan: StoredPlan, computed: Computed) -> Iterator[bytes]:
    """Give the JSON of a plan in pieces; that of a long one is made in the background."""
    return running().background.document(plan, owner()) if _is_long(computed) else computed.json_chunks()


def _is_long(computed: Computed) -> bool:
    return len(computed.planned.plan.assessed) > running().config.work.long_curves


def unconfirmed(plan: StoredPlan) -> Response | None:
    """Lead back to the list where the cants of a plan have not been asked for, None where they have."""
    if plan.decided.confirmed:
        return None
    return redirect(url_for("reading.show", address=plan.address))
