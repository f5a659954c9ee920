"""From tables to the arrays of a finished plan: the only place that knows the order of the steps."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property, partial

import numpy as np
import numpy.typing as npt

from cant.errors import InputError
from cant.model.curves import CurveList
from cant.model.limits import LimitSet
from cant.model.plan import Finding
from cant.model.settings import METHODS, Settings
from cant.model.traffic import Traffic
from cant.model.turnouts import Turnout
from cant.planning.assembly import make_line
from cant.planning.assess import Assessment, assess_some, passed_alone, passed_shared
from cant.planning.branches import place_turnouts
from cant.planning.chainages import find_neighbours
from cant.planning.choose import choose
from cant.planning.gaps import demand_roll_coefficients, find_gaps, find_unlimited
from cant.planning.grid import Grid, make_grid
from cant.planning.keep import SAME_MM, keep_today
from cant.planning.line import Line
from cant.planning.neighbours import Neighbourhood, Pairs, Remark, forget
from cant.planning.shared import Meeting
from cant.planning.targets import Target, target_of

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

Progress = Callable[[float, str], None]
"""Told the share done, 0 to 1, and what is being done."""

KEEPS_NORMAL, NEEDS_EXCEPTIONAL, BREAKS, UNKNOWN = range(4)
TODAY_WORDS = ("keeps normal limits", "needs exceptional limits", "breaks limits", "not known")


@dataclass
class Outcome:
    """The arrays of a plan.

    Attributes
    ----------
    curves, traffic, limits, settings
        The tables planned.
    line : Line
        n curves; classes run only on curves that are planned.
    neighbourhood : Neighbourhood
    grid : Grid
    planned : ndarray of bool, shape (n,)
        False for rejected and not assessed curves.
    cant_mm : ndarray, shape (n,)
        Proposed cants; nan where not planned.
    not_compliant : ndarray of bool, shape (n,)
    proposed : Assessment
        At the proposed cants.
    remarks : list of callable
        What is to be said about the data and the limits: see :attr:`findings`.
    turnouts : sequence of Turnout
    """

    curves: CurveList
    traffic: Traffic
    limits: LimitSet
    settings: Settings
    line: Line
    neighbourhood: Neighbourhood
    grid: Grid
    planned: BoolArray
    cant_mm: FloatArray
    not_compliant: BoolArray
    proposed: Assessment
    target: Target
    remarks: list[Remark]
    turnouts: Sequence[Turnout] = ()

    @property
    def pairs(self) -> Pairs:
        """Shared transitions between planned curves."""
        return self.neighbourhood.pairs

    @cached_property
    def findings(self) -> list[Finding]:
        """Findings on the data and the limits, of the whole plan and of curves that were not rejected."""
        rejected = self.curves.rejected
        every = [finding for remark in self.remarks for finding in remark()]
        return [finding for finding in every if finding.curve is None or not rejected[finding.curve]]

    @cached_property
    def _findings_by_curve(self) -> dict[int, list[Finding]]:
        found: dict[int, list[Finding]] = {}
        for finding in self.findings:
            if finding.curve is not None:
                found.setdefault(finding.curve, []).append(finding)
        return found

    def findings_of(self, index: int) -> list[Finding]:
        """Give the findings on one curve."""
        return self._findings_by_curve.get(index, [])

    @cached_property
    def exceptional(self) -> BoolArray:
        """Curves that pass, or whose transitions pass, a limit at its normal value, shape (n,)."""
        over = self.proposed.passed.count > 0
        between = np.asarray(self.proposed.passed_between.count > 0)
        if len(self.pairs) and between.ndim:
            over = over.copy()
            over[self.pairs.first[between]] = True
            over[self.pairs.second[between]] = True
        return over & self.planned

    @cached_property
    def restricted(self) -> BoolArray:
        """Curves on which some class may not run at its planned speed, shape (n,)."""
        with np.errstate(invalid="ignore"):
            slow = self.proposed.run_kmh < self.line.planned_kmh - SAME_MM
        return np.asarray((slow & self.line.runs).any(axis=-1) & self.planned)

    @cached_property
    def status(self) -> list[str]:
        """Status of each curve, "" for a rejected row."""
        with np.errstate(invalid="ignore"):
            same = np.abs(self.cant_mm - self.curves.cant_mm) <= SAME_MM
        first = np.select(
            [
                self.curves.rejected,
                ~self.planned,
                self.not_compliant,
                self.restricted,
                self.exceptional,
                same,
            ],
            range(6),
            6,
        )
        words = ("", "not assessed", "not compliant", "restrict", "exceptional", "kept", "change")
        return [words[number] for number in first.tolist()]

    @cached_property
    def today(self) -> IntArray:
        """Index into TODAY_WORDS for each curve, shape (n,)."""
        kept = [self._today_kept(exceptional) for exceptional in (False, True)]
        known = self.planned & ~np.isnan(self.curves.cant_mm)
        return np.select([~known, kept[0], kept[1]], [UNKNOWN, KEEPS_NORMAL, NEEDS_EXCEPTIONAL], BREAKS)

    def _today_kept(self, exceptional: bool) -> BoolArray:
        """Tell where today's cant keeps everything at planned speeds, shape (n,)."""
        today = np.nan_to_num(self.line.cant_today_mm)
        found = passed_alone(self.line, today, self.line.planned_kmh, exceptional, sites=True)
        kept = np.asarray(found.count == 0)
        pairs = self.pairs
        if len(pairs):
            meeting = Meeting.of(self.line, pairs)
            cants = (today[pairs.first], today[pairs.second])
            between = passed_shared(meeting, cants, meeting.planned_kmh, exceptional)
            unknown = np.isnan(self.curves.cant_mm)
            blind = unknown[pairs.first] | unknown[pairs.second]
            held = np.asarray(between.without_cant(blind).count == 0)
            np.logical_and.at(kept, pairs.first, held)
            np.logical_and.at(kept, pairs.second, held)
        return kept


def plan_arrays(
    curves: CurveList,
    traffic: Traffic,
    limits: LimitSet,
    settings: Settings,
    progress: Progress | None = None,
    turnouts: Sequence[Turnout] = (),
    placed: dict[int, list[int]] | None = None,
) -> Outcome:
    """Plan a line.

    Parameters
    ----------
    curves : CurveList
    traffic : Traffic
    limits : LimitSet
    settings : Settings
    progress : callable, optional
        Told how far the work has come.
    turnouts : sequence of Turnout
        Those that lie in curves: their branches bound the cant.
    placed : dict of int to list of int, optional
        Which of them lie in each curve, where that is already known.

    Returns
    -------
    Outcome

    Raises
    ------
    InputError
        Where the tables do not suffice for any plan: an unknown method, a roll coefficient missing where felt
        acceleration is limited.
    """
    tell = progress or (lambda share, words: None)
    if settings.method not in METHODS:
        message = f"the method '{settings.method}' is not known: one of {', '.join(METHODS)}"
        raise InputError(message)
    target = target_of(settings.method, settings)
    tell(0.0, "looking at neighbours")
    neighbourhood = find_neighbours(curves)
    misplaced: list[Finding] = []
    if placed is None:
        placed, misplaced = place_turnouts(turnouts, curves)
    line = make_line(curves, traffic, limits, settings, neighbourhood, turnouts, placed)
    usable = ~(curves.rejected | neighbourhood.contradictory)
    line.runs &= usable[:, None]
    line.regular &= line.runs
    demand_roll_coefficients(line, traffic)
    gaps = find_gaps(line, neighbourhood.pairs, curves, traffic)
    gapped = np.zeros(len(curves), dtype=np.bool_)
    gapped[[f.curve for f in gaps if f.curve is not None]] = True
    planned = usable & ~gapped
    neighbourhood = forget(neighbourhood, ~planned)
    line.set_ends(neighbourhood)
    line.runs &= planned[:, None]
    line.regular &= line.runs
    tell(0.3, "choosing cants")
    grid = make_grid(line)
    pairs = neighbourhood.pairs
    tier = settings.allows_exceptional
    choice = choose(line, grid, pairs, planned, target, tier)
    cant = choice.cant_mm
    if settings.keep_within_mm > 0:
        keepable = planned & ~choice.not_compliant & ~line.fixed[:, 0]
        cant = keep_today(line, pairs, cant, settings.keep_within_mm, keepable, tier)
    tell(0.8, "assessing the plan")
    proposed = assess_some(line, pairs, cant, tier, np.flatnonzero(~choice.within_normal & planned))
    remarks: list[Remark] = [
        *neighbourhood.remarks,
        partial(iter, gaps),
        partial(find_unlimited, limits, traffic),
        partial(iter, misplaced),
    ]
    tell(1.0, "done")
    return Outcome(
        curves=curves,
        traffic=traffic,
        limits=limits,
        settings=settings,
        line=line,
        neighbourhood=neighbourhood,
        grid=grid,
        planned=planned,
        cant_mm=cant,
        not_compliant=choice.not_compliant & planned,
        proposed=proposed,
        target=target,
        remarks=remarks,
        turnouts=turnouts,
    )
