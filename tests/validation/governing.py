"""Which value of a limit set holds for one class on one curve: written here again, apart from the planner."""

from __future__ import annotations

from cant.model.limits import QUANTITIES, LimitRow, LimitSet

SPACING_MM = 1500.0


def holds(row: LimitRow, category: str, situation: str, speed_kmh: float, radius_m: float) -> bool:
    """Say whether every condition of a row is met."""
    return (
        row.category in ("", category)
        and row.situation in ("", situation)
        and (row.speed_over_kmh is None or speed_kmh > row.speed_over_kmh)
        and (row.speed_up_to_kmh is None or speed_kmh <= row.speed_up_to_kmh)
        and (row.radius_over_m is None or radius_m > row.radius_over_m)
        and (row.radius_up_to_m is None or radius_m <= row.radius_up_to_m)
    )


def strictest(
    limit_set: LimitSet,
    quantity: str,
    *,
    category: str = "passenger",
    situation: str = "plain",
    speed_kmh: float = 100.0,
    radius_m: float = 1000.0,
    kind: str = "",
    spacing_mm: float = SPACING_MM,
) -> float | None:
    """Give the strictest value in the quantity's canonical unit, or None where no row holds."""
    values = [
        row.canonical(row.normal + row.per_metre_of_radius * radius_m, spacing_mm)
        for row in limit_set.of(quantity)
        if holds(row, category, situation, speed_kmh, radius_m) and kind in ("", row.kind)
    ]
    choose = max if QUANTITIES[quantity].larger_is_stricter else min
    return choose(values) if values else None
