"""The line along its chainage: cant today and proposed, permitted range, curvature, deficiency of each class.

The picture is cut into strips that flow like text: side by side on a wide screen, one below the other on a
phone, and on paper. Lengths are squeezed (long straights and long arcs are shortened, short ones stretched)
so that every curve can be read; the chainages below say where it lies. Left-hand curves stand above the
zero line, right-hand ones below.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from markupsafe import Markup

from webapp.drawings import svg
from webapp.drawings.scale import Panel, panel_for
from webapp.measures import Measures

STRIP_WIDTH = 340.0
PIXELS_PER_METRE = 0.12
ARC_PIXELS = (46.0, 120.0)
TRANSITION_PIXELS = (10.0, 34.0)
STRAIGHT_PIXELS = (14.0, 44.0)
TOP, CANT_HEIGHT, CURVATURE_HEIGHT, DEFICIENCY_HEIGHT, GAP, FOOT = 34.0, 150.0, 64.0, 110.0, 14.0, 34.0
LETTER = 6.2
"""Width of a letter of the drawing [px]."""


@dataclass(frozen=True)
class DrawnCurve:
    """What the drawing needs of one curve; lengths in m, cants in mm, signed by nothing.

    ``deficiency_mm`` holds for each class the deficiency, or less the excess; None where it does not run.
    """

    name: str
    address: str
    words: str
    hand: int
    start_m: float | None
    end_m: float | None
    length_m: float | None
    transition_in_m: float | None
    transition_out_m: float | None
    radius_m: float | None
    today_mm: float | None
    proposed_mm: float | None
    lower_mm: float | None
    upper_mm: float | None
    status: str
    shares_with_next: bool
    deficiency_mm: Sequence[float | None] = ()


@dataclass
class _Placed:
    """A curve with its places across the strip [px]."""

    curve: DrawnCurve
    begin: float
    arc_begin: float
    arc_end: float
    end: float
    joined_before: bool
    shortened_before: bool = False


@dataclass
class _Strip:
    """A strip; ``before`` and ``after`` are curves of other strips with which it shares a transition."""

    placed: list[_Placed] = field(default_factory=list)
    width: float = 0.0
    before: DrawnCurve | None = None
    after: DrawnCurve | None = None


@dataclass(frozen=True)
class LineDrawing:
    """The strips of a drawing, each an SVG element, and what a person must know to read them."""

    strips: list[Markup]
    shortened: bool


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
    strips = _lay_out(curves)
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
    drawn = [_draw_strip(s, (cant, bend, deficiency), measures, i) for i, s in enumerate(strips)]
    return LineDrawing(drawn, any(p.shortened_before for s in strips for p in s.placed))


def _clamp(metres: float | None, bounds: tuple[float, float]) -> float:
    low, high = bounds
    return low if metres is None else min(max(metres * PIXELS_PER_METRE, low), high)


def _lay_out(curves: Sequence[DrawnCurve]) -> list[_Strip]:
    strips = [_Strip()]
    for at, curve in enumerate(curves):
        before = curves[at - 1] if at else None
        joined = before is not None and before.shares_with_next
        straight = None if before is None else _straight_between(before, curve)
        gap = 0.0 if joined else _clamp(straight, STRAIGHT_PIXELS)
        lead = _transition_pixels(before.transition_out_m if joined and before else curve.transition_in_m)
        strip = strips[-1]
        if strip.placed and strip.width + gap + lead + _room(curves, at) > STRIP_WIDTH:
            strip = _next_strip(strips, before if joined else None, curve, lead)
        if not strip.placed:
            gap = 0.0 if joined else max(gap / 2, STRAIGHT_PIXELS[0])
            lead = lead / 2 if joined else lead
        begin = strip.width + gap
        arc_end = begin + lead + _arc_pixels(curve)
        tail = 0.0 if curve.shares_with_next else _transition_pixels(curve.transition_out_m)
        placed = _Placed(curve, begin, begin + lead, arc_end, arc_end + tail, joined)
        placed.shortened_before = straight is not None and straight * PIXELS_PER_METRE > STRAIGHT_PIXELS[1]
        strip.placed.append(placed)
        strip.width = placed.end
    strips[-1].width += STRAIGHT_PIXELS[0]
    return strips


def _next_strip(strips: list[_Strip], before: DrawnCurve | None, curve: DrawnCurve, lead: float) -> _Strip:
    """Begin a strip; where a shared transition is cut, each strip shows half of it."""
    strips[-1].width += STRAIGHT_PIXELS[0] / 2 if before is None else lead / 2
    if before is not None:
        strips[-1].after = curve
    strips.append(_Strip(before=before))
    return strips[-1]


def _room(curves: Sequence[DrawnCurve], at: int) -> float:
    """Give the width that must still fit: of a whole chain at its first curve where a strip can hold it."""
    width, here = 0.0, at
    while True:
        width += _arc_pixels(curves[here])
        width += _transition_pixels(curves[here].transition_out_m)
        if here + 1 == len(curves) or not curves[here].shares_with_next:
            break
        here += 1
    alone = _arc_pixels(curves[at]) + _transition_pixels(curves[at].transition_out_m)
    first = at == 0 or not curves[at - 1].shares_with_next
    return (width if first and width < STRIP_WIDTH - STRAIGHT_PIXELS[1] else alone) + STRAIGHT_PIXELS[0]


def _arc_pixels(curve: DrawnCurve) -> float:
    return max(_clamp(_arc_length(curve), ARC_PIXELS), LETTER * min(len(curve.name), 12))


def _transition_pixels(metres: float | None) -> float:
    return 0.0 if not metres else _clamp(metres, TRANSITION_PIXELS)


def _arc_length(curve: DrawnCurve) -> float | None:
    if curve.start_m is not None and curve.end_m is not None:
        return abs(curve.end_m - curve.start_m)
    return curve.length_m


def _straight_between(before: DrawnCurve, curve: DrawnCurve) -> float | None:
    if before.end_m is None or curve.start_m is None:
        return None
    between = curve.start_m - before.end_m
    return max(between - (before.transition_out_m or 0.0) - (curve.transition_in_m or 0.0), 0.0)


def _side(curve: DrawnCurve) -> int:
    return -1 if curve.hand < 0 else 1


def _signed_cants(curve: DrawnCurve) -> list[float]:
    values = (curve.today_mm, curve.proposed_mm, curve.lower_mm, curve.upper_mm)
    return [0.0] + [_side(curve) * v for v in values if v is not None]


def _draw_strip(strip: _Strip, panels: tuple[Panel, Panel, Panel], measures: Measures, order: int) -> Markup:
    cant, bend, deficiency = panels
    width = max(strip.width, 120.0)
    height = deficiency.bottom + FOOT
    parts = [p.draw_grid(width) for p in panels]
    parts += [_headings(panels, measures)]
    parts += [_permitted(placed, cant) for placed in strip.placed]
    for panel, class_, of in (
        (bend, "curvature", _bends),
        (cant, "today", lambda curve: _signed(curve, curve.today_mm)),
        (cant, "proposed", lambda curve: _signed(curve, curve.proposed_mm)),
    ):
        parts += _profiles(strip, width, panel, of, class_)
    for placed in strip.placed:
        parts += _markers(placed, deficiency)
        parts += _labels(placed, panels, measures)
        parts.append(_link(placed, height))
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


def _headings(panels: tuple[Panel, Panel, Panel], measures: Measures) -> Markup:
    cant, bend, deficiency = panels
    unit = measures.unit("cant")
    texts = (
        (cant, f"cant, {unit}"),
        (bend, "curvature"),
        (deficiency, f"deficiency (up), excess (down), {unit}"),
    )
    return svg.group(
        *(svg.words(3, panel.top - 3, text, "panel-name") for panel, text in texts), aria_hidden="true"
    )


def _signed(curve: DrawnCurve, value: float | None) -> float | None:
    return None if value is None else _side(curve) * value


def _bends(curve: DrawnCurve) -> float | None:
    return _side(curve) / curve.radius_m if curve.radius_m else None


def _permitted(placed: _Placed, panel: Panel) -> Markup:
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
    strip: _Strip, width: float, panel: Panel, of: Callable[[DrawnCurve], float | None], class_: str
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


def _markers(placed: _Placed, panel: Panel) -> list[Markup]:
    runs = [(i, v) for i, v in enumerate(placed.curve.deficiency_mm) if v is not None]
    width = placed.arc_end - placed.arc_begin
    step = width / (len(runs) + 1)
    return [
        svg.marker(i, (placed.arc_begin + step * (k + 1), panel.y(v)), 3.6, f"class-{i % 6}")
        for k, (i, v) in enumerate(runs)
    ]


def _labels(placed: _Placed, panels: tuple[Panel, Panel, Panel], measures: Measures) -> list[Markup]:
    curve = placed.curve
    _, bend, deficiency = panels
    middle = (placed.arc_begin + placed.arc_end) / 2
    room = max(int((placed.arc_end - placed.arc_begin) / LETTER), 4)
    name = curve.name if len(curve.name) <= room else f"{curve.name[: room - 1]}…"
    start = measures.show("chainage", None if curve.start_m is None else curve.start_m / 1000)
    radius = measures.show("radius", curve.radius_m)
    above = _side(curve) > 0
    drawn = [
        svg.words(middle, 12, name, "curve-name", "middle"),
        svg.words(middle, bend.y(0.0) + (13 if above else -5), radius, "value", "middle"),
        svg.line((placed.arc_begin, deficiency.bottom), (placed.arc_begin, deficiency.bottom + 5), "tick"),
        svg.words(placed.arc_begin - 2, deficiency.bottom + 17, start, "value"),
    ]
    if placed.shortened_before:
        drawn.append(svg.words(placed.begin - 4, deficiency.bottom + 4, "//", "break", "end"))
    return drawn


def _link(placed: _Placed, height: float) -> Markup:
    """Cover the curve with a link to its page, wide enough for a finger."""
    area = svg.rectangle(
        placed.arc_begin,
        0,
        placed.arc_end - placed.arc_begin,
        height,
        "target",
        svg.element("title", placed.curve.words),
    )
    return svg.element("a", area, href=placed.curve.address, aria_label=placed.curve.words)
