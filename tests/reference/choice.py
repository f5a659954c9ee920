"""Which cants are best along a chain: every combination is looked at, one criterion after another.

Two sums that are equal but for floating point are equal here: each criterion keeps all combinations within a
hair of the best, the next one chooses among them.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from itertools import product
from typing import TypeVar

from reference.rows import Curve, Shared
from reference.rulebook import TOLERANCE
from reference.speeds import SpeedSearch
from reference.values import Item, Passed, Speeds

HIGHEST_CANT = 300.0
DEFAULT_STEP = 5.0
NO_SPEED = 1e-9
HAIR = 1e-9

Cants = dict[int, float]
Combination = tuple[float, ...]
T = TypeVar("T")


def least(candidates: list[T], measure: Callable[[T], float]) -> list[T]:
    """Give all candidates within a hair of the least by one measure, in their order."""
    if len(candidates) < 2:
        return candidates
    measured = [(measure(candidate), candidate) for candidate in candidates]
    best = min(value for value, _ in measured)
    return [candidate for value, candidate in measured if value <= best + HAIR * max(1.0, abs(best))]


def rms_speed(curve: Curve, speeds: Speeds) -> float | None:
    """Root-mean-square speed [km/h] by tonnage of what runs at more than 0 km/h; None where nothing does."""
    running = [train for name, train in curve.trains.items() if speeds[name] > 0]
    if not running:
        return None
    if any(train.trains is None for train in running):
        weights = [1.0 for _ in running]
    elif any(train.mass is None for train in running):
        weights = [train.trains or 0.0 for train in running]
    else:
        weights = [(train.trains or 0.0) * (train.mass or 0.0) for train in running]
    if sum(weights) == 0:
        weights = [1.0 for _ in running]
    squares = sum(w * speeds[train.name] ** 2 for w, train in zip(weights, running, strict=True))
    return math.sqrt(squares / sum(weights))


class Chooser:
    """The choice for one chain at a time, in the last tier allowed."""

    def __init__(self, search: SpeedSearch, exceptional: bool, keep_within: float) -> None:
        self.search, self.values, self.track = search, search.values, search.values.track
        self.exceptional, self.keep_within = exceptional, keep_within

    # -- the cants to choose from ----------------------------------------------------------------------

    def grid(self, curve: Curve) -> list[float]:
        """Give the cants on the grid of a curve [mm], or the one that is fixed."""
        if curve.fixed:
            assert curve.today is not None
            return [curve.today]
        classes = [(train.category, train.speed) for train in curve.trains.values()]

        def stated(quantity: str) -> list[float]:
            found = self.values.book.values(quantity, classes, curve.situations, curve.radius)
            return [value for value in found if not math.isinf(value)]

        step = min(stated("cant step"), default=DEFAULT_STEP)
        minimum = max(stated("minimum cant"), default=0.0)
        multiples = [k * step for k in range(int((HIGHEST_CANT + TOLERANCE) / step) + 1)]
        return [cant for cant in multiples if cant == 0 or cant >= minimum - TOLERANCE]

    def candidates(self, curve: Curve) -> tuple[list[float], bool]:
        """Give the cants that keep what no speed can mend, and False; or the least bad one, and True."""
        grid = self.grid(curve)
        passed = {cant: self.values.own_unmendable(curve, cant, self.exceptional) for cant in grid}
        kept = [cant for cant in grid if not passed[cant]]
        if kept:
            return kept, False
        here = ("curve", curve.index)
        at_most, at_least = (here, "cant at most"), (here, "cant at least")

        def others(cant: float) -> float:
            return sum(over for item, over in passed[cant].items() if item not in (at_most, at_least))

        grid = least(grid, lambda cant: passed[cant].get(at_most, 0.0))
        grid = least(grid, lambda cant: passed[cant].get(at_least, 0.0))
        grid = least(grid, others)
        return [min(grid)], True

    # -- what a combination gives ----------------------------------------------------------------------

    def transitions(self, chain: list[int]) -> list[Shared]:
        """Give the shared transitions of a chain, in order."""
        return [t for i in chain[:-1] if (t := self.track.between(i, "out")) is not None]

    def broken(self, chain: list[int], cants: Cants) -> Passed:
        """Give the shared transitions on which a limit that no speed can mend is passed."""
        passed: Passed = {}
        for shared in self.transitions(chain):
            pair = (cants[shared.first], cants[shared.second])
            passed |= self.search.remember(
                ("broken", shared.first, pair),
                lambda shared=shared, pair=pair: self.values.shared_unmendable(
                    shared, pair, self.exceptional
                ),
            )
        return passed

    def run_speeds(self, chain: list[int], cants: Cants) -> dict[int, Speeds]:
        """Give the run speeds of every class on every curve of a chain."""
        return {i: self._run_speeds(i, cants) for i in chain}

    def _run_speeds(self, i: int, cants: Cants) -> Speeds:
        before, after = self.track.between(i, "in"), self.track.between(i, "out")
        key = (
            "run",
            i,
            cants[before.first] if before else None,
            cants[i],
            cants[after.second] if after else None,
        )
        return self.search.remember(
            key, lambda: self.search.run_speeds(self.track.curves[i], cants, self.exceptional)
        )

    def time_lost(self, chain: list[int], cants: Cants) -> tuple[float, float]:
        """Give sum n x length x (1/V_run - 1/V_planned) as two numbers.

        The first is the sum of n x length over classes that come to a stand, which counts 1e9 times; apart,
        because 1e9 would drown the second in floating point.
        """
        standing, rest = 0.0, 0.0
        for i, speeds in self.run_speeds(chain, cants).items():
            curve = self.track.curves[i]
            for name, train in curve.trains.items():
                if train.speed == 0 or speeds[name] == train.speed:
                    continue
                weight = 1.0 if train.trains is None else (train.trains or 0.001)
                weight *= curve.length
                if speeds[name] == 0:
                    standing += weight
                    rest -= weight / train.speed
                else:
                    rest += weight * (1 / speeds[name] - 1 / train.speed)
        return standing, rest

    def passed(self, chain: list[int], cants: Cants, exceptional: bool) -> Passed:
        """Give the limits of a tier passed at the run speeds."""
        speeds = self.run_speeds(chain, cants)
        found: Passed = {}
        for i in chain:
            key = ("own at", i, cants[i], tuple(speeds[i].values()), exceptional)
            found |= self.search.remember(
                key,
                lambda i=i: self.values.own_at(self.track.curves[i], cants[i], speeds[i], exceptional),
            )
        for t in self.transitions(chain):
            pair, both = (cants[t.first], cants[t.second]), (speeds[t.first], speeds[t.second])
            key2 = ("shared at", t.first, pair, *(tuple(s.values()) for s in both), exceptional)
            found |= self.search.remember(
                key2,
                lambda t=t, pair=pair, both=both: self.values.shared_at(t, pair, both, exceptional),
            )
        return found

    def misfit(self, chain: list[int], cants: Cants) -> float:
        """Give sum of length x (cant - target)^2, the target taken at the run speeds."""
        total = 0.0
        for i, speeds in self.run_speeds(chain, cants).items():
            curve = self.track.curves[i]
            target = self.values.equilibrium(curve, rms_speed(curve, speeds) or 0.0)
            total += curve.length * (cants[i] - target) ** 2
        return total

    # -- the best --------------------------------------------------------------------------------------

    def best(self, chain: list[int]) -> tuple[Cants, set[int]]:
        """Give the best cants of a chain before ``Keep within``, and its curves that are not compliant."""
        choices = {i: self.candidates(self.track.curves[i]) for i in chain}
        not_compliant = {i for i, (_, hopeless) in choices.items() if hopeless}

        def named(combination: Combination) -> Cants:
            return dict(zip(chain, combination, strict=True))

        left: list[Combination] = list(product(*(choices[i][0] for i in chain)))
        left = self._least_broken(chain, left)
        left = least(left, lambda c: self.time_lost(chain, named(c))[0])
        left = least(left, lambda c: self.time_lost(chain, named(c))[1])
        left = least(left, lambda c: len(self.passed(chain, named(c), False)))
        left = least(left, lambda c: sum(self.passed(chain, named(c), False).values()))
        left = least(left, lambda c: self.misfit(chain, named(c)))
        left = least(left, sum)
        cants = named(min(left))
        not_compliant |= self._clashing(chain, cants)
        return cants, not_compliant

    def _least_broken(self, chain: list[int], combinations: list[Combination]) -> list[Combination]:
        """Keep the combinations that break the fewest shared transitions, with the smallest overrun."""
        broken = {c: self.broken(chain, dict(zip(chain, c, strict=True))) for c in combinations}
        left = least(combinations, lambda c: len({place for place, _ in broken[c]}))
        return least(left, lambda c: sum(broken[c].values()))

    def _clashing(self, chain: list[int], cants: Cants) -> set[int]:
        """Give the bound curves at broken transitions (both curves where neither is bound)."""
        clashing: set[int] = set()
        broken = {place[1] for place, _ in self.broken(chain, cants)}
        for shared in self.transitions(chain):
            if shared.first in broken:
                pair = {shared.first, shared.second}
                clashing |= {i for i in pair if self.track.curves[i].bound} or pair
        return clashing

    # -- Keep within -----------------------------------------------------------------------------------

    def keep(self, chain: list[int], best: Cants) -> Cants:
        """Let today's cants take the place of the best where they lie close and do no harm."""
        within = [
            i
            for i in chain
            if (today := self.track.curves[i].today) is not None
            and abs(today - best[i]) <= self.keep_within + HAIR
            and today != best[i]
        ]
        together = self._kept(chain, best, within)
        if together is not None:
            return together
        cants = best
        for i in within:
            cants = self._kept(chain, cants, [i]) or cants
        return cants

    def _kept(self, chain: list[int], before: Cants, kept: list[int]) -> Cants | None:
        """Give the cants with today's on some curves, None where they do harm."""
        after = dict(before)
        for i in kept:
            today = self.track.curves[i].today
            assert today is not None
            after[i] = today
        broken = self._broken_in_tier(chain, after)
        touched = {place for i in kept for place in self._places(i)}
        if any(place in touched for place, _ in broken) or not broken <= self._broken_in_tier(chain, before):
            return None
        if not self.passed(chain, after, False).keys() <= self.passed(chain, before, False).keys():
            return None
        for now, then in zip(self.time_lost(chain, after), self.time_lost(chain, before), strict=True):
            if now > then + HAIR * max(1.0, abs(then)):
                return None
            if now < then - HAIR * max(1.0, abs(then)):
                break
        return after

    def _broken_in_tier(self, chain: list[int], cants: Cants) -> set[Item]:
        """Give every limit of the tier that is broken: unmendable ones as planned, all at the run speeds."""
        items = set(self.broken(chain, cants)) | set(self.passed(chain, cants, self.exceptional))
        for i in chain:
            items |= set(self.values.own_unmendable(self.track.curves[i], cants[i], self.exceptional))
        return items

    def _places(self, i: int) -> set[tuple[str, int]]:
        places = {("curve", i), ("in", i), ("out", i)}
        for side in ("in", "out"):
            shared = self.track.between(i, side)
            if shared is not None:
                places.add(("shared", shared.first))
        return places
