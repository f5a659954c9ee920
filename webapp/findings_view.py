"""The findings of a plan, a page at a time: listed and counted without words, put into words when shown."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from cant.model.plan import Finding
from webapp.computing import Computed

PAGE = 100
SEVERITIES = ("stop", "warning", "advice")


@dataclass(frozen=True)
class FindingsPage:
    """A page of findings.

    Attributes
    ----------
    found : list of Finding
        Those of the whole plan first, then by curve in input order.
    total, number, pages : int
    kinds, severities : dict of str to int
        Number of findings of each code and severity, whatever is filtered.
    """

    found: list[Finding]
    total: int
    number: int
    pages: int
    kinds: dict[str, int]
    severities: dict[str, int]


def page_of_findings(computed: Computed, system: str, severity: str, kind: str, number: int) -> FindingsPage:
    """Give a page of the findings of a plan.

    Parameters
    ----------
    computed : Computed
    system : str
        System of units of the words.
    severity, kind : str
        Severity and code shown; "" shows all.
    number : int
        Page from 1; one beyond the last gives the last.
    """
    explanation = computed.shown_in(system).explanation
    with computed.speaking:
        whole = explanation.plan_findings
        listed = explanation.listed()
    keys = [(f.code, f.severity) for f in whole] + [(code, grave) for _, _, code, grave in listed]
    chosen = [
        at
        for at, (code, grave) in enumerate(keys)
        if (not severity or grave == severity) and (not kind or code == kind)
    ]
    pages = max(-(-len(chosen) // PAGE), 1)
    number = min(max(number, 1), pages)
    cut = chosen[(number - 1) * PAGE : number * PAGE]
    wanted = [listed[at - len(whole)][:2] for at in cut if at >= len(whole)]
    found = [whole[at] for at in cut if at < len(whole)] + _in_words(computed, system, wanted)
    counted = Counter(grave for _, grave in keys)
    return FindingsPage(
        found,
        len(chosen),
        number,
        pages,
        dict(sorted(Counter(code for code, _ in keys).items())),
        {grave: counted[grave] for grave in SEVERITIES if counted[grave]},
    )


def _in_words(computed: Computed, system: str, wanted: list[tuple[int, int]]) -> list[Finding]:
    """Put findings, each the n-th of a curve, into words; the records behind them are made together."""
    planned = computed.shown_in(system)
    curves = list(dict.fromkeys(curve for curve, _ in wanted))
    with computed.speaking:
        records = planned.plan.records(curves)
        of_curve = {
            curve: planned.explanation.findings(curve, record)
            for curve, record in zip(curves, records, strict=True)
        }
    return [of_curve[curve][place] for curve, place in wanted]
