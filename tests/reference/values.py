"""What a cant and a speed give on a curve and its transitions, and which limits they pass.

An item is one quantity at one place: ``(("curve", i), "cant excess")``, ``(("in", i), "cant gradient")``,
``(("shared", i), "equal cants")`` for the transition after curve i. A passed item carries its overrun.
"""

from __future__ import annotations

from collections.abc import Iterator

from reference.line import Track, cant_limit, train_limit
from reference.rows import Curve, Shared, Train
from reference.rulebook import GRAVITY, TOLERANCE, Book, Limit, overrun, strictest

Place = tuple[str, int]
Item = tuple[Place, str]
Passed = dict[Item, float]
Speeds = dict[str, float]


class Values:
    """The rules over one track layout and one limit set."""

    def __init__(self, track: Track, book: Book) -> None:
        self.track, self.book = track, book

    def equilibrium(self, curve: Curve, speed: float) -> float:
        """Equilibrium cant [mm]."""
        return self.book.constant * speed**2 / curve.radius

    def felt(self, train: Train, unbalanced_cant: float) -> float:
        """Felt acceleration [m/s2] of so much deficiency (negative: excess) [mm]."""
        return (1 + (train.roll or 0.0)) * GRAVITY * unbalanced_cant / self.book.spacing

    # -- one class on one curve, its transitions to straights included -------------------------------------

    def mendable(
        self, curve: Curve, train: Train, speed: float, cant: float, exceptional: bool
    ) -> Iterator[tuple[Item, float, Limit]]:
        """Give every value that a lower speed mends, with its limit at that speed."""

        def limit(quantity: str) -> Limit:
            return train_limit(quantity, curve, train, speed, self.book, exceptional)

        here = ("curve", curve.index)
        equilibrium = self.equilibrium(curve, speed)
        yield (here, "cant deficiency"), equilibrium - cant, limit("cant deficiency")
        if train.roll is not None:
            yield (
                (here, "felt acceleration"),
                self.felt(train, equilibrium - cant),
                limit("felt acceleration"),
            )
        for side, end in curve.ends.items():
            place = (side, curve.index)
            if end.kind == "shared":
                continue
            if end.ramp:
                rate = curve.peak * abs(cant) * speed / (3.6 * end.ramp)
                yield (place, "rate of change of cant"), rate, limit("rate of change of cant")
            if end.length == 0:
                quantity = "abrupt change of cant deficiency"
                yield (place, quantity), equilibrium, limit(quantity)
            elif end.length is not None:
                quantity = "rate of change of cant deficiency"
                rate = curve.peak * max(0.0, equilibrium - cant) * speed / (3.6 * end.length)
                yield (place, quantity), rate, limit(quantity)

    def excesses(
        self, curve: Curve, train: Train, speed: float, cant: float, exceptional: bool
    ) -> Iterator[tuple[Item, float, Limit]]:
        """Give what a regular class has towards the inside, which no lower speed mends."""
        if not train.regular:
            return
        here = ("curve", curve.index)
        excess = cant - self.equilibrium(curve, speed)
        for quantity, value in (("cant excess", excess), ("felt acceleration", self.felt(train, excess))):
            if quantity == "felt acceleration" and train.roll is None:
                continue
            yield (
                (here, quantity),
                value,
                train_limit(quantity, curve, train, speed, self.book, exceptional),
            )

    def standing(
        self, curve: Curve, cant: float, speeds: Speeds | None, exceptional: bool
    ) -> Iterator[tuple[Item, float, Limit]]:
        """Give cant and gradients to straights, which no lower speed mends."""
        here = ("curve", curve.index)
        yield (here, "cant"), cant, cant_limit("cant", curve, self.book, speeds, exceptional)
        gradient = cant_limit("cant gradient", curve, self.book, speeds, exceptional)
        for side, end in curve.ends.items():
            if end.kind != "shared" and end.ramp:
                yield ((side, curve.index), "cant gradient"), curve.peak * abs(cant) / end.ramp, gradient

    def site(self, curve: Curve, cant: float) -> Passed:
        """Give the bounds of the site that a cant passes."""
        here, passed = ("curve", curve.index), {}
        if curve.at_most is not None and cant > curve.at_most + TOLERANCE:
            passed[here, "cant at most"] = overrun(cant, curve.at_most)
        if curve.at_least is not None and cant < curve.at_least - TOLERANCE:
            passed[here, "cant at least"] = overrun(-cant, -curve.at_least)
        return passed

    # -- shared transitions ----------------------------------------------------------------------------------

    def pair(self, shared: Shared) -> tuple[Curve, Curve]:
        """Give the two curves of a shared transition."""
        return self.track.curves[shared.first], self.track.curves[shared.second]

    def shared_mendable(
        self, shared: Shared, name: str, speed: float, cants: tuple[float, float], exceptional: bool
    ) -> Iterator[tuple[Item, float, Limit]]:
        """Give what a class has over a shared transition at a speed."""
        one, two = self.pair(shared)

        def limit(quantity: str) -> Limit:
            return strictest(
                [
                    train_limit(quantity, curve, curve.trains[name], speed, self.book, exceptional)
                    for curve in (one, two)
                ]
            )

        place = ("shared", shared.first)
        eq1, eq2 = self.equilibrium(one, speed), self.equilibrium(two, speed)
        if shared.ramp:
            change = abs(one.hand * cants[0] - two.hand * cants[1])
            rate = shared.peak * change * speed / (3.6 * shared.ramp)
            yield (place, "rate of change of cant"), rate, limit("rate of change of cant")
        if shared.length == 0:
            quantity = "abrupt change of cant deficiency"
            yield (place, quantity), abs(one.hand * eq1 - two.hand * eq2), limit(quantity)
        else:
            quantity = "rate of change of cant deficiency"
            deficiency1 = one.hand * max(0.0, eq1 - cants[0])
            deficiency2 = two.hand * max(0.0, eq2 - cants[1])
            rate = shared.peak * abs(deficiency1 - deficiency2) * speed / (3.6 * shared.length)
            yield (place, quantity), rate, limit(quantity)

    def shared_standing(
        self,
        shared: Shared,
        cants: tuple[float, float],
        speeds: tuple[Speeds, Speeds] | None,
        exceptional: bool,
    ) -> Iterator[tuple[Item, float, Limit]]:
        """Give the gradient of a shared transition, or the difference of two cants that must be equal."""
        one, two = self.pair(shared)
        place = ("shared", shared.first)
        change = abs(one.hand * cants[0] - two.hand * cants[1])
        if not shared.ramp:
            yield (place, "equal cants"), change, Limit(0.0, TOLERANCE)
            return
        limits = [
            cant_limit("cant gradient", curve, self.book, None if speeds is None else speeds[k], exceptional)
            for k, curve in enumerate((one, two))
        ]
        yield (place, "cant gradient"), shared.peak * change / shared.ramp, strictest(limits)

    # -- limits passed ---------------------------------------------------------------------------------------

    def own_unmendable(self, curve: Curve, cant: float, exceptional: bool) -> Passed:
        """Give the limits that no lower speed can mend and a cant passes, on a curve alone."""
        passed = self.site(curve, cant)
        _collect(passed, self.standing(curve, cant, None, exceptional))
        for train in curve.trains.values():
            _collect(passed, self.excesses(curve, train, train.speed, cant, exceptional))
        return passed

    def shared_unmendable(self, shared: Shared, cants: tuple[float, float], exceptional: bool) -> Passed:
        """Give the same over a shared transition."""
        passed: Passed = {}
        _collect(passed, self.shared_standing(shared, cants, None, exceptional))
        return passed

    def own_at(self, curve: Curve, cant: float, speeds: Speeds, exceptional: bool) -> Passed:
        """Give all limits passed on a curve and its transitions to straights at some speeds [km/h]."""
        passed = self.site(curve, cant)
        _collect(passed, self.standing(curve, cant, speeds, exceptional))
        for name, train in curve.trains.items():
            _collect(passed, self.mendable(curve, train, speeds[name], cant, exceptional))
            _collect(passed, self.excesses(curve, train, speeds[name], cant, exceptional))
        return passed

    def shared_at(
        self, shared: Shared, cants: tuple[float, float], speeds: tuple[Speeds, Speeds], exceptional: bool
    ) -> Passed:
        """Give all limits passed on a shared transition, each class at the lower of its two speeds."""
        passed: Passed = {}
        _collect(passed, self.shared_standing(shared, cants, speeds, exceptional))
        for name in speeds[0]:
            if name in speeds[1]:
                lower = min(speeds[0][name], speeds[1][name])
                _collect(passed, self.shared_mendable(shared, name, lower, cants, exceptional))
        return passed


def _collect(passed: Passed, values: Iterator[tuple[Item, float, Limit]]) -> None:
    """Keep the largest overrun of each item that is passed."""
    for item, value, limit in values:
        if not limit.kept_by(value):
            over = overrun(value, limit.value)
            passed[item] = max(over, passed.get(item, over))
