"""The line along its chainage: cants, permitted range, curvature, deficiency and speeds of each class.

The picture is cut into strips that flow like text: side by side on a wide screen, one below the other on a
phone, and on paper. Lengths are squeezed (long straights and long arcs are shortened, short ones stretched)
so that every curve can be read; the chainages below say where it lies. Left-hand curves stand above the
zero line, right-hand ones below.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from markupsafe import Markup

from webapp.drawings import svg
from webapp.drawings.layout import LETTER, DrawnCurve, Placed, Strip, lay_out
from webapp.drawings.scale import Panel, panel_for
from webapp.drawings.speeds import speed_marks, speed_panel
from webapp.measures import Measures

TOP, CANT_HEIGHT, CURVATURE_HEIGHT, DEFICIENCY_HEIGHT, SPEED_HEIGHT = 34.0, 150.0, 64.0, 110.0, 110.0
GAP, FOOT = 14.0, 34.0


@dataclass(frozen=True)
class LineDrawing:
    """The strips of a drawing, each an SVG element, and what a person must know to read them."""

    strips: list[Markup]
    shortened: bool


@dataclass(frozen=True)
class _Panels:
    """From top to bottom."""

    cant: Panel
    bend: Panel
    deficiency: Panel
    speed: Panel


def draw_line(curves: Sequence[DrawnCurve], measures: Measures) -> LineDrawing:
    """Draw curves that follow each other along one track.

    Parameters
    ----------
    curves : sequence of DrawnCurve
        In the order of their chainage.
    measures : Measures
        Units of the labels.
    """
    if not curves:
        return LineDrawing([], False)
    strips = lay_out(curves)
    panels = _panels(curves, measures)
    drawn = [_draw_strip(s, panels, measures, i) for i, s in enumerate(strips)]
    return LineDrawing(drawn, any(p.shortened_before for s in strips for p in s.placed))


def _panels(curves: Sequence[DrawnCurve], measures: Measures) -> _Panels:
    cants = [v for c in curves for v in _signed_cants(c)]
    cant = panel_for(TOP, CANT_HEIGHT, cants, measures, "cant")
    bend = Panel(
        TOP + CANT_HEIGHT + GAP,
        CURVATURE_HEIGHT,
        -max((1 / c.radius_m for c in curves if c.radius_m), default=1.0),
        max((1 / c.radius_m for c in curves if c.radius_m), default=1.0),
        (),
    )
    deficiencies = [v for c in curves for v in c.deficiency_mm if v is not None]
    deficiency = panel_for(bend.bottom + GAP, DEFICIENCY_HEIGHT, deficiencies, measures, "cant")
    return _Panels(
        cant, bend, deficiency, speed_panel(deficiency.bottom + GAP, SPEED_HEIGHT, curves, measures)
    )


def _side(curve: DrawnCurve) -> int:
    return -1 if curve.hand < 0 else 1


def _signed_cants(curve: DrawnCurve) -> list[float]:
    values = (curve.today_mm, curve.proposed_mm, curve.lower_mm, curve.upper_mm)
    return [0.0] + [_side(curve) * v for v in values if v is not None]


def _draw_strip(strip: Strip, panels: _Panels, measures: Measures, order: int) -> Markup:
    cant, bend = panels.cant, panels.bend
    width = max(strip.width, 120.0)
    height = panels.speed.bottom + FOOT
    parts = [p.draw_grid(width) for p in (cant, bend, panels.deficiency, panels.speed)]
    parts += [_headings(panels, measures)]
    parts += [_permitted(placed, cant) for placed in strip.placed]
    for panel, class_, of in (
        (bend, "curvature", _bends),
        (cant, "today", lambda curve: _signed(curve, curve.today_mm)),
        (cant, "proposed", lambda curve: _signed(curve, curve.proposed_mm)),
    ):
        parts += _profiles(strip, width, panel, of, class_)
    for placed in strip.placed:
        parts += _markers(placed, panels.deficiency)
        parts += _labels(placed, panels, measures)
        parts.append(_link(placed, height, speed_marks(placed, panels.speed, measures)))
    names = f"{strip.placed[0].curve.name} to {strip.placed[-1].curve.name}"
    return svg.element(
        "svg",
        *parts,
        xmlns="http://www.w3.org/2000/svg",
        class_="strip",
        viewBox=f"0 0 {svg.number(width)} {svg.number(height)}",
        width=float(width),
        height=float(height),
        role="group",
        aria_label=f"Strip {order + 1}: {names}",
    )


def _headings(panels: _Panels, measures: Measures) -> Markup:
    unit = measures.unit("cant")
    texts = (
        (panels.cant, f"cant, {unit}"),
        (panels.bend, "curvature"),
        (panels.deficiency, f"deficiency (up), excess (down), {unit}"),
        (panels.speed, f"speed, {measures.unit('speed')}"),
    )
    return svg.group(
        *(svg.words(3, panel.top - 3, text, "panel-name") for panel, text in texts), aria_hidden="true"
    )


def _signed(curve: DrawnCurve, value: float | None) -> float | None:
    return None if value is None else _side(curve) * value


def _bends(curve: DrawnCurve) -> float | None:
    return _side(curve) / curve.radius_m if curve.radius_m else None


def _permitted(placed: Placed, panel: Panel) -> Markup:
    curve, side = placed.curve, _side(placed.curve)
    width = placed.arc_end - placed.arc_begin
    if curve.status == "not assessed":
        return svg.rectangle(placed.arc_begin, panel.top, width, panel.height, "unknown")
    if curve.lower_mm is None and curve.upper_mm is None:
        return Markup("")
    low = side * (curve.lower_mm if curve.lower_mm is not None else 0.0)
    high = side * curve.upper_mm if curve.upper_mm is not None else (panel.high if side > 0 else panel.low)
    crossed = curve.lower_mm is not None and curve.upper_mm is not None and curve.lower_mm > curve.upper_mm
    a, b = panel.y(low), panel.y(high)
    class_ = "range crossed" if crossed else "range"
    return svg.rectangle(placed.arc_begin, min(a, b), width, max(abs(a - b), 1.0), class_)


def _profiles(
    strip: Strip, width: float, panel: Panel, of: Callable[[DrawnCurve], float | None], class_: str
) -> list[Markup]:
    """Draw a quantity along the strip: level over arcs, ramps over transitions, broken where not known."""
    path: list[svg.Point] = []
    paths = [path]
    if strip.before is None:
        path.append((0.0, panel.y(0.0)))
    else:
        _add_middle(path, 0.0, of(strip.before), of(strip.placed[0].curve), panel)
    for placed in strip.placed:
        value = of(placed.curve)
        if value is None:
            path = []
            paths.append(path)
            continue
        if not placed.joined_before:
            path.append((placed.begin, panel.y(0.0)))
        path += [(placed.arc_begin, panel.y(value)), (placed.arc_end, panel.y(value))]
        if not placed.curve.shares_with_next:
            path.append((placed.end, panel.y(0.0)))
    last = strip.placed[-1].curve
    if strip.after is not None:
        _add_middle(path, width, of(last), of(strip.after), panel)
    elif of(last) is not None and not last.shares_with_next:
        path.append((width, panel.y(0.0)))
    return [svg.polyline(drawn, class_) for drawn in paths if len(drawn) > 1]


def _add_middle(
    path: list[svg.Point], x: float, before: float | None, after: float | None, panel: Panel
) -> None:
    """Add the middle of a shared transition where the values on both sides are known."""
    if before is not None and after is not None:
        path.append((x, panel.y((before + after) / 2)))


def _markers(placed: Placed, panel: Panel) -> list[Markup]:
    runs = [(i, v) for i, v in enumerate(placed.curve.deficiency_mm) if v is not None]
    width = placed.arc_end - placed.arc_begin
    step = width / (len(runs) + 1)
    return [
        svg.marker(i, (placed.arc_begin + step * (k + 1), panel.y(v)), 3.6, f"class-{i % 6}")
        for k, (i, v) in enumerate(runs)
    ]


def _labels(placed: Placed, panels: _Panels, measures: Measures) -> list[Markup]:
    curve, bend, bottom = placed.curve, panels.bend, panels.speed.bottom
    middle = (placed.arc_begin + placed.arc_end) / 2
    room = max(int((placed.arc_end - placed.arc_begin) / LETTER), 4)
    name = curve.name if len(curve.name) <= room else f"{curve.name[: room - 1]}…"
    start = measures.show("chainage", None if curve.start_m is None else curve.start_m / 1000)
    radius = measures.show("radius", curve.radius_m)
    above = _side(curve) > 0
    drawn = [
        svg.words(middle, 12, name, "curve-name", "middle"),
        svg.words(middle, bend.y(0.0) + (13 if above else -5), radius, "value", "middle"),
        svg.line((placed.arc_begin, bottom), (placed.arc_begin, bottom + 5), "tick"),
        svg.words(placed.arc_begin - 2, bottom + 17, start, "value"),
    ]
    if placed.shortened_before:
        drawn.append(svg.words(placed.begin - 4, bottom + 4, "//", "break", "end"))
    return drawn


def _link(placed: Placed, height: float, marks: Sequence[Markup]) -> Markup:
    """Cover the curve with a link to its page, wide enough for a finger; marks with titles lie on it."""
    area = svg.rectangle(
        placed.arc_begin,
        0,
        placed.arc_end - placed.arc_begin,
        height,
        "target",
        svg.element("title", placed.curve.words),
    )
    return svg.element("a", area, *marks, href=placed.curve.address, aria_label=placed.curve.words)
