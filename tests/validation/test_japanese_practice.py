"""Japanese practice on 1067 mm gauge, from secondary pages (hosenwiki.com; kokenlbo.com): common practice."""

from __future__ import annotations

import pytest
from governing import strictest
from published import Row, equilibrium, one, rows

from cant import limit_sets
from cant.quantities.constants import rail_spacing_from_constant
from cant.quantities.lengths import length_for_gradient, length_for_rate, needed_length

SET = limit_sets.load("jp-1067")


def limit(quantity: str, category: str = "passenger") -> float:
    value = strictest(SET, quantity, category=category)
    assert value is not None
    return value


@rows("JP-84-")
def test_equilibrium_cant(row: Row) -> None:
    """C = 8.4 V^2 / R, the gauge itself in the place of the rail spacing."""
    row.check(equilibrium_cant_mm=equilibrium(row))
    assert row.given["constant"] == SET.equilibrium_constant
    assert rail_spacing_from_constant(8.4) == pytest.approx(row.given["track_gauge_mm"], abs=1.5)


def test_limits() -> None:
    one("JP-lim-576").check(cant_max_mm=limit("cant"))
    one("JP-lim-579").check(cant_deficiency_max_mm=limit("cant deficiency"))
    one("JP-lim-579").check(cant_deficiency_max_mm=limit("cant deficiency", "freight"))
    one("JP-lim-580").check(cant_deficiency_max_mm=limit("cant deficiency", "multiple unit"))
    one("JP-lim-581").check(cant_deficiency_max_mm=limit("cant deficiency", "tilting"))


def test_transition_length() -> None:
    """The longest of 0.8 C, 0.008 C V, 0.009 Cd V, out of the set's gradient and rates."""
    row = one("JP-L-ex")
    cant, deficiency, speed = (row.given[key] for key in ("cant_mm", "cant_deficiency_mm", "speed_kmh"))
    gradient, cant_rate = limit("cant gradient"), limit("rate of change of cant")
    deficiency_rate = limit("rate of change of cant deficiency")
    row.check(
        L1_m=length_for_gradient(cant, gradient),
        L2_m=length_for_rate(cant, speed, cant_rate),
        L3_m=length_for_rate(deficiency, speed, deficiency_rate),
    )
    longest = needed_length(cant, deficiency, speed, gradient, cant_rate, deficiency_rate)
    assert longest == pytest.approx(max(row.printed.values()))
