"""Every rule a hair inside and a hair outside its limit: the cant on the bound, then the next of the grid.

The bounds are worked out by hand beside each case from the plain formulas (D_EQ = C V^2 / R, felt
acceleration (1 + s) g I / e, rates as value times speed over length); a limit is kept when passed by 0.001
of its unit.
"""

from __future__ import annotations

from typing import Any

import pytest

from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning.outcome import Outcome, plan_arrays

C, RADIUS, FAST, SLOW, ROLL = 11.8, 500.0, 100.0, 50.0, 0.25
LENGTH = 100.0
BALANCE = C * FAST**2 / RADIUS  # 236 mm
SLOW_BALANCE = C * SLOW**2 / RADIUS  # 59 mm
FELT_PER_MM = (1 + ROLL) / (12.96 * C)  # g / e = 1 / (12.96 C)
WITHIN, BEYOND = 0.0005, 0.002

UNITS = {
    "cant": "mm",
    "cant deficiency": "mm",
    "cant excess": "mm",
    "felt acceleration": "m/s2",
    "cant gradient": "mm/m",
    "rate of change of cant": "mm/s",
    "rate of change of cant deficiency": "mm/s",
    "abrupt change of cant deficiency": "mm",
}
LOW, HIGH = "least", "fraction"  # methods that press against the lower and the upper bounds


def plan(quantity: str, limit: float, method: str, rows: list[dict[str, Any]], category: str = "") -> Outcome:
    trains = [
        TrainClass(
            name=name, category=kind, speed_kmh=speed, trains_per_day=10, mass_t=900, roll_coefficient=ROLL
        )
        for name, kind, speed in (("Express", "passenger", FAST), ("Goods", "freight", SLOW))
    ]
    limits = LimitSet(
        name="one rule",
        rows=(
            LimitRow(quantity="cant step", normal=5, unit="mm"),
            LimitRow(quantity=quantity, normal=limit, unit=UNITS[quantity], category=category),
        ),
    )
    settings = Settings(equilibrium_constant=C, method=method, fraction_of_fastest=1.0)
    return plan_arrays(CurveList.from_rows(rows), Traffic.of(trains), limits, settings)


def curve(**more: Any) -> dict[str, Any]:
    return {
        "curve": "1",
        "start_km": 1.0,
        "end_km": 1.2,
        "radius_m": RADIUS,
        "hand": "L",
        "transition_in_m": LENGTH,
        "transition_out_m": LENGTH,
        **more,
    }


ONE_END = [{"transition_out_m": None}, {"transition_in_m": None}]
LEAST = 100.0  # the cant on the bound in every case below


@pytest.mark.parametrize(
    ("quantity", "limit", "method", "category", "row"),
    [
        ("cant deficiency", BALANCE - LEAST, LOW, "", {}),
        ("felt acceleration", FELT_PER_MM * (BALANCE - LEAST), LOW, "passenger", {}),
        *(
            ("rate of change of cant deficiency", (BALANCE - LEAST) * FAST / (3.6 * LENGTH), LOW, "", end)
            for end in ONE_END
        ),
        (
            "rate of change of cant deficiency",
            1.5 * (BALANCE - LEAST) * FAST / (3.6 * LENGTH),
            LOW,
            "",
            {"shape": "bloss"},
        ),
        ("cant", LEAST, HIGH, "", {}),
        ("cant excess", LEAST - SLOW_BALANCE, HIGH, "", {}),
        ("felt acceleration", FELT_PER_MM * (LEAST - SLOW_BALANCE), HIGH, "freight", {}),
        *(("cant gradient", LEAST / LENGTH, HIGH, "", end) for end in ONE_END),
        ("cant gradient", 2.0 * LEAST / LENGTH, HIGH, "", {"shape": "helmert"}),
        ("cant gradient", LEAST / 80.0, HIGH, "", {"ramp_in_m": 80.0}),
        *(("rate of change of cant", LEAST * FAST / (3.6 * LENGTH), HIGH, "", end) for end in ONE_END),
    ],
)
def test_bound_of_a_curve(
    quantity: str, limit: float, method: str, category: str, row: dict[str, Any]
) -> None:
    beyond = LEAST + (5.0 if method == LOW else -5.0)
    for change, expected in ((0.0, LEAST), (-WITHIN, LEAST), (-BEYOND, beyond)):
        outcome = plan(quantity, limit + change, method, [curve(**row)], category)
        assert outcome.cant_mm[0] == expected, (change, outcome.cant_mm)
        assert outcome.status == ["change"]


@pytest.mark.parametrize(
    ("name", "method", "sign"), [("cant_at_least_mm", LOW, 1), ("cant_at_most_mm", HIGH, -1)]
)
def test_bound_of_the_site(name: str, method: str, sign: int) -> None:
    for change, expected in ((0.0, LEAST), (WITHIN, LEAST), (BEYOND, LEAST + sign * 5.0)):
        outcome = plan("cant", 300.0, method, [curve(**{name: LEAST + sign * change})])
        assert outcome.cant_mm[0] == expected


def test_jump_at_a_straight_is_mended_by_speed_alone() -> None:
    none = {"transition_in_m": 0.0, "transition_out_m": LENGTH}
    for change, expected in ((0.0, FAST), (-WITHIN, FAST), (-BEYOND, FAST - 5.0)):
        outcome = plan("abrupt change of cant deficiency", BALANCE + change, LOW, [curve(**none)])
        assert outcome.proposed.run_kmh[0, 0] == expected


# -- shared transitions: the first curve's cant is fixed at 60 mm --------------------------------------------

FIXED, SHARED = 60.0, 40.0


def pair(hand: str, length: float = SHARED, radius: float = RADIUS) -> list[dict[str, Any]]:
    far = {"transition_in_m": length, "transition_out_m": None, "radius_m": radius, "hand": hand}
    return [
        curve(transition_in_m=None, transition_out_m=length, cant_mm=FIXED, cant_fixed=True),
        curve(curve="2", start_km=1.2 + length / 1000, end_km=1.4 + length / 1000, **far),
    ]


@pytest.mark.parametrize(
    ("quantity", "limit", "method", "hand", "bound"),
    [
        ("cant gradient", 40.0 / SHARED, HIGH, "L", 100.0),
        ("cant gradient", 80.0 / SHARED, HIGH, "R", 20.0),
        ("cant gradient", 40.0 / SHARED, LOW, "L", 20.0),
        ("rate of change of cant", 40.0 * FAST / (3.6 * SHARED), HIGH, "L", 100.0),
        ("rate of change of cant", 80.0 * FAST / (3.6 * SHARED), HIGH, "R", 20.0),
        ("rate of change of cant deficiency", 40.0 * FAST / (3.6 * SHARED), HIGH, "L", 100.0),
        ("rate of change of cant deficiency", 40.0 * FAST / (3.6 * SHARED), LOW, "L", 20.0),
        # Reverse: 176 mm on the first, so that 236 - 200 = 36 mm are left for the second.
        ("rate of change of cant deficiency", 212.0 * FAST / (3.6 * SHARED), LOW, "R", 200.0),
    ],
)
def test_bound_over_a_shared_transition(
    quantity: str, limit: float, method: str, hand: str, bound: float
) -> None:
    beyond = bound + (5.0 if method == LOW else -5.0)
    for change, expected in ((0.0, bound), (-WITHIN, bound), (-BEYOND, beyond)):
        outcome = plan(quantity, limit + change, method, pair(hand))
        assert len(outcome.pairs) == 1
        assert outcome.cant_mm.tolist() == [FIXED, expected], change
        assert not outcome.restricted.any()


def test_arcs_that_touch_have_equal_cants() -> None:
    for method in (LOW, HIGH):
        outcome = plan("cant", 300.0, method, pair("L", 0.0))
        assert outcome.cant_mm.tolist() == [FIXED, FIXED]


def test_jump_between_arcs_that_touch_is_mended_by_speed_alone() -> None:
    jump = BALANCE - C * FAST**2 / 800.0
    for change, slowed in ((0.0, False), (-WITHIN, False), (-BEYOND, True)):
        rows = pair("L", 0.0, radius=800.0)
        outcome = plan("abrupt change of cant deficiency", jump + change, LOW, rows)
        # Of two arcs of one length and speed the first slows, and no other.
        expected = [FAST - 5.0 if slowed else FAST, FAST]
        assert outcome.proposed.run_kmh[:, 0].tolist() == expected
