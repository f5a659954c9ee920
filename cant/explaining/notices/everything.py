"""All notices of a plan, and the summaries of findings that the planner made curve by curve."""

from __future__ import annotations

from collections import Counter

from cant.explaining.notices.ends import ends
from cant.explaining.notices.notice import Notice, Scene
from cant.explaining.notices.track import track
from cant.explaining.notices.trains import trains
from cant.explaining.wording import Words
from cant.model.plan import Finding
from cant.planning import Plan

_REPEATED = {
    "gap-in-limits": "{count} curves are not assessed because the limits have a gap there.",
    "arcs-overlap": "The arcs of {count} curves overlap: their chainages contradict each other.",
    "chainage-against-list": "{count} curves run against the rest of their list.",
    "hand-unknown": "{count} curves that share a transition have no hand.",
    "length-disagrees": "{count} curves have another length than their chainages give.",
    "shared-length-disagrees": "The shared transitions of {count} curves have another length than is left "
    "for them.",
    "transitions-overlap": "The transitions of {count} curves overlap; each has half the distance.",
}


def notices_of(plan: Plan, words: Words) -> list[Notice]:
    """Give all notices of a plan, in the order in which they are told.

    Parameters
    ----------
    plan : Plan
    words : Words
    """
    scene = Scene(plan.outcome, words)
    return [*trains(scene), *track(scene), *ends(scene)]


def repeated(findings: list[Finding]) -> list[Finding]:
    """Give one finding for each kind that the planner found on more than one curve."""
    count = Counter((f.code, f.severity) for f in findings if f.curve is not None)
    return [
        Finding(code, severity, _REPEATED[code].format(count=number))
        for (code, severity), number in count.items()
        if number > 1 and code in _REPEATED
    ]
