"""Norwegian TRV:02415: length of constant curvature 0.5 V normally, 0.25 V at least (m, km/h)."""

from __future__ import annotations

import pytest
from published import Row, rows

from cant.quantities.speeds import time_over


@rows("NO-L-")
def test_length_is_a_travel_time(row: Row) -> None:
    """0.5 V metres are 1.8 s at V, 0.25 V metres 0.9 s, whatever the speed."""
    normal, least = (row.printed[f"min_constant_curvature_length_{key}_m"] for key in ("normal", "min"))
    assert time_over(normal, row.given["speed_kmh"]) == pytest.approx(1.8)
    assert time_over(least, row.given["speed_kmh"]) == pytest.approx(0.9)
