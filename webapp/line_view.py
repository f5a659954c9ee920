"""From a plan to the line drawing: which curves a page of it shows, and what the drawing needs of each."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from flask import url_for

from webapp.computing import Computed
from webapp.drawings.layout import ClassSpeeds, DrawnCurve
from webapp.drawings.line import LineDrawing, draw_line
from webapp.measures import Measures

CURVES_A_PAGE = 24
ZOOMS = (6, 12, CURVES_A_PAGE, 48, 96)
"""Curves a page shows, from close to far."""
NEIGHBOURS = 2


@dataclass(frozen=True)
class LinePage:
    """A page of the line drawing.

    Attributes
    ----------
    drawing : LineDrawing
    classes : list of str
        In the order of the markers.
    tracks : list of str
    track : str
        The track shown.
    number, pages : int
    each : int
        Curves a page shows, one of :data:`ZOOMS`.
    governed : str
        Quantity that bounds the cant of the curves shown; "" shows all.
    records : list of (int, dict)
        The curves drawn, for the table beside the drawing.
    """

    drawing: LineDrawing
    classes: list[str]
    tracks: list[str]
    track: str
    number: int
    pages: int
    each: int
    governed: str
    records: list[tuple[int, dict[str, Any]]]

    def falls_short(self, figures: Mapping[str, Any]) -> bool:
        """Tell for the table what the picture frames: permissible speed below the planned one."""
        return speeds_of(figures).falls_short


def page_of_line(
    computed: Computed, address: str, given: Mapping[str, str], measures: Measures
) -> LinePage | None:
    """Give a page of the drawing, None where no curve was assessed.

    Parameters
    ----------
    computed : Computed
    address : str
        Address of the plan, for links.
    given : mapping of str to str
        Parameters ``track``, ``page``, ``each`` (curves a page) and ``governed`` of the request.
    measures : Measures
    """
    listing = computed.listing
    if not listing.tracks:
        return None
    track = given.get("track", "")
    track = track if track in listing.along else listing.tracks[0]
    order = listing.along[track]
    governed = given.get("governed", "")
    if governed in listing.governing:
        order = order[listing.governing[governed][order]]
    else:
        governed = ""
    each = _whole(given.get("each", ""))
    each = each if each in ZOOMS else CURVES_A_PAGE
    pages = max(-(-len(order) // each), 1)
    number = min(max(_whole(given.get("page", "")), 1), pages)
    shown = [int(i) for i in order[(number - 1) * each : number * each]]
    drawing, records = _draw(computed, address, shown, measures)
    classes = computed.planned.plan.traffic.class_names
    return LinePage(drawing, classes, listing.tracks, track, number, pages, each, governed, records)


def around(computed: Computed, address: str, index: int, measures: Measures) -> LineDrawing:
    """Draw a curve with its neighbours along the track."""
    order = list(computed.listing.along[computed.listing.track_of(index)])
    at = order.index(index)
    shown = [int(i) for i in order[max(at - NEIGHBOURS, 0) : at + NEIGHBOURS + 1]]
    return _draw(computed, address, shown, measures)[0]


def _draw(
    computed: Computed, address: str, indices: Sequence[int], measures: Measures
) -> tuple[LineDrawing, list[tuple[int, dict[str, Any]]]]:
    names = computed.planned.plan.traffic.class_names
    records = computed.rows(indices, measures.system)
    curves = [drawn_curve(i, record, names, address, measures) for i, record in records]
    # A curve whose next one is not drawn shares no transition with what is drawn after it.
    follows = [computed.listing.neighbours(i)[1] for i in indices]
    curves = [
        curve if next_drawn in (after, None) else replace(curve, shares_with_next=False)
        for curve, after, next_drawn in zip(curves, follows, [*indices[1:], None], strict=True)
    ]
    return draw_line(curves, measures), records


def drawn_curve(
    index: int, record: Mapping[str, Any], names: Sequence[str], address: str, measures: Measures
) -> DrawnCurve:
    """Give what the drawing needs of one record."""
    read = record["as_read"]
    runs = {
        figures["class"]: figures["deficiency_mm"] - figures["excess_mm"] for figures in record["classes"]
    }
    speeds = {figures["class"]: speeds_of(figures) for figures in record["classes"]}
    return DrawnCurve(
        name=record["curve"] or f"row {record['row']}",
        address=url_for("curves.show", address=address, number=index + 1),
        words=curve_words(record, measures),
        hand=-1 if record["hand"] == "R" else 1,
        start_m=_metres(read["start_km"]),
        end_m=_metres(read["end_km"]),
        length_m=read["length_m"],
        transition_in_m=read["transition_in_m"],
        transition_out_m=read["transition_out_m"],
        radius_m=record["radius_m"],
        today_mm=record["existing_cant_mm"],
        proposed_mm=record["recommended_cant_mm"],
        lower_mm=record["lower_mm"],
        upper_mm=record["upper_mm"],
        status=record["status"],
        shares_with_next=bool(record["shares_transition_with_next"]),
        deficiency_mm=[runs.get(name) for name in names],
        speeds=[speeds.get(name) for name in names],
    )


def speeds_of(figures: Mapping[str, Any]) -> ClassSpeeds:
    """Give the speeds of a class on a curve, of its figures in the record."""
    return ClassSpeeds(figures["class"], figures["speed_kmh"], figures["permissible_speed_kmh"])


def curve_words(record: Mapping[str, Any], measures: Measures) -> str:
    """Give a curve in one line, for the drawing's labels."""
    today = measures.with_unit("cant", record["existing_cant_mm"])
    proposed = measures.with_unit("cant", record["recommended_cant_mm"])
    return f"Curve {record['curve']}: cant today {today}, proposed {proposed}, {record['status']}"


def _whole(text: str) -> int:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 9 else 0


def _metres(km: float | None) -> float | None:
    return None if km is None else 1000 * km
