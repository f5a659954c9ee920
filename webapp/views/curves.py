"""The page of one curve: everything the plan knows of it, and its canted section."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from flask import Blueprint, jsonify, render_template, request
from flask.typing import ResponseReturnValue

from cant.errors import InputError
from cant.explaining import CurveKey
from webapp import curve_view, line_view, moving
from webapp.computing import Computed
from webapp.context import computed_of, current_measures, stored, unconfirmed
from webapp.keeping.access import NotThereError
from webapp.keeping.store import StoredPlan
from webapp.measures import measures

pages = Blueprint("curves", __name__, url_prefix="/plans/<address>")


@pages.get("/curves/<int:number>")
def show(address: str, number: int) -> ResponseReturnValue:
    """Show a curve by its number in the list, counted from 1."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    index = number - 1
    if not computed.listing.has(index):
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    return page_of_curve(plan, index)


@pages.get("/curves/<int:number>/at")
def at(address: str, number: int) -> ResponseReturnValue:
    """Give a curve at a cant in mm, the neighbours as they are: its record and the panel that shows it."""
    computed, index, cant = _asked(address, number)
    found = moving.moved(computed, index, cant, current_measures())
    return jsonify({"record": found.record, "markup": render_template("at_cant.html", moved=found)})


@pages.get("/curves/<int:number>/held")
def held(address: str, number: int) -> ResponseReturnValue:
    """Give what the chain of a curve would do with a cant in mm held."""
    computed, index, cant = _asked(address, number)
    found = moving.around(computed, index, cant, current_measures())
    return jsonify({"markup": render_template("chain_around.html", around=found)})


def _asked(address: str, number: int) -> tuple[Computed, int, float]:
    """Give the plan, the curve and the cant that an address asks for."""
    plan = stored(address)
    if not plan.decided.confirmed:
        message = "the cants of this plan have not been asked for"
        raise InputError(message)
    computed = computed_of(plan)
    index = number - 1
    if not computed.listing.has(index) or not computed.planned.plan.outcome.planned[index]:
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    cant = _number(request.args.get("cant", ""))
    if cant is None or not 0 <= cant <= moving.LARGEST_MM:
        message = f"the cant must be a number from 0 to {moving.LARGEST_MM:.0f}"
        raise InputError(message)
    return computed, index, cant


def _number(text: str) -> float | None:
    try:
        found = float(text.replace(",", "."))
    except ValueError:
        return None
    return found if math.isfinite(found) else None


def _moved(
    computed: Computed, index: int, record: Mapping[str, Any], sent: Mapping[str, str]
) -> dict[str, Any]:
    """Give what the page needs to move the cant: empty where the curve has none."""
    if record["recommended_cant_mm"] is None:
        return {}
    shown_in = current_measures()
    asked = _number((sent or request.args).get("cant", ""))
    if asked is not None:
        asked = measures((sent or request.args).get("units", shown_in.system)).canonical("cant", asked)
    inside = asked is not None and 0 <= asked <= moving.LARGEST_MM
    cant = asked if inside and asked is not None else record["recommended_cant_mm"]
    if not 0 <= cant <= moving.LARGEST_MM:
        return {}
    return {
        "looked_at": cant,
        "offered": moving.slider(computed, index).levels,
        "moved": moving.moved(computed, index, cant, shown_in),
        "around": moving.around(computed, index, cant, shown_in),
    }


def page_of_curve(
    plan: StoredPlan,
    index: int,
    problems: Mapping[str, str] | None = None,
    sent: Mapping[str, str] | None = None,
    problem: str = "",
) -> str:
    """Give the page of a curve, with what was sent and what of it cannot be used."""
    computed = computed_of(plan)
    number = index + 1
    record = computed.record(index, current_measures().system)
    key = CurveKey.of(computed.planned.plan.curves, index)
    before, after = computed.listing.neighbours(index)
    return render_template(
        "curve.html",
        record=record,
        number=number,
        before=before,
        after=after,
        names=computed.planned.plan.curves.curve,
        section=curve_view.section(computed, record, current_measures()),
        today_section=curve_view.section(computed, record, current_measures(), today=True),
        heights_assumed=curve_view.heights_assumed(computed, record),
        nearby=line_view.around(computed, plan.address, index, current_measures()),
        classes=curve_view.class_rows(record),
        bounds=curve_view.bound_rows(record, current_measures()),
        mix=curve_view.mix_facts(record, current_measures()),
        further=curve_view.further(record),
        further_classes=curve_view.further_classes(record),
        passed=curve_view.limit_rows(record.get("limits_passed") or [], current_measures()),
        breaks=curve_view.limit_rows(record["today"]["breaks"], current_measures()),
        transitions=curve_view.transition_rows(record),
        track=computed.listing.track_of(index),
        limits=computed.planned.plan.limits,
        settings=computed.planned.plan.settings,
        taken=[one for one in plan.decided.changes if one.on == key],
        problems=problems or {},
        problem=problem,
        sent=sent or {},
        **_moved(computed, index, record, sent or {}),
    )
