"""A planner for the tests: the planning rules, literally, in plain scalars, trying every combination.

It shares no code with the planner of the package and knows only the records of ``cant.model``. It restates
these rules and follows their text.

Cants lie on the grid 0, step, 2 step ... up to 300 mm (step 5 mm unless the limits say); values between 0 and
``minimum cant`` are left out; ``Cant fixed`` leaves the one value of today.

Bounds of one curve at planned speeds. Lower: equilibrium cant - deficiency limit of each class; ``Cant at
least``; felt acceleration; rate of change of deficiency I V / (3.6 L) over each known transition of L > 0 to
a straight. Upper: ``cant``; ``Cant at most``; equilibrium cant + excess limit of each regular class; inward
felt acceleration of each regular class; gradient x ramp length; rate of change of cant D V / (3.6 ramp).
Excess counts as deficiency 0 in a rate. Shapes multiply gradient and rates by their peak factor, a shared
transition by the larger one. L = 0 at a straight: the jump is the equilibrium cant itself; the ramp lies on
the straight, as stated, else, where a next curve on that side is known, over the distance to that curve's
transition, at most half the distance to its arc. A blank transition with a stated ramp is checked over the
ramp.

Shared: consecutive curves of one line and track at a distance from -0.5 m to the larger of the two
transitions + 0.5 m; the distance is the length (below 0.5 m: 0). Above the larger and below the sum: overlap,
half the distance each. Below -0.5 m: both not assessed. Ramp: the first's, else the second's, else the
length. A class runs it at the lower of its two speeds; a class on one curve alone is not checked. Signed
change of cant and of deficiency. Length 0 without ramp: equal signed cants; at length 0 the jump of
equilibrium cants is limited. The stricter of the limits of the two curves. A rejected or not assessed
neighbour: as if the transition were not known.

Best: of the cants that keep, in the last tier allowed, what no lower speed can mend (cant, site values,
excess and inward felt acceleration at planned speeds, gradient, equal cants): least running time lost; fewest
limits passed at normal values at the run speeds, each quantity once per curve or transition; least sum of
their largest value / limit - 1 (limit of 0 or less: 1000 + amount); least sum of length x (cant - target)^2,
target of the run speeds; smaller sum; lower cant at the smaller chainage. A curve's tier is normal where it
and its transitions pass no normal limit.

``Keep within``; curves that are not compliant; permissible speeds (multiples of the step up to 400 km/h, at
each of which and all lower ones the mendable limits hold; a planned speed that holds is permissible; a gap
ends the search above the planned speed; a shared transition binds the curve where the class is slower by its
own limits and plan, else the shorter, else the first, at the lower of the trial speed and that speed on the
other curve); statuses.

Where the rules leave a choice, this is what is done here:

 1. Unknown transitions count as 0 in "the larger of the two": arcs that touch share a transition of length 0.
 2. A stated cant ramp of 0 is "none", the same as not stated.
 3. A contradiction counts also against a rejected row with known chainages.
 4. Length 0 with a stated ramp: gradient and rate over the ramp, no equal cants; the jump is limited all the
    same.
 5. Overlap: a stated ramp keeps its length; the halves lead to a straight of no length.
 6. Room for a ramp on the straight: a neighbour whose transition is not known counts as having none; rejected
    neighbours with known chainages count; the curve's own shape factor multiplies.
 7. Gap of ``cant`` and ``cant gradient``: class by class; a class without matching rows by category is not
    limited. Where no class runs, only rows without category and speed count.
 8. No gap of excess for an occasional class; deficiency and felt acceleration are always needed.
 9. Gaps are found once, with all curves that were not rejected or contradictory; neighbours of curves with
    gaps are then planned as if the transition were not known, without looking for gaps anew.
10. Gradient limits on a shared transition: all classes on either curve. Rates and jump: asked at the lower
    speed, with situation and radius of each curve.
11. In the search a gap ends it when the trial speed is above the class's planned speed on the curve searched,
    although a shared transition may be asked at a lower speed.
12. "Slower by these limits": own limits and transitions to straights only, shared ones left out.
13. Limits of cant and gradient "at the run speeds": rows asked at the run speeds. A gap below the plan: no
    limit.
14. Where nothing runs faster than 0 km/h the target is 0.
15. ``rms_speed_kmh`` is that of the planned speeds.
16. Lowest speed: last tier allowed, the limit asked at each speed (bands), for occasional classes too.
17. Not compliant also where no cant keeps the limits although nothing fixes or binds it. Both curves at a
    broken transition where neither is bound.
18. Not compliant is decided before ``Keep within`` and stays.
19. ``Keep within``: "no limit of the tier broken" looks at the curves whose cant is replaced and their
    transitions, unmendable limits at planned speeds and all at run speeds; elsewhere nothing may break that
    was not broken. "Before" is the state before each replacement; a replacement loses no more time than that
    state.
20. today: planned speeds, normal then exceptional values whatever ``Tiers`` says, site values included; with
    a neighbour's cant unknown only the jump of a shared transition is checked. ``not known`` without today's
    cant and for curves that are not assessed.
21. ``shares_transition_with_next`` only where both curves are assessed.
22. "kept": within 0.001 mm of today's cant.
23. Standing trains (0 km/h) have deficiency and excess checked at 0 km/h; their rates are 0.
24. Bands: speeds and radii within 1e-6 of a band's edge are on it (mph conversions).
25. Equal cants and gradients are limits like others: a free curve at a transition that a bound neighbour
    breaks is over a limit, that is ``exceptional``, whatever the tier.
26. Overrun of ``at most`` and the rest counts only where the limit is passed by more than its 0.001.
"""

from __future__ import annotations

import math
from typing import Any

from cant.model.curves import CurveList
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from reference.choice import Cants, Chooser, rms_speed
from reference.line import cant_limit, lay_out, train_limit
from reference.rows import Curve, Train
from reference.rulebook import GRAVITY, Book, Limit
from reference.speeds import SpeedSearch
from reference.values import Passed, Speeds, Values

SAME_CANT = 0.001
Bound = tuple[float, str, str | None, str | None]
"""Cant [mm], quantity, clause, class."""


def plan(curves: CurveList, traffic: Traffic, limits: LimitSet, settings: Settings) -> list[dict[str, Any]]:
    """Plan a small line.

    Returns
    -------
    list of dict
        One for each row of the list, in input order, with the keys of a plan's JSON that are numbers or
        statuses, ``lower_ties`` and ``upper_ties`` (every limit that gives the same bound) and ``passed``
        (normal limits passed at run speeds, for reading a disagreement).
    """
    return _Plan(curves, traffic, limits, settings).records()


class _Plan:
    def __init__(self, curves: CurveList, traffic: Traffic, limits: LimitSet, settings: Settings) -> None:
        self.exceptional = "exceptional" in settings.tiers
        self.book = Book(limits, settings)
        self.track = lay_out(curves, traffic, self.book)
        self.values = Values(self.track, self.book)
        self.search = SpeedSearch(self.values)
        self.chooser = Chooser(self.search, self.exceptional, settings.keep_within_mm)
        self.cants: Cants = {}
        self.speeds: dict[int, Speeds] = {}
        self.not_compliant: set[int] = set()
        self.passed: Passed = {}
        for chain in self.track.chains():
            best, not_compliant = self.chooser.best(chain)
            cants = self.chooser.keep(chain, best)
            self.cants |= cants
            self.not_compliant |= not_compliant
            self.speeds |= self.chooser.run_speeds(chain, cants)
            self.passed |= self.chooser.passed(chain, cants, False)

    def records(self) -> list[dict[str, Any]]:
        return [self.record(curve) for curve in self.track.curves]

    def record(self, curve: Curve) -> dict[str, Any]:
        if curve.index in self.track.not_assessed:
            return {
                "curve": curve.name,
                "status": "not assessed",
                "recommended_cant_mm": None,
                "shares_transition_with_next": False,
                "today": {"status": "not known"},
                "rejected": curve.rejected,
            }
        cant = self.cants[curve.index]
        places = self.chooser._places(curve.index)
        over_normal = [item for item in self.passed if item[0] in places]
        tier = bool(over_normal) and self.exceptional
        lower, upper = self.lower(curve, tier), self.upper(curve, tier)
        planned = {name: train.speed for name, train in curve.trains.items()}
        return {
            "curve": curve.name,
            "recommended_cant_mm": cant,
            "status": self.status(curve, bool(over_normal)),
            "lower_mm": max((b[0] for b in lower), default=None),
            "upper_mm": min((b[0] for b in upper), default=None),
            "lower_by": _by(max(lower, key=lambda b: b[0], default=None)),
            "upper_by": _by(min(upper, key=lambda b: b[0], default=None)),
            "lower_ties": _ties(lower, max),
            "upper_ties": _ties(upper, min),
            "rms_speed_kmh": rms_speed(curve, planned),
            "equilibrium_speed_kmh": (
                math.sqrt(cant * curve.radius / self.book.constant) if cant >= 0 else None
            ),
            "shares_transition_with_next": self.track.between(curve.index, "out") is not None,
            "classes": [self.figures(curve, train) for train in curve.trains.values()],
            "today": {"status": self.today(curve)},
            "passed": sorted((place[0], quantity) for place, quantity in over_normal),
        }

    def status(self, curve: Curve, over_normal: bool) -> str:
        if curve.index in self.not_compliant:
            return "not compliant"
        speeds = self.speeds[curve.index]
        if any(speeds[name] < train.speed for name, train in curve.trains.items()):
            return "restrict"
        if over_normal:
            return "exceptional"
        same = curve.today is not None and abs(curve.today - self.cants[curve.index]) <= SAME_CANT
        return "kept" if same else "change"

    def figures(self, curve: Curve, train: Train) -> dict[str, Any]:
        cant, speed = self.cants[curve.index], self.speeds[curve.index][train.name]
        equilibrium = self.values.equilibrium(curve, speed)
        unbalanced = GRAVITY * (equilibrium - cant) / self.book.spacing
        permissible = self.search.permissible
        return {
            "class": train.name,
            "speed_kmh": train.speed,
            "run_speed_kmh": speed,
            "equilibrium_cant_mm": equilibrium,
            "deficiency_mm": max(0.0, equilibrium - cant),
            "excess_mm": max(0.0, cant - equilibrium),
            "unbalanced_acceleration_ms2": unbalanced,
            "felt_acceleration_ms2": None if train.roll is None else (1 + train.roll) * unbalanced,
            "permissible_speed_kmh": permissible(curve, train, self.cants, self.exceptional),
            "permissible_speed_normal_kmh": permissible(curve, train, self.cants, False),
            "lowest_speed_kmh": self.search.lowest(curve, train, cant, self.exceptional),
        }

    # -- a curve's own bounds --------------------------------------------------------------------------

    def lower(self, curve: Curve, exceptional: bool) -> list[Bound]:
        """Give every limit that binds a curve's cant from below at planned speeds."""
        bounds: list[Bound] = []
        if curve.at_least is not None:
            bounds.append((curve.at_least, "cant at least", None, None))
        for train in curve.trains.values():
            equilibrium = self.values.equilibrium(curve, train.speed)

            def bind(
                quantity: str, mm_per_unit: float, train: Train = train, equilibrium: float = equilibrium
            ) -> None:
                limit = train_limit(quantity, curve, train, train.speed, self.book, exceptional)
                _add(bounds, limit, equilibrium - limit.value * mm_per_unit, quantity, train.name)

            bind("cant deficiency", 1.0)
            if train.roll is not None and train.roll > -1:
                bind("felt acceleration", self.book.spacing / (GRAVITY * (1 + train.roll)))
            for end in curve.ends.values():
                if end.kind == "straight" and end.length and train.speed > 0:
                    seconds = 3.6 * end.length / train.speed
                    bind("rate of change of cant deficiency", seconds / curve.peak)
        return bounds

    def upper(self, curve: Curve, exceptional: bool) -> list[Bound]:
        """Give every limit that binds a curve's cant from above at planned speeds."""
        bounds: list[Bound] = []
        if curve.at_most is not None:
            bounds.append((curve.at_most, "cant at most", None, None))
        cant = cant_limit("cant", curve, self.book, None, exceptional)
        _add(bounds, cant, cant.value, "cant", None)
        ramps = [end.ramp for end in curve.ends.values() if end.kind != "shared" and end.ramp]
        gradient = cant_limit("cant gradient", curve, self.book, None, exceptional)
        for ramp in ramps:
            _add(bounds, gradient, gradient.value * ramp / curve.peak, "cant gradient", None)
        for train in curve.trains.values():

            def bind(quantity: str, mm_per_unit: float, from_mm: float, train: Train = train) -> None:
                limit = train_limit(quantity, curve, train, train.speed, self.book, exceptional)
                _add(bounds, limit, from_mm + limit.value * mm_per_unit, quantity, train.name)

            equilibrium = self.values.equilibrium(curve, train.speed)
            if train.regular:
                bind("cant excess", 1.0, equilibrium)
                if train.roll is not None and train.roll > -1:
                    mm = self.book.spacing / (GRAVITY * (1 + train.roll))
                    bind("felt acceleration", mm, equilibrium)
            for ramp in ramps:
                if train.speed > 0:
                    bind("rate of change of cant", 3.6 * ramp / (train.speed * curve.peak), 0.0)
        return bounds

    # -- today -----------------------------------------------------------------------------------------

    def today(self, curve: Curve) -> str:
        """Say whether today's cant keeps the limits at planned speeds."""
        if curve.today is None:
            return "not known"
        if not self.today_passes(curve, False):
            return "keeps normal limits"
        return "breaks limits" if self.today_passes(curve, True) else "needs exceptional limits"

    def today_passes(self, curve: Curve, exceptional: bool) -> Passed:
        """Give what today's cants pass on a curve and its transitions."""
        assert curve.today is not None
        planned = {name: train.speed for name, train in curve.trains.items()}
        passed = self.values.own_at(curve, curve.today, planned, exceptional)
        for side in ("in", "out"):
            shared = self.track.between(curve.index, side)
            if shared is None:
                continue
            pair = self.values.pair(shared)
            speeds = tuple({name: train.speed for name, train in c.trains.items()} for c in pair)
            cants = tuple(math.nan if c.today is None else c.today for c in pair)
            found = self.values.shared_at(shared, cants, speeds, exceptional)
            known = not any(math.isnan(cant) for cant in cants)
            passed |= {
                item: over
                for item, over in found.items()
                if known or item[1] == "abrupt change of cant deficiency"
            }
        return passed


def _add(bounds: list[Bound], limit: Limit, mm: float, quantity: str, name: str | None) -> None:
    if not math.isinf(limit.value):
        bounds.append((mm, quantity, limit.row.clause if limit.row else None, name))


def _by(bound: Bound | None) -> dict[str, Any] | None:
    return None if bound is None else {"quantity": bound[1], "clause": bound[2], "class": bound[3]}


def _ties(bounds: list[Bound], extreme: Any) -> list[dict[str, Any] | None]:
    if not bounds:
        return []
    value = extreme(b[0] for b in bounds)
    return [_by(b) for b in bounds if abs(b[0] - value) <= 1e-6]
