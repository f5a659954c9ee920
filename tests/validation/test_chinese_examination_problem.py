"""A Chinese examination problem of mixed speeds: R 600, mean 66.7, fastest 90, freight 45 km/h."""

from __future__ import annotations

from published import equilibrium, one

from cant.quantities.kinematics import cant_deficiency, cant_excess


def test_equilibrium_at_the_mean_speed() -> None:
    one("CN-600a").check(equilibrium_cant_mm=equilibrium(one("CN-600a")))


def test_deficiency_and_excess_at_85_and_90_mm() -> None:
    """At 85 mm both limits (75 and 50 mm) are kept, at 90 mm the excess of 50.175 mm is not."""
    for identity in ("CN-600b", "CN-600d"):
        row = one(identity)
        row.check(cant_deficiency_mm=cant_deficiency(equilibrium(row), row.given["cant_mm"]))
    for identity in ("CN-600c", "CN-600e"):
        row = one(identity)
        row.check(cant_excess_mm=cant_excess(equilibrium(row), row.given["cant_mm"]))
