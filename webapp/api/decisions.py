"""Operations on what the engineer decides: a cant held, an option taken, a change taken back, the history."""

from __future__ import annotations

from typing import Any

from cant.errors import InputError
from cant.explaining import CantHeld, CurveKey, Decision, read_decision
from webapp.access import to_change
from webapp.api.models import HeldBody, HistoryAnswer, HistoryStep, KnownQuery, PlanSummary, ReasonBody
from webapp.api.operations import operation
from webapp.changes import take, take_back, with_reason
from webapp.computing import Computed
from webapp.context import computed_of, running, stored
from webapp.decisions import CHANGE, as_text
from webapp.history_view import decider, moments
from webapp.keeping.access import NotThereError
from webapp.keeping.store import StoredPlan
from webapp.measures import measures
from webapp.security import owner


@operation(
    "PUT",
    "/plans/{address}/curves/{number}/cant",
    answer=PlanSummary,
    body=HeldBody,
    query=KnownQuery,
    later=True,
)
def hold_cant(address: str, number: int, body: HeldBody, query: KnownQuery) -> PlanSummary:
    """Hold a curve's cant by hand; the plan around it is made anew."""
    plan = to_change(address)
    computed = _with_curve(plan, number)
    listed = computed.planned.plan.curves
    index = number - 1
    change = CantHeld(on=CurveKey.of(listed, index), cant_mm=round(body.cant_mm, 6), because=body.because)
    shown = measures("metric").with_unit("cant", body.cant_mm)
    words = f"Curve {listed.curve[index] or number}: cant held at {shown}"
    return _decide(plan, take(words, Decision(changes=(change,))), body.because, body.who, query.known)


@operation(
    "POST",
    "/plans/{address}/curves/{number}/options/{option}",
    answer=PlanSummary,
    body=ReasonBody,
    query=KnownQuery,
    later=True,
)
def take_option(address: str, number: int, option: int, body: ReasonBody, query: KnownQuery) -> PlanSummary:
    """Take an option of a curve, as its record offers them, counted from 1."""
    plan = to_change(address)
    computed = _with_curve(plan, number)
    record = computed.record(number - 1, computed.planned.plan.settings.units)
    if not 0 < option <= len(record["options"]):
        message = f"curve {record['curve'] or number} has {len(record['options'])} options, not {option}"
        raise InputError(message)
    chosen = record["options"][option - 1]
    event = take(f"Curve {record['curve']}: {chosen['text']}", read_decision(chosen["decision"]))
    return _decide(plan, with_reason(event, body.because), body.because, body.who, query.known)


@operation("DELETE", "/plans/{address}/changes/{change}", answer=PlanSummary)
def take_change_back(address: str, change: str) -> PlanSummary:
    """Take a change back, by the key that the history gives."""
    plan = to_change(address)
    found = next((one for one in plan.decided.changes if one.key == change), None)
    if found is None:
        message = "no such change holds: it has been taken back, or was never taken"
        raise NotThereError(message)
    return _decide(plan, take_back(change, found.words), "", "")


@operation("GET", "/plans/{address}/history", answer=HistoryAnswer)
def get_history(address: str) -> HistoryAnswer:
    """Tell every decision with who, when and why, and which changes hold."""
    plan = stored(address)
    steps = [
        HistoryStep(
            step=one.number,
            kind=one.decision.kind,
            words=one.words,
            reason=one.decision.reason,
            who=one.decision.who,
            made=one.decision.made,
        )
        for one in moments(plan)
    ]
    return HistoryAnswer(steps=steps, changes=[_plain(one) for one in plan.decided.changes])


def _plain(change: Any) -> dict[str, Any]:
    return {"key": change.key, "words": change.words, "decision": change.decision.as_json()}


def _with_curve(plan: StoredPlan, number: int) -> Computed:
    """Give the result of a plan that has a curve of that number which could be assessed; NotThereError."""
    computed = computed_of(plan)
    if not computed.listing.has(number - 1):
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    return computed


def _decide(
    plan: StoredPlan, event: dict[str, Any], reason: str, who: str, known: int | None = None
) -> PlanSummary:
    decisions = {CHANGE: as_text(event)}
    decided = running().store.decide(owner(), plan.address, decisions, reason, decider(who), known)
    return PlanSummary.of(decided)
