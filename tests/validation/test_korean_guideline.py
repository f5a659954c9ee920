"""Korean track maintenance guideline of 19 March 2015, art. 14: run-off of 0.6 m for each mm of cant."""

from __future__ import annotations

from published import one

from cant.quantities.lengths import length_for_gradient


def test_run_off() -> None:
    row = one("KR-run-100")
    row.check(runoff_min_m=length_for_gradient(row.given["cant_change_mm"], 1 / 0.6))
