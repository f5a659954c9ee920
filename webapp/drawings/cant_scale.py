"""The scale of cants beside a slider: permitted range and what bounds it, the methods' choices, today's."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from webapp.drawings import svg
from webapp.measures import Measures

WIDTH, EDGE = 440.0, 16.0
BAR, ROW = 52.0, 15.0


@dataclass(frozen=True)
class Mark:
    """A cant marked on the scale, with its words."""

    cant_mm: float
    words: str


def draw_scale(
    largest_mm: float,
    cant_mm: float,
    bounds_mm: tuple[float | None, float | None],
    marks: Sequence[Mark],
    measures: Measures,
) -> Markup:
    """Draw the scale.

    Parameters
    ----------
    largest_mm : float
        Right end; the left one is 0.
    cant_mm : float
        The cant looked at.
    bounds_mm : pair of (float or None)
        The permitted range of the curve by itself, at planned speeds.
    marks : sequence of Mark
        Marked below the bar, a row each.
    measures : Measures
    """

    def x(mm: float) -> float:
        return EDGE + (WIDTH - 2 * EDGE) * min(max(mm / largest_mm, 0.0), 1.0)

    low = 0.0 if bounds_mm[0] is None else bounds_mm[0]
    high = largest_mm if bounds_mm[1] is None else bounds_mm[1]
    crossed = low > high
    left, right = sorted((x(low), x(high)))
    parts = [
        svg.element("rect", x=EDGE, y=BAR - 12, width=WIDTH - 2 * EDGE, height=12.0, class_="unknown"),
        svg.element(
            "rect",
            x=left,
            y=BAR - 12,
            width=max(right - left, 1.0),
            height=12.0,
            class_="range crossed" if crossed else "range",
        ),
    ]
    for value in _ticks(largest_mm, measures):
        parts.append(svg.line((x(value), BAR), (x(value), BAR + 4), "tick"))
        parts.append(svg.words(x(value), BAR + 15, measures.show("cant", value), "grid-label", "middle"))
    here = x(cant_mm)
    parts.append(svg.line((here, BAR - 20), (here, BAR + 4), "proposed"))
    anchor = "start" if here < WIDTH / 4 else "end" if here > 3 * WIDTH / 4 else "middle"
    parts.append(svg.words(here, BAR - 24, measures.with_unit("cant", cant_mm), "curve-name", anchor))
    for row, mark in enumerate(marks):
        y = BAR + 32 + ROW * row
        at = x(mark.cant_mm)
        parts.append(svg.line((at, BAR), (at, y - 4), "today"))
        left_side = at < WIDTH / 2
        parts.append(
            svg.words(at + (5 if left_side else -5), y, mark.words, "value", "start" if left_side else "end")
        )
    height = BAR + 30 + ROW * len(marks)
    said = "; ".join(mark.words for mark in marks)
    return svg.element(
        "svg",
        *parts,
        xmlns="http://www.w3.org/2000/svg",
        class_="cant-scale",
        viewBox=f"0 0 {svg.number(WIDTH)} {svg.number(height)}",
        width=WIDTH,
        height=height,
        role="img",
        aria_label=f"Scale of cants: at {measures.with_unit('cant', cant_mm)}; {said}",
    )


def _ticks(largest_mm: float, measures: Measures) -> list[float]:
    """Give round cants for the labels, in canonical units."""
    step = 25.0 if measures.system == "metric" else 25.4
    return [step * i for i in range(int(largest_mm / step + 1e-6) + 1)]
