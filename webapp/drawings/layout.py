"""Where the curves of a line lie across the strips of its drawing.

Lengths are squeezed between bounds, so that a short curve can still be read and a long straight takes no
page; a chain of curves that share transitions stays in one strip where it fits.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

STRIP_WIDTH = 340.0
PIXELS_PER_METRE = 0.12
ARC_PIXELS = (46.0, 120.0)
TRANSITION_PIXELS = (10.0, 34.0)
STRAIGHT_PIXELS = (14.0, 44.0)
LETTER = 6.2
"""Width of a letter of the drawing [px]."""


@dataclass(frozen=True)
class ClassSpeeds:
    """Speeds of a class that runs on a curve [km/h]; the permissible one is None where it is not known."""

    name: str
    planned_kmh: float
    permissible_kmh: float | None

    @property
    def falls_short(self) -> bool:
        """Whether the permissible speed lies below the planned one."""
        return self.permissible_kmh is not None and self.permissible_kmh < self.planned_kmh - 1e-6


@dataclass(frozen=True)
class DrawnCurve:
    """What the drawing needs of one curve; lengths in m, cants in mm, signed by nothing.

    ``deficiency_mm`` holds for each class the deficiency, or less the excess; ``speeds`` its speeds; None
    where it does not run.
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
    speeds: Sequence[ClassSpeeds | None] = ()


@dataclass
class Placed:
    """A curve with its places across the strip [px]."""

    curve: DrawnCurve
    begin: float
    arc_begin: float
    arc_end: float
    end: float
    joined_before: bool
    shortened_before: bool = False


@dataclass
class Strip:
    """A strip; ``before`` and ``after`` are curves of other strips with which it shares a transition."""

    placed: list[Placed] = field(default_factory=list)
    width: float = 0.0
    before: DrawnCurve | None = None
    after: DrawnCurve | None = None


def _clamp(metres: float | None, bounds: tuple[float, float]) -> float:
    low, high = bounds
    return low if metres is None else min(max(metres * PIXELS_PER_METRE, low), high)


def lay_out(curves: Sequence[DrawnCurve]) -> list[Strip]:
    """Place curves that follow each other along one track into strips.

    Parameters
    ----------
    curves : sequence of DrawnCurve
        In the order of their chainage, at least one.

    Returns
    -------
    list of Strip
        Each with its curves and their places [px].
    """
    strips = [Strip()]
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
        placed = Placed(curve, begin, begin + lead, arc_end, arc_end + tail, joined)
        placed.shortened_before = straight is not None and straight * PIXELS_PER_METRE > STRAIGHT_PIXELS[1]
        strip.placed.append(placed)
        strip.width = placed.end
    strips[-1].width += STRAIGHT_PIXELS[0]
    return strips


def _next_strip(strips: list[Strip], before: DrawnCurve | None, curve: DrawnCurve, lead: float) -> Strip:
    """Begin a strip; where a shared transition is cut, each strip shows half of it."""
    strips[-1].width += STRAIGHT_PIXELS[0] / 2 if before is None else lead / 2
    if before is not None:
        strips[-1].after = curve
    strips.append(Strip(before=before))
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
