"""Permissible and lowest speeds with the cants as set, by trying every multiple of the speed step."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TypeVar

from reference.line import train_limit
from reference.rows import Curve, Shared, Train
from reference.values import Speeds, Values

FASTEST = 400.0
DEFAULT_SPEED_STEP = 5.0
SAME = 1e-9

T = TypeVar("T")


class SpeedSearch:
    """The search, with its answers remembered: nothing here depends on more than the cants it is given."""

    def __init__(self, values: Values) -> None:
        self.values = values
        self.known: dict[object, object] = {}

    def remember(self, key: object, work: Callable[[], T]) -> T:
        """Work something out once."""
        if key not in self.known:
            self.known[key] = work()
        return self.known[key]

    def step(self, curve: Curve, train: Train) -> float:
        """Give the speed step of a class on a curve [km/h]."""
        steps = self.values.book.values(
            "speed step", [(train.category, train.speed)], curve.situations, curve.radius
        )
        steps = [step for step in steps if not math.isinf(step)]
        return min(steps) if steps else DEFAULT_SPEED_STEP

    def _search(self, curve: Curve, train: Train, holds: Callable[[float], bool]) -> tuple[float, bool]:
        """Give the highest multiple up to which something holds, and whether the planned speed does."""
        step = self.step(curve, train)
        best, k = 0.0, 1
        while k * step <= FASTEST + 1e-6 and holds(k * step):
            best = k * step
            k += 1
        return best, holds(train.speed)

    def _own_holds(self, curve: Curve, train: Train, speed: float, cant: float, exceptional: bool) -> bool:
        for _, value, limit in self.values.mendable(curve, train, speed, cant, exceptional):
            if limit.gap and speed > train.speed + SAME:
                return False
            if not limit.kept_by(value):
                return False
        return True

    def _own_search(self, curve: Curve, train: Train, cant: float, exceptional: bool) -> tuple[float, bool]:
        return self.remember(
            ("own", curve.index, train.name, cant, exceptional),
            lambda: self._search(curve, train, lambda v: self._own_holds(curve, train, v, cant, exceptional)),
        )

    def own(self, curve: Curve, train: Train, cant: float, exceptional: bool) -> float:
        """Give the permissible speed of a class by a curve and its transitions to straights alone."""
        return _permitted(train, [self._own_search(curve, train, cant, exceptional)])

    def binds_first(self, shared: Shared, name: str, cants: tuple[float, float], exceptional: bool) -> bool:
        """Tell whether a shared transition binds a class on its first curve (else on its second)."""
        one, two = self.values.pair(shared)
        first = min(self.own(one, one.trains[name], cants[0], exceptional), one.trains[name].speed)
        second = min(self.own(two, two.trains[name], cants[1], exceptional), two.trains[name].speed)
        if abs(first - second) > SAME:
            return first < second
        return one.length <= two.length

    def _shared_holds(
        self, shared: Shared, at: int, name: str, speed: float, cants: tuple[float, float], exceptional: bool
    ) -> bool:
        """Try a speed on curve 0 or 1 of a transition, the other curve at its own speed."""
        curves = self.values.pair(shared)
        here, other = curves[at], curves[1 - at]
        there = other.trains[name]
        other_speed = min(self.own(other, there, cants[1 - at], exceptional), there.speed)
        lower = min(speed, other_speed)
        for _, value, limit in self.values.shared_mendable(shared, name, lower, cants, exceptional):
            if limit.gap and speed > here.trains[name].speed + SAME:
                return False
            if not limit.kept_by(value):
                return False
        return True

    def _shared_search(
        self, shared: Shared, at: int, train: Train, cants: tuple[float, float], exceptional: bool
    ) -> tuple[float, bool]:
        return self.remember(
            ("shared", shared.first, at, train.name, cants, exceptional),
            lambda: self._search(
                self.values.pair(shared)[at],
                train,
                lambda v: self._shared_holds(shared, at, train.name, v, cants, exceptional),
            ),
        )

    def permissible(self, curve: Curve, train: Train, cants: dict[int, float], exceptional: bool) -> float:
        """Give the permissible speed of a class on a curve [km/h], with the cants of it and its neighbours.

        "At which, and at every lower multiple, all limits hold" is the least of what the curve alone and each
        transition that binds here allow; a planned speed has to hold by all of them.
        """
        searches = [self._own_search(curve, train, cants[curve.index], exceptional)]
        for at, side in ((1, "in"), (0, "out")):
            shared = self.values.track.between(curve.index, side)
            if shared is None or train.name not in self.values.pair(shared)[1 - at].trains:
                continue
            pair = (cants[shared.first], cants[shared.second])
            if self.binds_first(shared, train.name, pair, exceptional) == (at == 0):
                searches.append(self._shared_search(shared, at, train, pair, exceptional))
        return _permitted(train, searches)

    def run_speeds(self, curve: Curve, cants: dict[int, float], exceptional: bool) -> Speeds:
        """Give the run speed of each class: the lower of planned and permissible [km/h]."""
        return {
            name: min(train.speed, self.permissible(curve, train, cants, exceptional))
            for name, train in curve.trains.items()
        }

    def lowest(self, curve: Curve, train: Train, cant: float, exceptional: bool) -> float:
        """Give the speed below which cant excess goes over its limit [km/h], 0 where it never does.

        The limit is asked at every speed, so that each band of speeds is looked at by itself: within a band
        the excess is over the limit below one speed.
        """
        edges = sorted(
            {0.0}
            | {
                edge
                for row in self.values.book.rows
                if row.quantity == "cant excess"
                for edge in (row.speed_over_kmh, row.speed_up_to_kmh)
                if edge is not None
            }
        )
        lowest = 0.0
        for low, high in zip(edges, [*edges[1:], math.inf], strict=True):
            inside = low + 1 if math.isinf(high) else (low + high) / 2
            limit = train_limit("cant excess", curve, train, inside, self.values.book, exceptional)
            if limit.kept_by(cant - self.values.equilibrium(curve, low)):
                continue
            root = math.sqrt((cant - limit.value) * curve.radius / self.values.book.constant)
            lowest = max(lowest, min(high, root))
        return lowest


def _permitted(train: Train, searches: list[tuple[float, bool]]) -> float:
    """Give the least of some searches, or the planned speed where that holds by all and is above it."""
    highest = min(multiple for multiple, _ in searches)
    return max(highest, train.speed) if all(planned for _, planned in searches) else highest
