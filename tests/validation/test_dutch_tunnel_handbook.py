"""Dutch tunnel handbook, metro, table 38.1: smallest radius by speed; cant plus deficiency is inferred."""

from __future__ import annotations

from published import Row, rows

from cant.quantities.speeds import smallest_radius


@rows("NL-38.1-")
def test_smallest_radius(row: Row) -> None:
    """240 mm on slab, 210 mm on ballast: the split between cant and deficiency does not matter."""
    total = row.given["cant_plus_deficiency_mm"]
    row.check(radius_min_m=smallest_radius(row.given["speed_kmh"], total - 100, 100, 11.8))
