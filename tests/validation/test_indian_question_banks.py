"""Question banks of Indian examinations: limits of broad gauge; multiple-choice problems as what they are."""

from __future__ import annotations

from governing import strictest
from published import Row, equilibrium, one, rows

from cant import limit_sets
from cant.quantities.bounds import least_cant_for_deficiency
from cant.quantities.turnouts import branch_cant, branch_deficiency, curvature, main_cant_range

SET = limit_sets.load("in-bg-1676")


def test_limits_of_broad_gauge() -> None:
    one("IN-max-BG-lo").check(cant_max_mm=strictest(SET, "cant", speed_kmh=119) or 0)
    one("IN-max-BG-hi").check(cant_max_mm=strictest(SET, "cant", speed_kmh=121) or 0)
    one("IN-Cd-BG-75").check(cant_deficiency_max_mm=strictest(SET, "cant deficiency", speed_kmh=100) or 0)
    one("IN-Cd-BG-100").check(cant_deficiency_max_mm=strictest(SET, "cant deficiency", speed_kmh=101) or 0)
    one("IN-Ce-BG").check(cant_excess_max_mm=strictest(SET, "cant excess") or 0)


@rows("IN-MCQ-")
def test_equilibrium_cant_with_the_gauge_as_spacing(row: Row) -> None:
    """The problems put 1676 mm, the gauge, where the rail spacing belongs."""
    row.check(equilibrium_cant_mm=equilibrium(row))


def test_negative_cant_of_a_contrary_branch() -> None:
    """Signed curvature gives what the problem works out: branch needs 10 mm, limit 75 mm, main line 65 mm."""
    row = one("IN-NEG-65")
    needed, limit = row.given["branch_equilibrium_cant_mm"], row.given["cant_deficiency_max_mm"]
    row.check(branch_cant_mm=least_cant_for_deficiency(needed, limit))
    main, branch = curvature(600, 1), curvature(1376, -1)
    speed = (needed * 1376 / 13.76) ** 0.5
    _, most = main_cant_range(speed, main, branch, limit, limit, 13.76)
    row.check(main_cant_mm=float(most), branch_cant_mm=branch_cant(branch, most))
    assert abs(float(branch_deficiency(speed, branch, most, 13.76)) - limit) < 1e-9
