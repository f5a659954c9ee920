"""A panel of a drawing: how a value becomes a height, and the grid lines beside it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from webapp.drawings import svg
from webapp.measures import Measures

FEWEST_STEPS = 3
MARGIN = 0.15
"""Steps left free beyond the outermost value, so that its marker stays within the panel."""


@dataclass(frozen=True)
class Panel:
    """A strip of the drawing with a vertical scale.

    Attributes
    ----------
    top, height : float
        Place [px].
    low, high : float
        Values at the bottom and the top.
    ticks : tuple of (float, str)
        Values with a grid line, and their labels.
    """

    top: float
    height: float
    low: float
    high: float
    ticks: tuple[tuple[float, str], ...]

    @property
    def bottom(self) -> float:
        """Lower edge [px]."""
        return self.top + self.height

    def y(self, value: float) -> float:
        """Give the height of a value, kept within the panel [px]."""
        share = (value - self.low) / (self.high - self.low)
        return self.bottom - min(max(share, 0.0), 1.0) * self.height

    def draw_grid(self, width: float) -> Markup:
        """Draw the zero line and the grid lines with their labels."""
        parts = [svg.rectangle(0, self.top, width, self.height, "panel")]
        for value, label in self.ticks:
            parts.append(svg.line((0, self.y(value)), (width, self.y(value)), "grid"))
            parts.append(svg.words(3, self.y(value) - 2, label, "grid-label"))
        parts.append(svg.line((0, self.y(0.0)), (width, self.y(0.0)), "zero"))
        return svg.group(*parts, aria_hidden="true")


def step_for(span: float) -> float:
    """Give a round step (1, 2 or 5 times a power of ten) that parts a span at least three times."""
    if span <= 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(span / FEWEST_STEPS))
    return max((s for s in (2 * power, 5 * power) if span / s >= FEWEST_STEPS), default=power)


def panel_for(top: float, height: float, values: Sequence[float], measures: Measures, kind: str) -> Panel:
    """Give a panel whose round ticks, in the shown unit, take in all values and zero."""
    shown = [0.0, *(measures.number(kind, v) for v in values)]
    low, high = min(shown), max(shown)
    if high - low < 1e-9:
        high = low + 1.0
    step = step_for(high - low)
    first, last = math.floor(low / step - MARGIN * (low < 0)), math.ceil(high / step + MARGIN)
    return _stepped(top, height, (first, last, step), measures, kind)


def panel_around(
    top: float, height: float, values: Sequence[float], measures: Measures, kind: str, span: float
) -> Panel:
    """Give a panel that takes in values not below zero, and at least ``span`` [shown unit]."""
    shown = [measures.number(kind, v) for v in values] or [0.0]
    low, high = min(shown), max(shown)
    low = max(low - max(span - (high - low), 0.0) / 2, 0.0)
    high = max(high, low + span)
    step = step_for(high - low)
    first, last = max(math.floor(low / step - MARGIN), 0), math.ceil(high / step + MARGIN)
    return _stepped(top, height, (first, last, step), measures, kind)


def _stepped(
    top: float, height: float, steps: tuple[int, int, float], measures: Measures, kind: str
) -> Panel:
    first, last, step = steps
    size = measures.canonical(kind, 1.0)
    begin = first + (first != 0)
    ticks = tuple((i * step * size, f"{abs(i) * step:g}") for i in range(begin, last) if i != 0)
    return Panel(top, height, first * step * size, last * step * size, ticks)
