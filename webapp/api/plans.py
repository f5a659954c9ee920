"""Operations on plans: make, look through, decide, delete."""

from __future__ import annotations

import contextlib
from typing import Any

from flask import Response

from cant import service
from cant.errors import InputError
from cant.model.limits import LimitSet
from cant.reading import reading_document
from webapp.access import to_change
from webapp.api.models import (
    AnswersBody,
    KnownQuery,
    LimitsBody,
    PlanList,
    PlanSummary,
    ReadingAnswer,
    SettingsBody,
    TrafficBody,
)
from webapp.api.operations import operation
from webapp.busy import BusyError
from webapp.context import read_as, reading_of, running, stored
from webapp.deciding import checked_units
from webapp.decisions import as_text, limits_text, settings_text, traffic_text
from webapp.history_view import decider
from webapp.keeping.shares import Shares
from webapp.security import new_key, owner
from webapp.uploads import needed, uploaded
from webapp.working.asking import NotYetError

XLSX = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"


@operation("POST", "/plans", code=201, answer=PlanSummary, upload=True, open=True)
def create_plan() -> PlanSummary:
    """Make a plan from a curve list, with trains, limits and settings beside it where they are not in it."""
    data, name = needed("file", "a workbook or a csv file with a curve list")
    traffic, limits, settings = (uploaded(field) for field in ("traffic", "limits", "settings"))
    decisions: dict[str, str] = {"confirmed": as_text(True)}
    if running().computations.is_long(len(data)):
        tables = service.tables_beside(traffic=traffic, limits=limits, settings=settings)
    else:
        reading = service.read_curves(data, name, traffic=traffic, limits=limits, settings=settings)
        tables = (reading.traffic, reading.limits, reading.settings)
    if traffic and tables[0]:
        decisions["traffic"] = traffic_text(tables[0])
    if limits and tables[1]:
        decisions["limits"] = limits_text(tables[1])
    if settings and tables[2]:
        decisions["settings"] = settings_text(tables[2])
    key = new_key()
    plan = running().store.add(owner(), name, data, decisions)
    if running().computations.is_long(len(data)):
        # Its reading begins at once; where that must wait, it is asked for with the first question.
        with contextlib.suppress(NotYetError, BusyError):
            reading_of(plan)
    return PlanSummary.of(plan, key)


@operation("GET", "/plans", answer=PlanList)
def list_plans() -> PlanList:
    """List the caller's plans, then those that others share with him."""
    shared = Shares(running().database).shared_with(owner())
    own = running().store.plans(owner())
    return PlanList(plans=[PlanSummary.of(plan) for plan in (*own, *(one.plan for one in shared))])


@operation("GET", "/plans/{address}", answer=PlanSummary)
def get_plan(address: str) -> PlanSummary:
    """Tell what is kept of a plan, and until when."""
    return PlanSummary.of(stored(address))


@operation("DELETE", "/plans/{address}", code=204)
def delete_plan(address: str) -> None:
    """Delete a plan with its file."""
    running().store.remove(owner(), address)


@operation("GET", "/plans/{address}/reading", answer=ReadingAnswer, later=True)
def get_reading(address: str) -> dict[str, Any]:
    """Tell how the file is read: columns, questions, rejected rows."""
    return dict(reading_document(reading_of(stored(address))))


@operation(
    "PUT", "/plans/{address}/answers", answer=ReadingAnswer, body=AnswersBody, query=KnownQuery, later=True
)
def put_answers(address: str, body: AnswersBody, query: KnownQuery) -> dict[str, Any]:
    """Answer questions and correct columns; the file is read anew."""
    plan = to_change(address)
    given = {key: value for key, value in body.model_dump().items() if value} or None
    reading = read_as(plan, {"answers": as_text(given)})
    _decided(address, {"answers": as_text(given)}, query)
    return dict(reading_document(reading))


@operation(
    "PUT", "/plans/{address}/traffic", answer=PlanSummary, body=TrafficBody, query=KnownQuery, later=True
)
def put_traffic(address: str, body: TrafficBody, query: KnownQuery) -> PlanSummary:
    """Replace the traffic."""
    plan = to_change(address)
    traffic = body.traffic()
    read_as(plan, {"traffic": traffic_text(traffic)})
    return _decided(address, {"traffic": traffic_text(traffic)}, query)


@operation(
    "PUT", "/plans/{address}/limits", answer=PlanSummary, body=LimitsBody, query=KnownQuery, later=True
)
def put_limits(address: str, body: LimitsBody, query: KnownQuery) -> PlanSummary:
    """Replace the limits: by a set that comes with the program, or by rules that are sent."""
    plan = to_change(address)
    limits = _limits(body)
    read_as(plan, {"limits": limits_text(limits)})
    return _decided(address, {"limits": limits_text(limits)}, query)


@operation("PUT", "/plans/{address}/settings", answer=PlanSummary, body=SettingsBody, query=KnownQuery)
def put_settings(address: str, body: SettingsBody, query: KnownQuery) -> PlanSummary:
    """Replace the settings."""
    to_change(address)
    return _decided(address, {"settings": settings_text(body.settings())}, query)


@operation("GET", "/template", answer=XLSX, open=True)
def get_template() -> Response:
    """Give an empty workbook to fill in."""
    return Response(service.template(), mimetype=XLSX)


def _limits(body: LimitsBody) -> LimitSet:
    if body.rows is not None:
        return checked_units(body.own())
    found = service.limits_named(body.name)
    if found is None:
        message = f"there is no limit set '{body.name}'; there are {', '.join(service.limit_set_names())}"
        raise InputError(message)
    return found


def _decided(address: str, decisions: dict[str, str], query: KnownQuery) -> PlanSummary:
    decided = running().store.decide(owner(), address, decisions, who=decider(), known=query.known)
    return PlanSummary.of(decided)
