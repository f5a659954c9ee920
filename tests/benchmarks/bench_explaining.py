"""What the words of a plan cost beside its numbers, in processor seconds.

Run by hand: ``python tests/benchmarks/bench_explaining.py [curves ...]``. The register is that of
:mod:`bench_planning` (8 classes, one curve in twelve too sharp). Told apart are the plan, the options, the
methods side by side, the notices, the records, the rest of the words, and writing it as JSON; compare ratios
of one run.
"""

from __future__ import annotations

import json
import sys
import time

from bench_planning import make_register, make_traffic

from cant.limit_sets import load
from cant.model.reading import Reading
from cant.model.settings import Settings
from cant.service import make_plan

BLOCK = 256


class Clock:
    """Processor time by name, each stretch from the end of the one before."""

    def __init__(self) -> None:
        self.spent: dict[str, float] = {}
        self._begin = time.process_time()

    def note(self, name: str) -> None:
        """Put down what was spent since the last note."""
        now = time.process_time()
        self.spent[name] = self.spent.get(name, 0.0) + now - self._begin
        self._begin = time.process_time()


def measure(n: int, tiers: tuple[str, ...]) -> dict[str, float]:
    """Plan a register and put it into words; seconds by stage."""
    reading = Reading("register", make_register(n), make_traffic(), load("typical"))
    clock = Clock()
    planned = make_plan(reading, settings=Settings(tiers=tiers))
    words, every = planned.explanation, planned.plan.assessed.tolist()
    clock.note("plan")
    words._options.prepare(every)
    clock.note("options")
    words._methods.prepare(every)
    clock.note("methods")
    words.listed()
    clock.note("notices")
    for first in range(0, n, BLOCK):
        block = every[first : first + BLOCK]
        records = list(planned.plan.records(block))
        clock.note("records")
        words.add_to(block, records)
        clock.note("words")
        for record in records:
            json.dumps(record)
        clock.note("json")
    return clock.spent


def main(sizes: list[int]) -> None:
    """Print a line a size and pair of tiers."""
    for n in sizes:
        for tiers in (("normal",), ("normal", "exceptional")):
            spent = measure(n, tiers)
            told = sum(spent[name] for name in ("options", "methods", "notices", "words"))
            parts = ", ".join(f"{name} {seconds:.2f}" for name, seconds in spent.items())
            print(
                f"{n:7d} curves, tiers {'+'.join(tiers)}: {parts} s; {1000 * told / n:.2f} ms a curve in "
                "words"
            )


if __name__ == "__main__":
    main([int(word) for word in sys.argv[1:]] or [1000, 10_000])
