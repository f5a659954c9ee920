"""The canted section of a curve with the forces on each class, all to one scale.

Seen in the direction of the list, outer rail raised. On each class act its weight and, at its run speed, the
centrifugal force, both at the centre of gravity. The foot of their resultant on the track plane shows how the
load is shared: in the middle at equilibrium, towards the outer rail under cant deficiency, towards the inner
under excess. Rigid body, no suspension.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from cant.model.settings import KMH2_G
from cant.units import GRAVITY_MS2
from webapp.drawings import svg
from webapp.measures import Measures

WIDTH, HEIGHT, ROW = 430.0, 396.0, 20.0
PIXELS_PER_MM = 0.135
WEIGHT_PIXELS = 190.0
LONGEST_NAME = 16
USUAL_HEIGHT_M = 1.8
"""Height at which a class is drawn whose centre of gravity is not known; the page says so."""
RAIL_HEIGHT_MM, RAIL_HEAD_MM, SLEEPER_MM = 172.0, 72.0, 2600.0
WHEEL_MM = (135.0, 920.0)
"""Width and diameter of a wheel [mm]."""


@dataclass(frozen=True)
class Acting:
    """What acts on one class.

    Attributes
    ----------
    name : str
    speed_kmh : float
        Run speed.
    height_m : float or None
        Centre of gravity above the rails.
    lateral_ms2 : float
        Centrifugal acceleration, horizontal, outwards.
    offset_mm : float
        Foot of the resultant on the track plane, outwards from the middle.
    """

    name: str
    speed_kmh: float
    height_m: float | None
    lateral_ms2: float
    offset_mm: float


def acting(
    name: str, speed_kmh: float, height_m: float | None, radius_m: float, cant_mm: float, spacing_mm: float
) -> Acting:
    """Give the forces on a class; the foot of the resultant is found on the inclined plane, exactly."""
    lateral = speed_kmh**2 / (radius_m * KMH2_G / GRAVITY_MS2)
    slope = math.asin(max(-1.0, min(1.0, cant_mm / spacing_mm)))
    lean = math.atan2(lateral, GRAVITY_MS2) - slope
    height = 1000 * (USUAL_HEIGHT_M if height_m is None else height_m)
    return Acting(name, speed_kmh, height_m, lateral, height * math.tan(lean))


@dataclass(frozen=True)
class _Frame:
    """The track plane in the picture: its middle, its direction towards the outer rail, its normal."""

    middle: svg.Point
    along: svg.Point
    normal: svg.Point

    def at(self, along_mm: float, above_mm: float) -> svg.Point:
        return (
            self.middle[0] + PIXELS_PER_MM * (along_mm * self.along[0] + above_mm * self.normal[0]),
            self.middle[1] + PIXELS_PER_MM * (along_mm * self.along[1] + above_mm * self.normal[1]),
        )


def draw_section(
    cant_mm: float, spacing_mm: float, hand: int, classes: Sequence[Acting], measures: Measures
) -> Markup:
    """Draw the canted section.

    Parameters
    ----------
    cant_mm : float
        Cant [mm]; the outer rail is the higher where positive.
    spacing_mm : float
        Rail spacing e [mm].
    hand : int
        1 for a left-hand curve (outer rail on the right), -1 for a right-hand one.
    classes : sequence of Acting
        In the order of the table beside the drawing.
    measures : Measures
        Units of the labels.
    """
    outward = -1.0 if hand < 0 else 1.0
    slope = math.asin(max(-1.0, min(1.0, cant_mm / spacing_mm)))
    frame = _Frame(
        (WIDTH / 2, HEIGHT - 92.0),
        (outward * math.cos(slope), -math.sin(slope)),
        (-outward * math.sin(slope), -math.cos(slope)),
    )
    parts = [
        _track(frame, spacing_mm),
        _wheels(frame, spacing_mm),
        _cant_mark(frame, cant_mm, spacing_mm, outward, measures),
    ]
    parts += [_forces(frame, item, i, outward) for i, item in enumerate(classes)]
    parts += [_foot(frame, item, i, measures) for i, item in enumerate(classes)]
    height = HEIGHT + ROW * len(classes) + 34.0
    parts.append(_scale(height))
    described = (
        f"Section with cant {measures.with_unit('cant', cant_mm)} and the forces on {len(classes)} classes"
    )
    return svg.element(
        "svg",
        *parts,
        xmlns="http://www.w3.org/2000/svg",
        class_="section",
        viewBox=f"0 0 {svg.number(WIDTH)} {svg.number(height)}",
        width=WIDTH,
        height=height,
        role="img",
        aria_label=described,
    )


def _track(frame: _Frame, spacing_mm: float) -> Markup:
    half, head = spacing_mm / 2, RAIL_HEAD_MM / 2
    under = -RAIL_HEIGHT_MM
    parts = [
        svg.polygon(
            [
                frame.at(-SLEEPER_MM / 2, under),
                frame.at(SLEEPER_MM / 2, under),
                frame.at(SLEEPER_MM / 2, under - 200),
                frame.at(-SLEEPER_MM / 2, under - 200),
            ],
            "sleeper",
        ),
        svg.line(frame.at(-half, 0), frame.at(half, 0), "plane"),
    ]
    for side in (-half, half):
        corners = ((-head, 0), (head, 0), (head, -45), (10, -60), (10, -150), (70, under), (-70, under))
        mirrored = (*corners, (-10, -150), (-10, -60), (-head, -45))
        parts.append(svg.polygon([frame.at(side + a, b) for a, b in mirrored], "rail"))
    return svg.group(*parts)


def _wheels(frame: _Frame, spacing_mm: float) -> Markup:
    """Draw a wheelset on the rails, so that the eye knows the scale."""
    width, diameter = WHEEL_MM
    parts = [_box(frame, -spacing_mm / 2, spacing_mm / 2, diameter / 2 - 80, diameter / 2 + 80)]
    parts += [
        _box(frame, side - width / 2, side + width / 2, 0, diameter)
        for side in (-spacing_mm / 2, spacing_mm / 2)
    ]
    return svg.group(*parts)


def _box(frame: _Frame, left: float, right: float, low: float, high: float) -> Markup:
    corners = ((left, low), (right, low), (right, high), (left, high))
    return svg.polygon([frame.at(a, b) for a, b in corners], "body")


def _cant_mark(
    frame: _Frame, cant_mm: float, spacing_mm: float, outward: float, measures: Measures
) -> Markup:
    """Draw the cant as the height of the outer rail over the level through the inner one."""
    inner, outer = frame.at(-spacing_mm / 2, 0), frame.at(spacing_mm / 2, 0)
    edge = (WIDTH - 4.0 if outward > 0 else 4.0, min(inner[1], outer[1]) - 8)
    label = f"D {measures.with_unit('cant', cant_mm)}"
    beyond = frame.at(SLEEPER_MM / 2, 0)[0] + outward * 16
    return svg.group(
        svg.line(inner, (beyond, inner[1]), "level"),
        svg.line((outer[0], outer[1]), (beyond, outer[1]), "level"),
        svg.line((beyond, inner[1]), (beyond, outer[1]), "measure"),
        svg.words(*edge, label, "value", "end" if outward > 0 else "start"),
    )


def _forces(frame: _Frame, item: Acting, order: int, outward: float) -> Markup:
    height = 1000 * (USUAL_HEIGHT_M if item.height_m is None else item.height_m)
    start = frame.at(0, height)
    pushed = outward * WEIGHT_PIXELS * item.lateral_ms2 / GRAVITY_MS2
    end = (start[0] + pushed, start[1] + WEIGHT_PIXELS)
    kind = f"class-{order % 6}"
    parts = [
        svg.line(start, (start[0], start[1] + WEIGHT_PIXELS), "force weight"),
        svg.line(start, (start[0] + pushed, start[1]), f"force {kind}"),
        _arrow(start, end, f"force result {kind}"),
        svg.line(end, frame.at(item.offset_mm, 0), f"reach {kind}"),
        svg.element("circle", cx=start[0], cy=start[1], r=3.0, class_="gravity"),
    ]
    return svg.group(svg.element("title", item.name), *parts)


def _foot(frame: _Frame, item: Acting, order: int, measures: Measures) -> Markup:
    """Drop the foot of a resultant into a row of its own, with its distance from the middle in words."""
    x, y = frame.at(item.offset_mm, 0)
    row, kind = HEIGHT + ROW * order, f"class-{order % 6}"
    side = "outwards" if item.offset_mm >= 0 else "inwards"
    name = item.name if len(item.name) <= LONGEST_NAME else f"{item.name[: LONGEST_NAME - 1]}…"
    text = f"{name}: {measures.with_unit('cant', abs(item.offset_mm))} {side}"
    beside, anchor = (x + 12, "start") if x < WIDTH / 2 else (x - 12, "end")
    return svg.group(
        svg.line((x, y), (x, row), f"reach {kind}"),
        svg.marker(order, (x, row), 4.5, kind),
        svg.words(beside, row + 4, text, "value", anchor),
    )


def _arrow(start: svg.Point, end: svg.Point, class_: str) -> Markup:
    length = math.hypot(end[0] - start[0], end[1] - start[1]) or 1.0
    along = ((end[0] - start[0]) / length, (end[1] - start[1]) / length)
    back = (end[0] - 9 * along[0], end[1] - 9 * along[1])
    barbs = [
        (back[0] - 4 * along[1], back[1] + 4 * along[0]),
        end,
        (back[0] + 4 * along[1], back[1] - 4 * along[0]),
    ]
    return svg.group(svg.line(start, end, class_), svg.polyline(barbs, class_))


def _scale(height: float) -> Markup:
    left, y = 14.0, height - 8.0
    return svg.group(
        svg.line((left, y), (left + WEIGHT_PIXELS, y), "measure"),
        svg.words(left, y - 6, "weight of the train", "value"),
        svg.line((WIDTH - 14.0 - 1000 * PIXELS_PER_MM, y), (WIDTH - 14.0, y), "measure"),
        svg.words(WIDTH - 14.0, y - 6, "1 m", "value", "end"),
    )
