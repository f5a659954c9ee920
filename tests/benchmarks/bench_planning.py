"""How long planning takes, alone: ``python tests/benchmarks/bench_planning.py [curves ...]``.

Prints for each size the time of the array work (tables in, cants, speeds and verdicts out), of making the
records, and the largest memory of the process; the invented register has 8 classes and a third of its curves
in chains. The share of the curves that each step of the choice is given stands beside. The same curves in one
single chain come last. Run by hand: the machine's noise is in every figure, so compare ratios of one run.
"""

from __future__ import annotations

import resource
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from typing import Any

import numpy as np

import cant.planning.choose as choosing
from cant.limit_sets import load
from cant.model.curves import PLAIN, CurveList
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.planning.outcome import Outcome, plan_arrays
from cant.planning.plan import Plan

SIZES = (1_000, 10_000, 100_000)
CHAINS = (75, 150, 300)
CURVES_A_LINE = 500
MEBI = 1024

CLASSES = (
    ("Express", "passenger", 160.0, 24.0, 420.0),
    ("Regional", "passenger", 140.0, 38.0, 260.0),
    ("Stopping", "passenger", 120.0, 40.0, 180.0),
    ("Night", "passenger", 120.0, 2.0, 700.0),
    ("Parcels", "freight", 120.0, 4.0, 800.0),
    ("Container", "freight", 100.0, 14.0, 1600.0),
    ("Mixed goods", "freight", 90.0, 16.0, 1400.0),
    ("Ore", "freight", 80.0, 9.0, 3200.0),
)


def make_traffic() -> Traffic:
    """Give eight classes of an invented line."""
    return Traffic.of(
        TrainClass(
            name=name,
            category=category,
            speed_kmh=speed,
            trains_per_day=trains,
            mass_t=mass,
            roll_coefficient=0.25,
        )
        for name, category, speed, trains, mass in CLASSES
    )


def make_register(n: int, seed: int = 1) -> CurveList:
    """Invent a register: radii that mostly suit the line speed, a third of the curves in chains."""
    rng = np.random.default_rng(seed)
    line_speed = rng.choice([70.0, 80.0, 90.0, 100.0, 110.0, 120.0, 140.0, 160.0], n)
    # Mostly comfortable, one in twelve too sharp for its line speed.
    comfort = rng.uniform(1.1, 2.4, n) * np.where(rng.random(n) < 1 / 12, 0.6, 1.0)
    radius = np.round(11.8 * line_speed**2 / 230.0 * comfort / 5) * 5
    length = np.round(rng.uniform(80, 700, n))
    transition = np.round(np.clip(line_speed * rng.uniform(0.5, 1.1, n), 30, 160))
    # Pairs and threes: the distance to the next curve is the transition they share.
    linked = np.zeros(n, dtype=bool)
    linked[0::9] = True
    linked[4::18] = True
    linked[5::18] = True
    gap = np.where(linked, transition, transition + 400.0)
    gap[:-1] = np.where(linked[:-1], np.maximum(transition[:-1], transition[1:]), gap[:-1] + transition[1:])
    start = np.zeros(n)
    number = np.arange(n) // CURVES_A_LINE
    along = np.concatenate([[0.0], np.cumsum(length + gap)[:-1]])
    first = along[number * CURVES_A_LINE]
    start = np.round(along - first) / 1000.0
    hand = rng.choice([1, -1], n).astype(np.int8)
    today = np.round(np.clip(11.8 * (0.8 * line_speed) ** 2 / radius, 0, 150) / 5) * 5
    nothing = np.full(n, np.nan)
    return CurveList(
        file="register",
        sheet=["Curves"] * n,
        row=np.arange(n, dtype=np.int64) + 2,
        line=[f"L{i}" for i in number],
        track=["1"] * n,
        curve=[str(i) for i in range(n)],
        rejected=np.zeros(n, dtype=np.bool_),
        start_km=start,
        end_km=np.round(along - first + length) / 1000.0,
        radius_m=radius,
        hand=hand,
        length_m=length,
        transition_in_m=transition,
        transition_out_m=transition.copy(),
        ramp_in_m=nothing,
        ramp_out_m=nothing.copy(),
        shape=["linear"] * n,
        cant_mm=today,
        cant_fixed=rng.random(n) < 0.01,
        cant_at_most_mm=np.where(rng.random(n) < 0.03, 110.0, np.nan),
        cant_at_least_mm=nothing.copy(),
        speed_kmh=line_speed,
        situations=[PLAIN] * n,
    )


def make_chain(n: int) -> CurveList:
    """Put the curves of a register into one chain: each shares its transition with the next."""
    curves = make_register(n)
    shared = np.maximum(curves.transition_out_m[:-1], curves.transition_in_m[1:])
    start = np.concatenate([[0.0], np.cumsum(curves.length_m[:-1] + shared)])
    return replace(
        curves,
        line=["L"] * n,
        start_km=np.round(start) / 1000.0,
        end_km=np.round(start + curves.length_m) / 1000.0,
    )


def peak_mib() -> float:
    """Largest memory of this process so far [MiB]."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / MEBI


def plan_timed(curves: CurveList, tiers: tuple[str, ...], rounds: int) -> tuple[float, float, Outcome]:
    """Plan some times; the shortest time by the clock and of the processor [s], and the last outcome."""
    traffic, limits = make_traffic(), load("typical")
    clock, processor = [], []
    for _ in range(rounds):
        begin, begin_processor = time.perf_counter(), time.process_time()
        outcome = plan_arrays(curves, traffic, limits, Settings(tiers=tiers))
        _ = outcome.status
        clock.append(time.perf_counter() - begin)
        processor.append(time.process_time() - begin_processor)
    return min(clock), min(processor), outcome


@contextmanager
def counted_steps(counts: dict[str, int]) -> Iterator[None]:
    """Count the curves that each step of the choice is given."""
    given = {
        "settle_within_normal": lambda chains, *_: sum(map(len, chains)),
        "make_nodes": lambda line, *_: len(line),
        "settle_unslowed": lambda chains, *_: sum(map(len, chains)),
        "search_chains": lambda chains, *_: sum(map(len, chains)),
    }
    place = {"make_nodes": 0}
    real = {name: getattr(choosing, name) for name in given}
    for name in given:

        def step(*args: Any, _name: str = name, **named: Any) -> Any:
            counts[_name] = counts.get(_name, 0) + given[_name](args[place.get(_name, 3)])
            return real[_name](*args, **named)

        setattr(choosing, name, step)
    try:
        yield
    finally:
        for name, function in real.items():
            setattr(choosing, name, function)


def main(sizes: tuple[int, ...]) -> None:
    """Print some lines a size."""
    for n in sizes:
        curves = make_register(n)
        before = peak_mib()
        for tiers in (("normal",), ("normal", "exceptional")):
            clock, processor, outcome = plan_timed(curves, tiers, 3 if n <= 10_000 else 2)
            memory = peak_mib() - before
            counts: dict[str, int] = {}
            with counted_steps(counts):
                plan_timed(curves, tiers, 1)
            plan = Plan(outcome)
            chained = len(np.union1d(outcome.pairs.first, outcome.pairs.second)) / n
            few = plan.assessed[: min(n, 2000)]
            begin = time.process_time()
            for _ in plan.records(few):
                pass
            each = (time.process_time() - begin) / len(few) * 1e6
            print(
                f"{n:7d} curves, tiers {'+'.join(tiers)}: arrays {clock:.3f} s, of the processor "
                f"{processor:.3f} s ({processor / n * 1e6:.1f} us a curve), {memory:.0f} MiB more"
            )
            shares = ", ".join(f"{name} {count / n:.2%}" for name, count in counts.items())
            print(f"        in chains {chained:.0%}; given to {shares}; records {each:.0f} us each")
            print(f"        {plan.counts()}")
    for n in CHAINS:
        clock, processor, _ = plan_timed(make_chain(n), ("normal",), 1)
        print(f"one chain of {n} curves: {clock:.2f} s, of the processor {processor:.2f} s")


if __name__ == "__main__":
    main(tuple(int(word) for word in sys.argv[1:]) or SIZES)
