"""The line as the reference planner sees it: what lies at each end of a curve, and who shares with whom.

Neighbours, shared transitions, overlaps, contradictions and gaps are settled here, before any cant.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from cant.model.curves import CurveList
from cant.model.traffic import Traffic
from reference.rows import LENGTH_NOISE, Curve, End, Shared, Train, read_curves
from reference.rulebook import Book, Limit, strictest


@dataclass
class Track:
    """Everything about the line that no cant changes.

    Attributes
    ----------
    curves : list of Curve
        In input order.
    order : list of list of int
        Per line and track the curves with a known start, by chainage.
    shared : list of Shared
        Transitions shared by two assessed curves.
    not_assessed : set of int
    """

    curves: list[Curve]
    order: list[list[int]]
    shared: list[Shared]
    not_assessed: set[int]

    def __post_init__(self) -> None:
        self._by_end = {(t.first, "out"): t for t in self.shared} | {(t.second, "in"): t for t in self.shared}

    def between(self, i: int, side: str) -> Shared | None:
        """Give the shared transition at one end of a curve."""
        return self._by_end.get((i, side))

    def chains(self) -> list[list[int]]:
        """Give the assessed curves in groups that share transitions, each by chainage."""
        follows = {t.first: t.second for t in self.shared}
        heads = [
            c.index
            for c in self.curves
            if c.index not in self.not_assessed and c.index not in follows.values()
        ]
        result = []
        for head in heads:
            chain = [head]
            while chain[-1] in follows:
                chain.append(follows[chain[-1]])
            result.append(chain)
        return result


def lay_out(curves: CurveList, traffic: Traffic, book: Book) -> Track:
    """Settle neighbours, ends, contradictions and gaps."""
    rows = read_curves(curves, traffic)
    order = _order(rows)
    out = {c.index for c in rows if c.rejected or (c.fixed and c.today is None)}
    for i, j in (pair for group in order for pair in pairwise(group)):
        distance = _distance(rows[i], rows[j])
        if distance is not None and distance < -0.5:
            out |= {i, j}
    shared = _set_ends(rows, order, out)
    out |= {c.index for c in rows if c.index not in out and _has_gap(c, rows, shared, book)}
    shared = _set_ends(rows, order, out)
    return Track(rows, order, shared, out)


def _order(rows: list[Curve]) -> list[list[int]]:
    groups: dict[tuple[str, str], list[int]] = {}
    for curve in rows:
        if curve.start is not None:
            groups.setdefault((curve.line, curve.track), []).append(curve.index)
    return [sorted(group, key=lambda i: (rows[i].start, i)) for group in groups.values()]


def _distance(first: Curve, second: Curve) -> float | None:
    """Give the distance from the first's end to the second's start [m]."""
    if first.end is None or second.start is None:
        return None
    return round((second.start - first.end) * 1000, LENGTH_NOISE)


def _set_ends(rows: list[Curve], order: list[list[int]], out: set[int]) -> list[Shared]:
    """Lay down what is at both ends of each curve; give the shared transitions."""
    for curve in rows:
        for side in ("in", "out"):
            curve.ends[side] = _lone_end(curve, side, None, 0.0)
    shared = []
    for i, j in (pair for group in order for pair in pairwise(group)):
        first, second = rows[i], rows[j]
        distance = _distance(first, second)
        if distance is None:
            continue
        one, two = first.transition["out"] or 0.0, second.transition["in"] or 0.0
        if -0.5 <= distance <= max(one, two) + 0.5:
            if i in out or j in out:
                first.ends["out"] = End("unknown", None, first.stated_ramp["out"])
                second.ends["in"] = End("unknown", None, second.stated_ramp["in"])
                continue
            length = distance if distance >= 0.5 else 0.0
            ramp = first.stated_ramp["out"] or second.stated_ramp["in"] or length or None
            shared.append(Shared(i, j, length, ramp, max(first.peak, second.peak)))
            first.ends["out"] = second.ends["in"] = End("shared", length, ramp)
        elif max(one, two) < distance < one + two:
            half = distance / 2
            first.ends["out"] = End("straight", half, first.stated_ramp["out"] or half)
            second.ends["in"] = End("straight", half, second.stated_ramp["in"] or half)
        elif distance > 0:
            first.ends["out"] = _lone_end(first, "out", distance, two)
            second.ends["in"] = _lone_end(second, "in", distance, one)
    return shared


def _lone_end(curve: Curve, side: str, distance: float | None, other: float) -> End:
    """Give an end that leads to a straight; ``other`` is the transition of the next curve on that side."""
    length, ramp = curve.transition[side], curve.stated_ramp[side]
    if length is None:
        return End("unknown", None, ramp)
    if length > 0:
        return End("straight", length, ramp or length)
    if ramp is None and distance is not None:
        ramp = min(distance - other, distance / 2)
    return End("straight", 0.0, ramp)


def _has_gap(curve: Curve, rows: list[Curve], shared: list[Shared], book: Book) -> bool:
    """Tell whether a limit that the curve needs has rows for it but none at its planned speeds or radius."""
    if cant_limit("cant", curve, book, None, False).gap:
        return True
    if (
        any(end.ramp for end in curve.ends.values())
        and cant_limit("cant gradient", curve, book, None, False).gap
    ):
        return True
    return any(
        train_limit(quantity, curve, train, train.speed, book, False).gap
        for train in curve.trains.values()
        for quantity in _needed(curve, train, rows, shared)
    )


def _needed(curve: Curve, train: Train, rows: list[Curve], shared: list[Shared]) -> list[str]:
    needed = ["cant deficiency", "felt acceleration"]
    if train.regular:
        needed.append("cant excess")
    for side, end in curve.ends.items():
        if end.kind == "shared":
            (here,) = [t for t in shared if (t.second if side == "in" else t.first) == curve.index]
            other = rows[here.first if side == "in" else here.second]
            if train.name not in other.trains:
                continue
        if end.ramp:
            needed.append("rate of change of cant")
        if end.length is not None and end.length > 0:
            needed.append("rate of change of cant deficiency")
        if end.length == 0:
            needed.append("abrupt change of cant deficiency")
    return needed


def train_limit(
    quantity: str, curve: Curve, train: Train, speed: float, book: Book, exceptional: bool
) -> Limit:
    """Give the limit of a class on a curve at a speed [km/h]."""
    return book.find(quantity, train.category, curve.situations, speed, curve.radius, exceptional)


def cant_limit(
    quantity: str, curve: Curve, book: Book, speeds: dict[str, float] | None, exceptional: bool
) -> Limit:
    """Give the limit of cant or gradient on a curve: the strictest of those of the classes that run there.

    ``speeds`` are the classes' speeds [km/h], None for the planned ones.
    """
    if not curve.trains:
        return book.find_without_class(quantity, curve.situations, curve.radius, exceptional)
    return strictest(
        [
            train_limit(
                quantity, curve, train, train.speed if speeds is None else speeds[name], book, exceptional
            )
            for name, train in curve.trains.items()
        ]
    )
