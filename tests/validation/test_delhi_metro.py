"""Delhi Metro design figures: 125 mm of cant and 100 mm of deficiency, speeds rounded down to 5 km/h."""

from __future__ import annotations

from published import Row, rows

from cant.quantities.speeds import permissible_speed, speed_on_step


@rows("IN-DMRC-")
def test_posted_speed(row: Row) -> None:
    """Both speeds fit the broad-gauge rule V = 0.27 sqrt(R (Ca + Cd))."""
    given = row.given
    speed = permissible_speed(given["cant_mm"], given["cant_deficiency_mm"], given["radius_m"], 1 / 0.27**2)
    row.check(speed_kmh_posted=speed_on_step(speed, 5))
