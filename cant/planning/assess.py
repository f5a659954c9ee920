"""What given cants are worth: speeds run, time lost, limits passed. The one evaluation of a whole line.

The choice of cants asks it of every cant of the grid, the finished plan of the chosen ones, and the question
"does what is there comply?" of today's.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.line import Line
from cant.planning.neighbours import Pairs
from cant.planning.permissible import Permitted, permitted_alone, speed_steps
from cant.planning.permissible_shared import permitted_shared
from cant.planning.rules import AT_LEAST, AT_MOST, Asked, Rule, curve_terms, hard_terms
from cant.planning.running_time import Services, TimeLost
from cant.planning.shared import Meeting, SharedAsked, hard_values, shared_values

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

LIMIT_OF_NOTHING = 1000.0
"""A limit of 0 or less that is passed counts as this much overrun, plus the amount."""


def overrun(value: FloatArray, limit: FloatArray) -> FloatArray:
    """Give by how much a limit is passed: value / limit - 1; 1000 + the amount for a limit of 0 or less."""
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = value / limit - 1.0
    return np.where(limit > 0, ratio, LIMIT_OF_NOTHING + (value - limit))


@dataclass
class Passed:
    """Limits passed at their normal values, each quantity once a place; arrays of shape (..., n).

    Attributes
    ----------
    by_rule : dict of (place, quantity) to ndarray
        The largest overrun over the classes where the limit is passed, 0 where it is kept.
    """

    by_rule: dict[tuple[str, str], FloatArray]

    @classmethod
    def of(cls, found: Iterable[tuple[Rule, BoolArray, FloatArray, FloatArray]], sites: bool) -> Passed:
        """Gather from rules with what is kept, the values and the limits, each (..., n, k).

        ``sites``: also what the site demands, which no approval can waive.
        """
        gathered: dict[tuple[str, str], FloatArray] = {}
        for rule, kept, value, limit in found:
            if rule in (AT_MOST, AT_LEAST) and not sites:
                continue
            broken = ~kept
            over = np.where(broken, overrun(value, limit), 0.0) if broken.any() else broken.astype(np.float64)
            worst = over.max(axis=-1)
            key = (rule.place, rule.quantity)
            gathered[key] = np.maximum(gathered[key], worst) if key in gathered else worst
        return cls(gathered)

    def without_cant(self, blind: BoolArray) -> Passed:
        """Leave out, where cants are not known, what depends on them: all but an abrupt change."""
        return Passed(
            {
                key: over if key[1] == "abrupt change of cant deficiency" else np.where(blind, 0.0, over)
                for key, over in self.by_rule.items()
            }
        )

    def spread(self, at: npt.NDArray[np.int64], n: int) -> Passed:
        """Give the same for n places of which only some pass anything."""
        return Passed({key: _spread(over, at, n) for key, over in self.by_rule.items()})

    def gathered(self, begin: npt.NDArray[np.int64]) -> Passed:
        """Give the same for groups of consecutive places that begin at some of them: the largest of each."""
        return Passed({key: np.maximum.reduceat(over, begin, axis=-1) for key, over in self.by_rule.items()})

    @property
    def count(self) -> FloatArray:
        """Number of limits passed, shape (..., n)."""
        return np.asarray(sum((over > 0).astype(np.float64) for over in self.by_rule.values()))

    @property
    def total(self) -> FloatArray:
        """Sum of the overruns, shape (..., n)."""
        return np.asarray(sum(self.by_rule.values()))


def passed_alone(
    line: Line,
    cant_mm: FloatArray,
    speed_kmh: FloatArray,
    exceptional: bool = False,
    sites: bool = False,
) -> Passed:
    """Find the limits that curves by themselves pass at a cant (..., n, 1) and speeds (..., n, k)."""
    found = (
        (terms.rule, terms.kept(cant_mm), terms.value(cant_mm), terms.limit.value)
        for terms in curve_terms(Asked(line, speed_kmh, exceptional))
    )
    return Passed.of(found, sites)


def passed_shared(
    meeting: Meeting,
    cants_mm: tuple[FloatArray, FloatArray],
    speed_kmh: FloatArray,
    exceptional: bool = False,
    sites: bool = False,
) -> Passed:
    """Find the limits of shared transitions that are passed at cants (..., m, 1) and speeds (..., m, k)."""
    found = (
        (shared.rule, shared.kept(), shared.value, shared.limit.value)
        for shared in shared_values(SharedAsked(meeting, speed_kmh, exceptional), *cants_mm)
    )
    return Passed.of(found, sites)


def hard_kept(line: Line, cant_mm: FloatArray, exceptional: bool) -> BoolArray:
    """Tell where a curve by itself keeps what no lower speed can mend, at planned speeds: shape (..., n)."""
    kept: BoolArray = np.ones(np.broadcast_shapes(cant_mm.shape, (len(line), 1))[:-1], dtype=np.bool_)
    for terms in hard_terms(Asked(line, line.planned_kmh, exceptional)):
        kept = kept & terms.kept(cant_mm).all(axis=-1)
    return kept


def shared_hard_kept(
    meeting: Meeting, cants_mm: tuple[FloatArray, FloatArray], exceptional: bool
) -> tuple[BoolArray, FloatArray]:
    """Tell where shared transitions keep what no lower speed can mend, and the overrun: shape (..., m)."""
    shape = np.broadcast_shapes(cants_mm[0].shape, cants_mm[1].shape, (len(meeting), 1))[:-1]
    kept: BoolArray = np.ones(shape, dtype=np.bool_)
    total: FloatArray = np.zeros(shape)
    for found in hard_values(SharedAsked(meeting, meeting.planned_kmh, exceptional), *cants_mm):
        held = found.kept()
        kept = kept & held.all(axis=-1)
        total = total + np.where(held, 0.0, overrun(found.value, found.limit.value)).max(axis=-1)
    return kept, total


@dataclass
class Speeds:
    """The speeds that cants permit on a whole line, shared transitions included; arrays (n, k).

    Attributes
    ----------
    permissible_kmh, run_kmh : ndarray
        nan where the class does not run.
    own_kmh : ndarray
        The speed run as far as the curve by itself decides.
    """

    permissible_kmh: FloatArray
    run_kmh: FloatArray
    own_kmh: FloatArray


def line_speeds(line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool) -> Speeds:
    """Give the speeds that cants permit.

    Parameters
    ----------
    line : Line
        n curves.
    pairs : Pairs
        Shared transitions; one whose cants are not both known is left out.
    cant_mm : ndarray, shape (n,)
        nan where not known: the speeds are then nan too.
    exceptional : bool

    Returns
    -------
    Speeds
        Shape (n, k).
    """
    steps = speed_steps(line)
    cant = cant_mm[:, None]
    alone = permitted_alone(line, cant, steps, exceptional)
    up_to, planned = alone.up_to_kmh.copy(), alone.planned.copy()
    known = ~np.isnan(cant_mm)
    own = alone.run_speed(line.planned_kmh)
    pairs = pairs.take(np.flatnonzero(known[pairs.first] & known[pairs.second]))
    if len(pairs):
        shared = permitted_shared(
            Meeting.of(line, pairs),
            (cant[pairs.first], cant[pairs.second]),
            (alone.take(pairs.first), alone.take(pairs.second)),
            (steps[pairs.first], steps[pairs.second]),
            exceptional,
        )
        for part, owner in zip(shared, (pairs.first, pairs.second), strict=True):
            up_to[owner] = np.minimum(up_to[owner], part.up_to_kmh)
            planned[owner] &= part.planned
    together = Permitted(up_to, planned)
    off = ~line.runs | ~known[:, None]
    return Speeds(
        np.where(off, np.nan, together.speed(line.planned_kmh)),
        np.where(off, np.nan, together.run_speed(line.planned_kmh)),
        np.where(off, np.nan, own),
    )


@dataclass
class Assessment:
    """What cants are worth, for a whole line.

    Attributes
    ----------
    run_kmh : ndarray, shape (n, k)
    stopped, lost_s : ndarray, shape (n,)
    passed : Passed
        Of curves by themselves, (n,).
    passed_between : Passed
        Of shared transitions, (m,).
    """

    run_kmh: FloatArray
    stopped: FloatArray
    lost_s: FloatArray
    passed: Passed
    passed_between: Passed

    def by_group(self, begin: npt.NDArray[np.int64]) -> TimeLost:
        """Give what groups of consecutive curves that begin at some of them lose."""
        return TimeLost(np.add.reduceat(self.stopped, begin), np.add.reduceat(self.lost_s, begin))


def assess(line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool) -> Assessment:
    """Assess known cants (n,) [mm] at the speeds that they permit."""
    run = line_speeds(line, pairs, cant_mm, exceptional).run_kmh
    meeting = Meeting.of(line, pairs)
    cants = (cant_mm[pairs.first][:, None], cant_mm[pairs.second][:, None])
    together = np.minimum(run[pairs.first], run[pairs.second])
    services = Services.of(line)
    return Assessment(
        run_kmh=run,
        stopped=services.stopped(run),
        lost_s=services.lost_s(run),
        passed=passed_alone(line, cant_mm[:, None], run),
        passed_between=passed_shared(meeting, cants, together),
    )


def assess_some(
    line: Line, pairs: Pairs, cant_mm: FloatArray, exceptional: bool, doubtful: npt.NDArray[np.int64]
) -> Assessment:
    """Assess a line of which only some curves can lose time or pass a limit; whole chains of them.

    Parameters
    ----------
    line : Line
        n curves.
    pairs : Pairs
        m transitions.
    cant_mm : ndarray, shape (n,)
        Cants [mm].
    exceptional : bool
    doubtful : ndarray of int
        The others are known to keep every normal limit at planned speeds.
    """
    n, m = len(line), len(pairs)
    inside = np.isin(pairs.first, doubtful)
    part = assess(line.take(doubtful).with_bands(), pairs.among(doubtful), cant_mm[doubtful], exceptional)
    run = line.planned_kmh.copy()
    run[doubtful] = part.run_kmh
    return Assessment(
        run_kmh=run,
        stopped=_spread(part.stopped, doubtful, n),
        lost_s=_spread(part.lost_s, doubtful, n),
        passed=part.passed.spread(doubtful, n),
        passed_between=part.passed_between.spread(np.flatnonzero(inside), m),
    )


def _spread(values: FloatArray, at: npt.NDArray[np.int64], n: int) -> FloatArray:
    every = np.zeros(n)
    every[at] = values
    return every
