"""Ordinates of a transition by numerical integration of its curvature, apart from every formula for them."""

from __future__ import annotations

import numpy as np

from cant.quantities.shapes import profile


def ordinates(length_m: float, radius_m: float, shape: str, steps: int = 20_001) -> tuple[float, float]:
    """Give x along the tangent and y across it at the transition's end [m, m]."""
    share = np.linspace(0.0, 1.0, steps)
    curvature = profile(share, shape) / radius_m
    step = length_m / (steps - 1)
    angle = np.concatenate(([0.0], np.cumsum((curvature[1:] + curvature[:-1]) / 2))) * step
    return float(np.trapezoid(np.cos(angle), dx=step)), float(np.trapezoid(np.sin(angle), dx=step))
