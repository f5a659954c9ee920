"""The speeds of each class along the line: what the curve permits, and what is planned.

Stands apart from the line drawing because it has marks of its own: solid for the permissible speed, hollow
and dashed for the planned one, and a frame with a pointer where the first lies below the second.
"""

from __future__ import annotations

from collections.abc import Sequence

from markupsafe import Markup

from webapp.drawings import svg
from webapp.drawings.layout import ClassSpeeds, DrawnCurve, Placed
from webapp.drawings.scale import Panel, panel_around
from webapp.measures import Measures

PERMISSIBLE_SIZE, PLANNED_SIZE, FRAME = 3.2, 5.0, 6.8
SMALLEST_SPAN = 30.0
"""Speeds that the panel takes in at least [shown unit], so that small differences stay small."""


def speed_panel(top: float, height: float, curves: Sequence[DrawnCurve], measures: Measures) -> Panel:
    """Give the panel that takes in every permissible and planned speed; it need not begin at zero."""
    speeds = [s for c in curves for s in c.speeds if s is not None]
    values = [v for s in speeds for v in (s.planned_kmh, s.permissible_kmh) if v is not None]
    return panel_around(top, height, values, measures, "speed", SMALLEST_SPAN)


def speed_marks(placed: Placed, panel: Panel, measures: Measures) -> list[Markup]:
    """Draw the speeds of one curve, a class beside the other in the order of the deficiency's markers."""
    runs = [(i, s) for i, s in enumerate(placed.curve.speeds) if s is not None]
    step = (placed.arc_end - placed.arc_begin) / (len(runs) + 1)
    return [
        _marks_of_class(i, speeds, placed.arc_begin + step * (k + 1), step, panel, measures)
        for k, (i, speeds) in enumerate(runs)
    ]


def _marks_of_class(
    index: int, speeds: ClassSpeeds, x: float, step: float, panel: Panel, measures: Measures
) -> Markup:
    colour = f"class-{index % 6}"
    # The whole height answers to a pointer: the marks alone are too small to be met.
    parts = [
        svg.element("title", speed_words(speeds, measures)),
        svg.rectangle(x - step / 2, panel.top, step, panel.height, "hit"),
        svg.marker(index, (x, panel.y(speeds.planned_kmh)), PLANNED_SIZE, f"planned {colour}"),
    ]
    if speeds.permissible_kmh is not None:
        y = panel.y(speeds.permissible_kmh)
        parts.append(svg.marker(index, (x, y), PERMISSIBLE_SIZE, f"permissible {colour}"))
    if speeds.falls_short and speeds.permissible_kmh is not None:
        parts += shortfall(x, panel.y(speeds.planned_kmh), panel.y(speeds.permissible_kmh))
    return svg.group(*parts, class_="speeds")


def shortfall(x: float, planned_y: float, permissible_y: float) -> list[Markup]:
    """Frame two marks, with a pointer downwards above them."""
    top, bottom = planned_y - FRAME, permissible_y + FRAME
    return [
        svg.rectangle(x - FRAME, top, 2 * FRAME, bottom - top, "below"),
        svg.polygon([(x - 5, top - 9), (x + 5, top - 9), (x, top - 1)], "below-pointer"),
    ]


def speed_words(speeds: ClassSpeeds, measures: Measures) -> str:
    """Say the speeds of a class, in the words of the drawing's titles."""
    planned = measures.with_unit("speed exact", speeds.planned_kmh)
    if speeds.permissible_kmh is None:
        return f"{speeds.name}: no permissible speed stated, planned {planned}"
    permissible = measures.with_unit("speed exact", speeds.permissible_kmh)
    end = ", permissible below planned" if speeds.falls_short else ""
    return f"{speeds.name}: permissible {permissible}, planned {planned}{end}"
