"""IRICEN notes Railway Curves (institute notes, India), examples 3.7 and 3.8."""

from __future__ import annotations

from published import Row, equilibrium, one, rows

from cant import limit_sets
from cant.quantities.speeds import permissible_speed
from cant.quantities.transitions import rate_of_change_of_deficiency

RULE_027 = 1 / 0.27**2


def test_example_3_7_speed() -> None:
    """V = 0.27 sqrt(R (Ca + Cd)): the constant is 1 / 0.27^2."""
    row = one("IN-IRICEN-3.7a")
    given = row.given
    row.check(
        speed_kmh=permissible_speed(
            given["cant_mm"], given["cant_deficiency_mm"], given["radius_m"], RULE_027
        )
    )


def test_example_3_7_rates_over_the_virtual_transition() -> None:
    for row in (one("IN-IRICEN-3.7b"), one("IN-IRICEN-3.7c")):
        given = row.given
        rate = rate_of_change_of_deficiency(
            given["cant_deficiency_mm"], given["speed_kmh"], given["transition_length_m"]
        )
        row.check(rate_of_change_cant_deficiency_mm_s=rate)


@rows("IN-IRICEN-3.8-")
def test_example_3_8_equilibrium_cant(row: Row) -> None:
    assert row.given["constant"] == limit_sets.load("in-bg-1676").equilibrium_constant
    row.check(equilibrium_cant_mm=equilibrium(row))
