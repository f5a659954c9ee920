"""The sheet "Ramp values": cant today and to set along the ramps of changed curves, for the tamper."""

from __future__ import annotations

import numpy as np

from cant.model.display import Display
from cant.planning import Plan
from cant.planning.neighbours import AFTER, BEFORE
from cant.quantities.lifting import ramp_ordinates, stations
from cant.writing.columns import SAME_MM, lifted_rail
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets

_HEADS = (
    ("Line", 16.0, ""),
    ("Track", 7.0, ""),
    ("Curve", 9.0, ""),
    ("End", 6.0, ""),
    ("Station", 11.0, "chainage"),
    ("Cant today", 10.0, "cant exact"),
    ("Cant to set", 10.0, "cant exact"),
    ("Lift", 9.0, "cant exact"),
    ("Rail to lift", 12.0, ""),
)


class RampValues:
    """Cant along the ramps of changed curves, at round chainages.

    Parameters
    ----------
    book : NewSheets
    name : str
    display : Display
    plan : Plan
    """

    def __init__(self, book: NewSheets, name: str, display: Display, plan: Plan, rule: str) -> None:
        self._plan = plan
        self._display = display
        self._sheet = book.table(name)
        self._spacing = 10.0 if display.units == "metric" else 31.0 / 3.280839895
        step = "10 m" if display.units == "metric" else "31 ft"
        self._sheet.paragraph(
            f"Cant along the cant ramps of changed curves, every {step} (half of that on ramps below six "
            "steps) and "
            "at both ends, with the shape of the transition. Cant is that of the curve named: positive "
            "with its "
            "outer rail high, negative in the other curve of a reverse. Ramps whose length or chainage is "
            "not "
            f"known are left out. {rule}",
            9,
            105,
        )
        heads = []
        for title, width, kind in _HEADS:
            shown = display[kind] if kind else None
            unit = f" ({shown.unit})" if shown else ""
            heads.append(Heading(title + unit, width, shown.number_format if shown else None))
        self._sheet.header(heads, keep=3)

    def write(self, curves: list[int]) -> None:
        """Write the ramps of some curves, those whose cant changes."""
        outcome = self._plan.outcome
        after = {int(i): m for m, i in enumerate(outcome.pairs.first)}
        before = {int(i): m for m, i in enumerate(outcome.pairs.second)}
        for i in curves:
            self._end(i, BEFORE, None if i not in before else -1)
            self._end(i, AFTER, after.get(i))

    def _changes(self, i: int) -> bool:
        with np.errstate(invalid="ignore"):
            return bool(abs(self._plan.outcome.cant_mm[i] - self._plan.curves.cant_mm[i]) > SAME_MM)

    def _end(self, i: int, end: int, pair: int | None) -> None:
        """Write one ramp; a shared one stands at the curve of the smaller chainage (-1: left to that)."""
        outcome, curves = self._plan.outcome, self._plan.curves
        if pair == -1:
            return
        other = None if pair is None else int(outcome.pairs.second[pair])
        if not (self._changes(i) or (other is not None and self._changes(other))):
            return
        ramp = float(outcome.neighbourhood.ramp_m[end][i] if pair is None else outcome.pairs.ramp_m[pair])
        low, high = sorted((float(curves.start_km[i]), float(curves.end_km[i])))
        if not ramp > 0 or not np.isfinite(low + high):
            return
        at = 1000.0 * (low if end == BEFORE else high)
        out = at - ramp if end == BEFORE else at + ramp
        sign = 0.0 if other is None else float(curves.hand[other]) * float(curves.hand[i])
        cants = []
        for values in (curves.cant_mm, outcome.cant_mm):
            far = sign * float(values[other]) if other is not None else 0.0
            cants.append((far, float(values[i])))
        self._stations(i, end, (out, at), cants)

    def _stations(
        self, i: int, end: int, ramp: tuple[float, float], cants: list[tuple[float, float]]
    ) -> None:
        curves = self._plan.curves
        spacing = self._spacing if abs(ramp[1] - ramp[0]) >= 6 * self._spacing else self._spacing / 2
        points = stations(ramp[0], ramp[1], spacing)
        today, new = (
            ramp_ordinates(points, ramp[0], ramp[1], far, near, curves.shape[i]) for far, near in cants
        )
        turned = bool(self._plan.outcome.neighbourhood.descending[i])
        side = "in" if (end == BEFORE) != turned else "out"
        chainage, cant = self._display["chainage"], self._display["cant exact"]
        hand = {1: "L", -1: "R"}.get(int(curves.hand[i]))
        for point, old, set_to in sorted(zip(points.tolist(), today.tolist(), new.tolist(), strict=True)):
            lift = set_to - old
            rail = "" if not np.isfinite(lift) or abs(lift) < 0.05 else lifted_rail(lift, hand)
            self._sheet.row(
                [
                    curves.line[i],
                    curves.track[i],
                    curves.curve[i],
                    side,
                    chainage.value(point / 1000.0),
                    cant.value(old) if np.isfinite(old) else None,
                    cant.value(set_to),
                    cant.value(abs(lift)) if np.isfinite(lift) else None,
                    rail,
                ]
            )
