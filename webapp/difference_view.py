"""From the difference of two plans to its page: the sums as rows, and so many curves a page."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from cant.explaining import CurveDifference, Difference
from cant.model.plan import STATUSES
from webapp.computing import Computed
from webapp.measures import Measures

ROWS = 100


@dataclass(frozen=True)
class DifferencePage:
    """A page of curves that differ, and the sums of both plans.

    Attributes
    ----------
    sums : list of (str, str, str, bool)
        What, before, after, and whether it differs.
    rows : list of CurveDifference
    totals : dict
    number, pages : int
    """

    sums: list[tuple[str, str, str, bool]]
    rows: list[CurveDifference]
    totals: Mapping[str, Any]
    number: int
    pages: int


def page_of_difference(before: Computed, after: Computed, number: int) -> DifferencePage:
    """Compare two plans, and give a page of the curves that differ."""
    found = Difference(before.planned.plan, after.planned.plan)
    totals = found.totals()
    pages = max(-(-len(found.rows) // ROWS), 1)
    number = min(max(number, 1), pages)
    shown = found.rows[(number - 1) * ROWS : number * ROWS]
    return DifferencePage(_sums(totals), [found.row(*pair) for pair in shown], totals, number, pages)


def _sums(totals: Mapping[str, Any]) -> list[tuple[str, str, str, bool]]:
    pairs = [(f"Curves {s}", *map(str, totals["counts"][s])) for s in STATUSES if any(totals["counts"][s])]
    pairs.append(("Limits passed, each an approval", *map(str, totals["approvals"])))
    seconds = totals["seconds_lost_a_day"]
    pairs.append(("Running time lost, s a day", *(f"{value:.1f}" for value in seconds)))
    return [(what, mine, theirs, mine != theirs) for what, mine, theirs in pairs]


def pair_words(pair: tuple[float | None, float | None], kind: str, measures: Measures) -> str:
    """Give two values of a kind as ``95 → 100``, or one where they show alike."""
    mine, theirs = (measures.show(kind, value) for value in pair)
    return mine if mine == theirs else f"{mine} → {theirs}"
