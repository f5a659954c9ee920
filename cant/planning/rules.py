"""The rules of the contract, each written once: value = constant + slope x cant, against a limit.

Checking a cant, the permitted range, what binds, and the speed a cant permits all read the same terms. A rule
over a shared transition depends on the cants at both its ends and stands in :mod:`cant.planning.shared`.

::

    place   what it speaks of                    rises with cant (+1)        falls with cant (-1)
    curve   the circular arc                     cant, at most, excess,      deficiency, at least,
                                                 felt inwards, branch of     felt outwards, branch of
                                                 a turnout                   a turnout
    before  the transition to a straight at      gradient, rate of cant      rate of deficiency
    after   the smaller / the greater chainage   (abrupt change: neither)
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from cant.model.limits import TOLERANCE
from cant.planning.limit_table import NO_CATEGORY, LimitAt
from cant.planning.line import Line
from cant.planning.neighbours import AFTER, BEFORE
from cant.quantities.kinematics import equilibrium_cant
from cant.units import GRAVITY_MS2, KMH_PER_MS

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

CURVE, END_BEFORE, END_AFTER, BETWEEN = "curve", "before", "after", "between"
PLACE_OF_END = {BEFORE: END_BEFORE, AFTER: END_AFTER}


@dataclass(frozen=True, slots=True)
class Rule:
    """What is fixed about a rule.

    Attributes
    ----------
    quantity : str
        Limited quantity, or ``cant at most`` / ``cant at least`` for a bound of the site.
    place : str
        CURVE, END_BEFORE, END_AFTER, or BETWEEN for a shared transition.
    sense : int
        1 where the value rises with cant, -1 where it falls, 0 where cant does not matter.
    by_speed : bool
        A lower speed can mend it.
    of_class : bool
        It speaks of a class of train, not of the curve alone.
    """

    quantity: str
    place: str
    sense: int
    by_speed: bool
    of_class: bool = True


@dataclass(frozen=True, slots=True)
class Terms:
    """A rule over the curves of a line at given speeds; arrays broadcast to (..., n, k).

    Attributes
    ----------
    rule : Rule
    constant, slope : ndarray
        The value at cant D is constant + slope x D, in the canonical unit of the quantity.
    limit : LimitAt
    active : ndarray of bool
        Where the rule applies.
    even : bool
        A negative cant counts like a positive one of its size (a ramp is as steep downwards as upwards).
    """

    rule: Rule
    constant: FloatArray
    slope: FloatArray
    limit: LimitAt
    active: BoolArray
    even: bool = False

    def value(self, cant_mm: FloatArray) -> FloatArray:
        """Give the value at a cant, shape (..., n, k)."""
        return self.constant + self.slope * (np.abs(cant_mm) if self.even else cant_mm)

    def kept(self, cant_mm: FloatArray) -> BoolArray:
        """Tell whether the limit is kept at a cant, shape (..., n, k); True where it does not apply."""
        within = self.value(cant_mm) <= self.limit.value + self.limit.tolerance
        return np.asarray(np.logical_or(~self.active, within))

    def bound(self, with_tolerance: bool = False) -> FloatArray:
        """Give the cant at which the limit is just kept [mm], shape (..., n, k).

        A lower bound for sense -1, an upper one for sense 1; infinite where the rule does not bind.
        """
        limit = self.limit.value + self.limit.tolerance if with_tolerance else self.limit.value
        free = -np.inf if self.rule.sense < 0 else np.inf
        with np.errstate(divide="ignore", invalid="ignore"):
            at = (limit - self.constant) / self.slope
        return np.where(self.active & (self.slope != 0) & np.isfinite(limit), at, free)


CANT = Rule("cant", CURVE, 1, False)
AT_MOST = Rule("cant at most", CURVE, 1, False, of_class=False)
AT_LEAST = Rule("cant at least", CURVE, -1, False, of_class=False)
DEFICIENCY = Rule("cant deficiency", CURVE, -1, True)
EXCESS = Rule("cant excess", CURVE, 1, False)
FELT_OUTWARDS = Rule("felt acceleration", CURVE, -1, True)
FELT_INWARDS = Rule("felt acceleration", CURVE, 1, False)
BRANCH_DEFICIENCY_LEAST = Rule("cant deficiency on the branch", CURVE, -1, False, of_class=False)
BRANCH_DEFICIENCY_MOST = Rule("cant deficiency on the branch", CURVE, 1, False, of_class=False)
BRANCH_EXCESS = Rule("cant excess on the branch", CURVE, 1, False, of_class=False)
GRADIENT = {end: Rule("cant gradient", PLACE_OF_END[end], 1, False) for end in (BEFORE, AFTER)}
CANT_RATE = {end: Rule("rate of change of cant", PLACE_OF_END[end], 1, True) for end in (BEFORE, AFTER)}
DEFICIENCY_RATE = {
    end: Rule("rate of change of cant deficiency", PLACE_OF_END[end], -1, True) for end in (BEFORE, AFTER)
}
ABRUPT = {
    end: Rule("abrupt change of cant deficiency", PLACE_OF_END[end], 0, True) for end in (BEFORE, AFTER)
}

SPEED_QUANTITIES = (
    "cant deficiency",
    "felt acceleration",
    "rate of change of cant",
    "rate of change of cant deficiency",
    "abrupt change of cant deficiency",
)
"""Quantities whose limits end the search for a permissible speed."""


class Asked:
    """The limits of a line at given speeds and one tier, each quantity asked at most once.

    Parameters
    ----------
    line : Line
    speed_kmh : ndarray, shape (..., n, k)
    exceptional : bool
    """

    def __init__(self, line: Line, speed_kmh: FloatArray, exceptional: bool) -> None:
        self.line = line
        self.speed_kmh = speed_kmh
        self.exceptional = exceptional
        self._found: dict[str, LimitAt] = {}

    @cached_property
    def balance_mm(self) -> FloatArray:
        """Equilibrium cant of each class at these speeds [mm], shape (..., n, k)."""
        return equilibrium_cant(self.speed_kmh, self.line.radius_m, self.line.constant)

    def limit(self, quantity: str) -> LimitAt:
        """Give the limit of each class, broadcasting to (..., n, k)."""
        if quantity not in self._found:
            self._found[quantity] = self.line.limit(quantity, self.speed_kmh, self.exceptional)
        return self._found[quantity]

    def curve_limit(self, quantity: str) -> LimitAt:
        """Give the limit of the curve by itself, of rows that speak of no class: shape (n, 1)."""
        return self.line.table.at(
            quantity,
            exceptional=self.exceptional,
            category=np.full((len(self.line), 1), NO_CATEGORY),
            situation=self.line.situation,
            speed=np.full((len(self.line), 1), np.nan),
            radius=self.line.radius_m,
        )


def _felt_factor(line: Line) -> FloatArray:
    """Felt acceleration per mm of deficiency [m/s2 per mm], shape (n, k); nan without a roll coefficient.

    A class without one is a class that no row of the quantity speaks of (others were refused before): the
    rules leave it out.
    """
    return (1.0 + line.roll) * GRAVITY_MS2 / line.spacing_mm


def _site_limit(value: FloatArray) -> LimitAt:
    return LimitAt(
        value,
        np.full(value.shape, TOLERANCE),
        np.full(value.shape, -1, dtype=np.int16),
        np.zeros(value.shape, dtype=np.bool_),
    )


def _cant_terms(asked: Asked) -> Iterator[Terms]:
    """Yield the cant itself: rows of a class where one runs, else the rows that speak of no class."""
    line = asked.line
    empty = line.without_trains
    one = np.ones((1, 1))
    yield Terms(CANT, np.zeros((1, 1)), one, asked.limit("cant"), line.runs)
    if empty.any():
        yield Terms(CANT, np.zeros((1, 1)), one, asked.curve_limit("cant"), empty)


def _site_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    zero, one = np.zeros((1, 1)), np.ones((1, 1))
    most, least = np.isfinite(line.at_most_mm), np.isfinite(line.at_least_mm)
    yield Terms(AT_MOST, zero, one, _site_limit(line.at_most_mm), most)
    yield Terms(AT_LEAST, zero, -one, _site_limit(-line.at_least_mm), least)


def _deficiency_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    yield Terms(DEFICIENCY, asked.balance_mm, -np.ones((1, 1)), asked.limit("cant deficiency"), line.runs)


def _excess_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    yield Terms(EXCESS, -asked.balance_mm, np.ones((1, 1)), asked.limit("cant excess"), line.regular)


def _felt_outwards_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    if not line.table.has("felt acceleration"):
        return
    factor = _felt_factor(line)
    felt = line.runs & ~np.isnan(line.roll)
    yield Terms(FELT_OUTWARDS, factor * asked.balance_mm, -factor, asked.limit("felt acceleration"), felt)


def _felt_inwards_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    if not line.table.has("felt acceleration"):
        return
    factor = _felt_factor(line)
    felt = line.regular & ~np.isnan(line.roll)
    yield Terms(FELT_INWARDS, -factor * asked.balance_mm, factor, asked.limit("felt acceleration"), felt)


def _branch_terms(asked: Asked) -> Iterator[Terms]:
    """Yield what the branches of turnouts ask; the last axis counts the turnouts of a curve, not classes."""
    line, branches = asked.line, asked.line.branches
    if branches is None or not branches.there.any():
        return
    deficiency = branches.limit(line.table, "cant deficiency", asked.exceptional)
    excess = branches.limit(line.table, "cant excess", asked.exceptional)
    there, needed, one = branches.there, branches.needed_mm, np.ones((1, 1))
    along, against = there & (branches.sense > 0), there & (branches.sense <= 0)
    yield Terms(BRANCH_DEFICIENCY_LEAST, needed, -one, deficiency, along)
    yield Terms(BRANCH_DEFICIENCY_MOST, needed, one, deficiency, against)
    yield Terms(BRANCH_EXCESS, -needed, one, excess, there & (branches.sense >= 0))


def _gradient_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    empty = line.without_trains
    for end in (BEFORE, AFTER):
        ramp = line.ramp_m[end]
        known = ~np.isnan(ramp)
        if not known.any():
            continue
        slope = line.factor / ramp
        zero = np.zeros((1, 1))
        yield Terms(GRADIENT[end], zero, slope, asked.limit("cant gradient"), line.runs & known, True)
        if empty.any():
            yield Terms(GRADIENT[end], zero, slope, asked.curve_limit("cant gradient"), empty & known, True)


def _cant_rate_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    for end in (BEFORE, AFTER):
        ramp = line.ramp_m[end]
        known = ~np.isnan(ramp)
        if known.any():
            slope = line.factor * asked.speed_kmh / (KMH_PER_MS * ramp)
            limit = asked.limit("rate of change of cant")
            yield Terms(CANT_RATE[end], np.zeros((1, 1)), slope, limit, line.runs & known, True)


def _deficiency_rate_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    for end in (BEFORE, AFTER):
        length = line.transition_m[end]
        known: BoolArray = np.asarray(length > 0)
        if not known.any():
            continue
        with np.errstate(divide="ignore", invalid="ignore"):
            rate = line.factor * asked.speed_kmh / (KMH_PER_MS * length)
            limit = asked.limit("rate of change of cant deficiency")
            yield Terms(DEFICIENCY_RATE[end], rate * asked.balance_mm, -rate, limit, line.runs & known)


def _abrupt_terms(asked: Asked) -> Iterator[Terms]:
    line = asked.line
    for end in (BEFORE, AFTER):
        none: BoolArray = np.asarray(line.transition_m[end] == 0)
        if none.any():
            limit = asked.limit("abrupt change of cant deficiency")
            yield Terms(ABRUPT[end], asked.balance_mm, np.zeros((1, 1)), limit, line.runs & none)


_HARD: tuple[Callable[[Asked], Iterator[Terms]], ...] = (
    _cant_terms,
    _site_terms,
    _excess_terms,
    _felt_inwards_terms,
    _gradient_terms,
    _branch_terms,
)
_BY_SPEED: tuple[Callable[[Asked], Iterator[Terms]], ...] = (
    _deficiency_terms,
    _felt_outwards_terms,
    _cant_rate_terms,
    _deficiency_rate_terms,
    _abrupt_terms,
)


def hard_terms(asked: Asked) -> Iterator[Terms]:
    """Yield the rules that no lower speed can mend, of the curves by themselves."""
    for make in _HARD:
        yield from make(asked)


def speed_terms(asked: Asked) -> Iterator[Terms]:
    """Yield the rules that a lower speed can mend, of the curves by themselves."""
    for make in _BY_SPEED:
        yield from make(asked)


def curve_terms(asked: Asked) -> Iterator[Terms]:
    """Yield every rule of the curves by themselves, shared transitions left out."""
    yield from hard_terms(asked)
    yield from speed_terms(asked)
