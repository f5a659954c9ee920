"""An observation page on train speeds in curves: 6 in of cant deficiency are 1 m/s2."""

from __future__ import annotations

from published import one

from cant.quantities.kinematics import unbalanced_acceleration
from cant.units import INCH_MM


def test_six_inches() -> None:
    row = one("US-6in")
    deficiency = row.given["cant_deficiency_in"] * INCH_MM
    row.check(lateral_acceleration_m_s2=unbalanced_acceleration(deficiency, 0, row.given["rail_spacing_mm"]))
