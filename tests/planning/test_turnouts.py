"""Turnouts in curves: signed-curvature sums by hand, against the bounds that the planner gives the main."""

from __future__ import annotations

from random import Random
from typing import Any

import pytest
from reference.cases import random_case

from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.model.turnouts import Turnout
from cant.planning import Plan, plan_line
from cant.quantities.turnouts import branch_curvature, branch_deficiency, curvature

C = 11.8
FAST = TrainClass(name="Fast", category="passenger", speed_kmh=100, trains_per_day=10, mass_t=400)
LIMITS = (
    LimitRow(quantity="cant", normal=160, unit="mm"),
    LimitRow(quantity="cant step", normal=1, unit="mm"),
    LimitRow(quantity="cant deficiency", normal=100, exceptional=130, unit="mm", clause="main"),
    LimitRow(
        quantity="cant deficiency",
        normal=75,
        exceptional=90,
        unit="mm",
        situation="turnout",
        clause="branch I",
    ),
    LimitRow(quantity="cant excess", normal=80, unit="mm", clause="E"),
)


def plan(
    turnouts: list[Turnout],
    main_m: float = 1000.0,
    hand: str = "L",
    rows: tuple[LimitRow, ...] = LIMITS,
    **settings: Any,
) -> Plan:
    curves = CurveList.from_rows(
        [
            {
                "curve": "1",
                "radius_m": main_m,
                "hand": hand,
                "start_km": 1.0,
                "end_km": 1.3,
                "transition_in_m": 60.0,
                "transition_out_m": 60.0,
            }
        ]
    )
    made = Settings(equilibrium_constant=C, **settings)
    return plan_line(curves, Traffic.of([FAST]), LimitSet(name="x", rows=rows), made, turnouts=turnouts)


def turnout(radius: float, hand: str, speed: float, **more: Any) -> Turnout:
    place = {"curve": "1"} if "chainage_km" not in more else {}
    return Turnout(
        **{"name": "T", "radius_m": radius, "hand": hand, "branch_speed_kmh": speed, **place, **more}
    )


def test_a_branch_against_the_main_line_lies_on_negative_cant() -> None:
    """Main 1000 m left, turnout 300 m right: 1/1000 - 1/300 = -1/428.57; needs 11.8 x 25^2 x 7/3000 = 17.21.

    17.21 + D <= 75 leaves the main line 57.79 mm.
    """
    record = plan([turnout(300, "R", 25)]).record(0)
    assert record["upper_mm"] == pytest.approx(75 - C * 25**2 * 7 / 3000)
    assert record["upper_by"]["quantity"] == "cant deficiency on the branch"
    assert record["upper_by"]["clause"] == "branch I"
    assert record["recommended_cant_mm"] == 57


def test_a_mirrored_line_is_the_same() -> None:
    left, right = plan([turnout(300, "R", 25)]), plan([turnout(300, "L", 25)], hand="R")
    assert left.record(0)["upper_mm"] == right.record(0)["upper_mm"]


def test_published_examination_problem_of_a_contrary_turnout() -> None:
    """An examination problem (India): the branch needs 10 mm, the limit is 75 mm, the main line may have 65.

    The branch's speed is chosen here so that it needs 10 mm.
    """
    bend = 7 / 3000
    record = plan([turnout(300, "R", (10 / (C * bend)) ** 0.5)]).record(0)
    assert record["upper_mm"] == pytest.approx(65.0)


def test_a_contrary_turnout_on_a_sharp_main_line_still_curves_with_it() -> None:
    """Main 300 m left, turnout 500 m right: 1/300 - 1/500 = 1/750 left: no negative cant.

    At 40 km/h the branch needs 11.8 x 1600 / 750 = 25.17 mm and may have an excess of 80: 105.17 mm at most.
    """
    record = plan([turnout(500, "R", 40)], main_m=300).record(0)
    assert record["upper_mm"] == pytest.approx(C * 1600 / 750 + 80)
    assert record["upper_by"]["quantity"] == "cant excess on the branch"
    assert record["upper_by"]["clause"] == "E"


def test_a_branch_with_the_main_line_needs_cant() -> None:
    """Main 1000 m, turnout 500 m, both left: 1/333.3; at 80 km/h needs 226.56, at least 151.56 mm."""
    record = plan([turnout(500, "L", 80)]).record(0)
    assert record["lower_mm"] == pytest.approx(C * 6400 * 3 / 1000 - 75)
    assert record["lower_by"]["quantity"] == "cant deficiency on the branch"
    assert record["recommended_cant_mm"] == 152


def test_a_straight_branch_has_the_cant_as_excess_and_no_more_than_either_limit() -> None:
    record = plan([turnout(1000, "R", 40)]).record(0)
    assert record["upper_mm"] == pytest.approx(75.0)


def test_the_strictest_of_several_turnouts_binds() -> None:
    alone = plan([turnout(300, "R", 25)]).record(0)
    both = plan([turnout(760, "R", 25), turnout(300, "R", 25)]).record(0)
    assert both["upper_mm"] == alone["upper_mm"]


def test_the_exceptional_value_of_the_branch_counts_as_an_approval() -> None:
    rows = (*LIMITS, LimitRow(quantity="cant deficiency", normal=50, unit="mm", category="passenger"))
    tiers = ("normal", "exceptional")
    record = plan([turnout(300, "R", 25, category="freight")], rows=rows, tiers=tiers).record(0)
    assert record["status"] == "exceptional"
    assert [p["quantity"] for p in record["limits_passed"]] == ["cant deficiency on the branch"]


def test_a_category_of_the_branch_alone_has_its_own_limits() -> None:
    """Rows of a category count for a branch of that category, for one without any category the strictest."""
    rows = (
        *LIMITS,
        LimitRow(quantity="cant deficiency", normal=50, unit="mm", category="freight", situation="turnout"),
    )
    need = C * 25**2 * 7 / 3000
    upper = {
        word: plan([turnout(300, "R", 25, category=word)], rows=rows).record(0)["upper_mm"]
        for word in ("passenger", "freight", "")
    }
    assert upper["passenger"] == pytest.approx(75 - need)
    assert upper["freight"] == pytest.approx(50 - need)
    assert upper[""] == pytest.approx(75 - need), (
        "no class of freight runs here, so no category of it is known"
    )


@pytest.mark.parametrize(("chainage", "binds"), [(1.1, True), (0.95, True), (1.36, True), (0.93, False)])
def test_a_turnout_is_found_by_its_chainage(chainage: float, binds: bool) -> None:
    """Within the arc or its transitions, with the curve's full curvature."""
    made = plan([turnout(300, "R", 25, chainage_km=chainage)])
    assert (made.record(0)["upper_by"]["quantity"] == "cant deficiency on the branch") == binds
    assert [f.code for f in made.findings if f.code == "turnout-not-placed"] == (
        [] if binds else ["turnout-not-placed"]
    )


def test_today_is_judged_by_the_branch_too() -> None:
    curves = CurveList.from_rows([{"curve": "1", "radius_m": 1000, "hand": "L", "cant_mm": 100.0}])
    made = plan_line(
        curves,
        Traffic.of([FAST]),
        LimitSet(name="x", rows=LIMITS),
        Settings(equilibrium_constant=C),
        turnouts=[turnout(300, "R", 25)],
    )
    today = made.record(0)["today"]
    assert today["status"] == "breaks limits"
    assert [b["quantity"] for b in today["breaks"]] == ["cant deficiency on the branch"]


def test_without_turnouts_nothing_changes() -> None:
    assert plan([]).record(0) == plan([turnout(300, "R", 25, curve="elsewhere")]).record(0)


@pytest.mark.parametrize("first", range(0, 120, 40))
def test_on_random_lines_every_branch_keeps_its_limits(first: int) -> None:
    """What the cant does to a branch is worked out by the physics room, not by the planner's rule."""
    checked = 0
    for seed in range(first, first + 40):
        chance, case = Random(seed), random_case(seed)
        named = [i for i in range(len(case.curves)) if not case.curves.rejected[i]]
        turnouts = [
            Turnout(
                line=case.curves.line[i],
                track=case.curves.track[i],
                curve=case.curves.curve[i],
                radius_m=chance.choice([190.0, 300.0, 500.0, 1200.0]),
                hand=chance.choice(["L", "R"]),
                branch_speed_kmh=chance.choice([25.0, 40.0, 60.0]),
                category=chance.choice(["", "passenger", "freight"]),
            )
            for i in named
            if chance.random() < 0.5
        ]
        made = plan_line(*case, turnouts=turnouts)
        branches = made.outcome.line.branches
        if branches is None:
            continue
        tier = case.settings.allows_exceptional
        deficiency, excess = (
            branches.limit(made.outcome.line.table, f"cant {name}", tier).value
            for name in ("deficiency", "excess")
        )
        for i in named:
            if made.status[i] in ("not compliant", "not assessed") or not branches.there[i, 0]:
                continue
            turnout = turnouts[int(branches.number[i, 0])]
            hand = int(case.curves.hand[i])
            main = curvature(case.curves.radius_m[i], hand)
            bend = branch_curvature(main, curvature(turnout.radius_m, 1 if turnout.hand == "L" else -1))
            unbalance = branch_deficiency(
                turnout.branch_speed_kmh, bend, hand * made.proposed_mm[i], case.settings.constant
            )
            assert -excess[i, 0] - 0.03 <= unbalance <= deficiency[i, 0] + 0.03, (seed, i)
            checked += 1
    assert checked > 20
