"""A line planned part by part: every curve once, and each as in the whole line."""

from __future__ import annotations

import numpy as np
import pytest
from reference.cases import random_case

from cant.explaining import explain
from cant.explaining.parts import parts_of
from cant.model.curves import CurveList
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning import Plan, plan_line
from cant.planning.outcome import Outcome

LIMITS = LimitSet(
    name="x",
    rows=(
        LimitRow(quantity="cant", normal=150, unit="mm"),
        LimitRow(quantity="cant deficiency", normal=110, unit="mm"),
        LimitRow(quantity="cant excess", normal=90, unit="mm"),
        LimitRow(quantity="cant gradient", normal=1.5, unit="mm/m"),
        LimitRow(quantity="rate of change of cant deficiency", normal=50, unit="mm/s"),
        LimitRow(quantity="abrupt change of cant deficiency", normal=60, unit="mm"),
    ),
)
TRAFFIC = Traffic.of(
    [
        TrainClass(name="Fast", category="passenger", speed_kmh=140, trains_per_day=20, mass_t=400),
        TrainClass(name="Slow", category="freight", speed_kmh=70, trains_per_day=30, mass_t=1500),
    ]
)


def line_of(seed: int, count: int = 60) -> Plan:
    """Plan two tracks in mixed order, one listed against the chainage, some rows unplaced or overlapping."""
    chance = np.random.default_rng(seed)
    rows: list[dict[str, object]] = []
    for track in ("Up", "Down"):
        km = 0.0
        for i in range(count // 2):
            shared = chance.random() < 0.5
            start = km + (0.04 if shared else 0.3 + chance.random())
            start -= 0.1 if chance.random() < 0.04 else 0.0
            km = start + chance.integers(100, 400) / 1000
            ends = (start, km) if track == "Up" else (km, start)
            placed = chance.random() > 0.05
            rows.append(
                {
                    "line": "Vale",
                    "track": track,
                    "curve": f"{track}{i}",
                    "row": len(rows) + 2,
                    "radius_m": float(chance.choice([400, 700, 1100])),
                    "hand": str(chance.choice(["L", "R"])),
                    "start_km": ends[0] if placed else None,
                    "end_km": ends[1] if placed else None,
                    "transition_in_m": float(chance.choice([0, 40])),
                    "transition_out_m": 40.0,
                    "cant_mm": float(chance.choice([0, 60, 90])),
                    "speed_kmh": 90.0,
                }
            )
    order = chance.permutation(len(rows))
    curves = CurveList.from_rows([rows[i] for i in order])
    return plan_line(curves, TRAFFIC, LIMITS, Settings(equilibrium_constant=11.8))


@pytest.mark.parametrize("large", [1, 7, 25])
def test_every_curve_is_in_one_part_and_no_chain_is_cut(large: int) -> None:
    outcome = line_of(1).outcome
    parts = parts_of(outcome, large)
    assert sorted(np.concatenate([part.own for part in parts]).tolist()) == list(range(len(outcome.curves)))
    if large < 25:
        assert len(parts) > 2
    for part in parts:
        own = set(part.own.tolist())
        assert part.every[: len(part.own)].tolist() == part.own.tolist()
        for a, b in zip(outcome.pairs.first.tolist(), outcome.pairs.second.tolist(), strict=True):
            assert (a in own) == (b in own)


@pytest.mark.parametrize("seed", range(4))
def test_methods_planned_in_parts_are_those_of_the_whole_line(
    seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    plan = line_of(seed) if seed < 2 else plan_line(*random_case(seed))
    every = plan.assessed.tolist()
    whole, parted = explain(plan), explain(plan)
    whole._methods.prepare(every, rest_follows=True)

    def small(outcome: Outcome) -> object:
        return parts_of(outcome, 5)

    monkeypatch.setattr("cant.explaining.local.parts_of", small)
    for begin in range(0, len(every), 16):
        block = every[begin : begin + 16]
        parted._methods.prepare(block, rest_follows=True)
        assert [parted.methods(i) for i in block] == [whole.methods(i) for i in block]
        parted._methods.forget(block)
    assert not parted._methods._whole


def test_options_found_block_by_block_are_those_found_together() -> None:
    plan = line_of(7, 24)
    every = plan.assessed.tolist()
    whole, parted = explain(plan), explain(plan)
    whole.prepare(every)
    assert sum(bool(whole.options(i)) for i in every) > 3
    for begin in range(0, len(every), 9):
        block = every[begin : begin + 9]
        parted.prepare(block)
        assert [parted.options(i) for i in block] == [whole.options(i) for i in block]
        parted.forget(block)
    assert not parted._options._found
