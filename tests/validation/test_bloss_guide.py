"""A published guide to the Bloss transition, and a comment on it: R 500, L 200."""

from __future__ import annotations

from ordinates import ordinates
from published import one


def test_ordinates_at_the_end() -> None:
    row = one("BLOSS-500-200")
    x, y = ordinates(row.given["transition_length_m"], row.given["radius_m"], "bloss")
    row.check(x_m=x, y_m=y)
