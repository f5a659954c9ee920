"""The list of a plan's curves, as arrays: to filter, sort, search and page without making records.

Records, with their words, are made for the rows of the page that is shown.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from urllib.parse import urlencode

import numpy as np
import numpy.typing as npt

from cant.model.curves import situation_text
from cant.model.plan import STATUSES
from cant.planning import what_governs
from cant.service import PlannedLine

PAGE = 50
PAGE_SIZES = (25, 50, 100, 250)
SORTS: dict[str, str] = {
    "list": "Row of the list",
    "name": "Curve",
    "chainage": "Chainage",
    "radius": "Radius",
    "today": "Cant today",
    "proposed": "Cant proposed",
    "change": "Change",
    "status": "Status",
}


@dataclass(frozen=True)
class Wanted:
    """What of a list is asked for.

    Attributes
    ----------
    statuses : frozenset of str
        Statuses shown; empty shows all.
    search : str
        Words that must all stand in a curve's names, sheet or situation.
    track : str
        ``line / track`` shown; "" shows all.
    sort : str
        Key of :data:`SORTS`.
    falling : bool
    page, size : int
        Page from 1; rows of a page.
    """

    statuses: frozenset[str] = frozenset()
    search: str = ""
    track: str = ""
    sort: str = "list"
    falling: bool = False
    page: int = 1
    size: int = PAGE

    @classmethod
    def of(cls, given: Mapping[str, str], statuses: list[str]) -> Wanted:
        """Make it from the parameters of an address; what is not understood is left out."""
        size = _whole(given.get("size", ""))
        return cls(
            statuses=frozenset(statuses) & set(STATUSES),
            search=given.get("search", "").strip()[:100],
            track=given.get("track", "")[:400],
            sort=given.get("sort", "") if given.get("sort") in SORTS else "list",
            falling=given.get("order") == "falling",
            page=max(_whole(given.get("page", "")), 1),
            size=size if size in PAGE_SIZES else PAGE,
        )

    def query(self, **changes: object) -> str:
        """Give the parameters of an address that asks for the same, with changes; back to the first page."""
        wanted = replace(self, **{"page": 1, **changes})  # type: ignore[arg-type]
        pairs: list[tuple[str, str]] = [("status", s) for s in STATUSES if s in wanted.statuses]
        pairs += [("search", wanted.search)] if wanted.search else []
        pairs += [("track", wanted.track)] if wanted.track else []
        pairs += [("sort", wanted.sort)] if wanted.sort != "list" else []
        pairs += [("order", "falling")] if wanted.falling else []
        pairs += [("page", str(wanted.page))] if wanted.page > 1 else []
        pairs += [("size", str(wanted.size))] if wanted.size != PAGE else []
        return "?" + urlencode(pairs)


@dataclass(frozen=True)
class Page:
    """The curves of a page: indices in the list, and how many there are in all."""

    indices: list[int]
    total: int
    number: int
    pages: int


@dataclass
class Listing:
    """The list of one plan.

    Parameters
    ----------
    planned : PlannedLine
    """

    planned: PlannedLine
    tracks: list[str] = field(init=False)
    along: dict[str, npt.NDArray[np.int64]] = field(init=False)

    def __post_init__(self) -> None:
        plan = self.planned.plan
        curves = plan.curves
        self._assessed = np.asarray(plan.assessed, dtype=np.int64)
        self._status = np.array(
            [STATUSES.index(s) if s in STATUSES else -1 for s in plan.status], dtype=np.int64
        )
        self._track = [track_name(a, b) for a, b in zip(curves.line, curves.track, strict=True)]
        self._text: list[str] | None = None
        self._keys: dict[str, npt.NDArray[np.int64]] = {}
        self.along = self._tracks_in_order()
        self.tracks = list(self.along)

    def page(self, wanted: Wanted) -> Page:
        """Give a page of what is asked for; a page beyond the last gives the last."""
        found = self.select(wanted)
        pages = max(math.ceil(len(found) / wanted.size), 1)
        number = min(wanted.page, pages)
        cut = found[(number - 1) * wanted.size : number * wanted.size]
        return Page([int(i) for i in cut], len(found), number, pages)

    def select(self, wanted: Wanted) -> npt.NDArray[np.int64]:
        """Give the indices of all curves asked for, in the order asked for."""
        order = self._sorted(wanted.sort)
        if wanted.falling:
            order = order[::-1]
        keep = np.ones(len(order), dtype=np.bool_)
        if wanted.statuses:
            keep &= np.isin(self._status[order], [STATUSES.index(s) for s in wanted.statuses])
        if wanted.track:
            keep &= np.array([self._track[i] == wanted.track for i in order], dtype=np.bool_)
        if wanted.search:
            terms, text = wanted.search.casefold().split(), self._searched()
            keep &= np.array([all(term in text[i] for term in terms) for i in order], dtype=np.bool_)
        return order[keep]

    def counts(self) -> dict[str, int]:
        """Give the number of curves of each status, the gravest first, those of 0 too."""
        return {s: int(np.count_nonzero(self._status == k)) for k, s in enumerate(STATUSES)}

    @cached_property
    def governing(self) -> dict[str, npt.NDArray[np.bool_]]:
        """Where each quantity bounds the cant, by quantity."""
        return what_governs(self.planned.plan)

    def neighbours(self, index: int) -> tuple[int | None, int | None]:
        """Give the curves before and after one along its track."""
        order = self.along[self._track[index]]
        at = int(np.flatnonzero(order == index)[0])
        before = int(order[at - 1]) if at > 0 else None
        return before, int(order[at + 1]) if at + 1 < len(order) else None

    def has(self, index: int) -> bool:
        """Tell whether an index is that of a curve in the list."""
        return 0 <= index < len(self._track) and self._status[index] >= 0

    def track_of(self, index: int) -> str:
        """Give the line and track of a curve as :attr:`tracks` names it."""
        return self._track[index]

    def _sorted(self, key: str) -> npt.NDArray[np.int64]:
        if key not in self._keys:
            at = self._assessed
            self._keys[key] = at if key == "list" else at[np.argsort(self._values(key)[at], kind="stable")]
        return self._keys[key]

    def _values(self, key: str) -> npt.NDArray[np.generic]:
        plan = self.planned.plan
        curves = plan.curves
        values: dict[str, npt.ArrayLike] = {
            "chainage": curves.start_km,
            "radius": curves.radius_m,
            "today": curves.cant_mm,
            "proposed": plan.proposed_mm,
            "status": self._status,
        }
        if key == "name":
            return np.array([name.casefold() for name in curves.curve])
        if key == "change":
            return np.asarray(plan.proposed_mm - curves.cant_mm)
        return np.asarray(values[key])

    def _searched(self) -> list[str]:
        if self._text is None:
            c = self.planned.plan.curves
            self._text = [
                " ".join((*names, situation_text(words) or "")).casefold()
                for *names, words in zip(c.curve, c.line, c.track, c.sheet, c.situations, strict=True)
            ]
        return self._text

    def _tracks_in_order(self) -> dict[str, npt.NDArray[np.int64]]:
        start = self.planned.plan.curves.start_km
        members: dict[str, list[int]] = {}
        for i in self._assessed:
            members.setdefault(self._track[i], []).append(int(i))
        ordered = {}
        for name, indices in members.items():
            at = np.array(indices, dtype=np.int64)
            ordered[name] = at[np.argsort(start[at], kind="stable")]
        return ordered


def track_name(line: str, track: str) -> str:
    """Give the words for a line and track."""
    return " / ".join(word for word in (line, track) if word) or "the line"


def _whole(text: str) -> int:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 10 else 0
