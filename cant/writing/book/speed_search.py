"""The permissible speed as a formula: the first multiple of the speed step at which a limit's row fails.

Within one row every rule of a curve by itself holds up to a speed that has a closed form. The row fails first
at the lowest multiple above that speed and above the row's lower edge, unless that lies above its upper edge;
the lowest over all rows, less one step, is the permissible speed. What shared transitions and gaps in the
limits forbid is not in it; where they bind, the sheet holds the plan's speed and says so.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cant.planning.limit_table import LimitAt
from cant.planning.permissible import FASTEST_KMH
from cant.units import GRAVITY_MS2, KMH_PER_MS
from cant.writing.book.frame import Basis, FloatArray
from cant.writing.book.ledger import BoolArray, token
from cant.writing.book.limit_lookup import Asking
from cant.writing.book.selection import IntArray, Selection

NEVER = 1e9
"""Stands for a speed at which nothing fails [as shown]."""

_SLACK = "0.000000001"


@dataclass(frozen=True)
class Critical:
    """The speed up to which a rule holds, as a formula over a limit and as a function of it.

    Attributes
    ----------
    quantity : str
    text : callable
        Takes the text of the limit, canonical, and gives that of the speed [km/h].
    value : callable
        Takes limits [canonical] and gives speeds [km/h].
    """

    quantity: str
    text: Callable[[str], str]
    value: Callable[[FloatArray], FloatArray]


def positive(text: str) -> str:
    """Give the larger of a formula and 0 in a form that works row by row in arrays."""
    return f"(({text})+ABS({text}))/2"


def larger(one: str, two: str) -> str:
    """Give the larger of two formulas, row by row."""
    return f"(({one})+({two})+ABS(({one})-({two})))/2"


def deficiency(cant: str, radius: str, basis: Basis, cant_mm: FloatArray, radius_m: FloatArray) -> Critical:
    """Give the speed at which cant deficiency reaches a limit; the jump without a transition has no cant."""
    constant = basis.inputs.settings.constant

    def value(limit: FloatArray) -> FloatArray:
        return np.asarray(np.sqrt(np.maximum(cant_mm + limit, 0.0) * radius_m / constant))

    def text(limit: str) -> str:
        return f"SQRT({positive(f'{cant}+{limit}')}*{radius}/{basis.C})"

    return Critical("cant deficiency", text, value)


def jump(radius: str, basis: Basis, radius_m: FloatArray) -> Critical:
    """Give the speed at which the abrupt change of deficiency reaches a limit."""
    found = deficiency("0", radius, basis, np.zeros(radius_m.shape), radius_m)
    return Critical("abrupt change of cant deficiency", found.text, found.value)


def felt(
    cant: str, radius: str, roll: str, basis: Basis, arrays: tuple[FloatArray, FloatArray, FloatArray]
) -> Critical:
    """Give the speed at which the felt acceleration reaches a limit; arrays are cant, radius and roll."""
    cant_mm, radius_m, rolls = arrays
    plain = deficiency(cant, radius, basis, cant_mm, radius_m)
    spacing = basis.inputs.settings.spacing_mm
    return Critical(
        "felt acceleration",
        lambda limit: plain.text(f"{limit}*{basis.e}/({basis.g}*(1+{roll}))"),
        lambda limit: plain.value(limit * spacing / (GRAVITY_MS2 * (1.0 + rolls))),
    )


def cant_rate(
    change: str, ramp: str, cant_mm: FloatArray, ramp_m: FloatArray, factor: FloatArray
) -> Critical:
    """Give the speed at which the rate of change of cant reaches a limit."""

    def value(limit: FloatArray) -> FloatArray:
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(cant_mm > 0, KMH_PER_MS * ramp_m * limit / (factor * cant_mm), NEVER)

    def text(limit: str) -> str:
        return f"3.6*{ramp}*{limit}/({token('k')}*({change}+({change}=0)*1E-12))"

    return Critical("rate of change of cant", text, value)


def deficiency_rate(
    cells: tuple[str, str, str],
    basis: Basis,
    arrays: tuple[FloatArray, FloatArray, FloatArray, FloatArray],
) -> Critical:
    """Give the speed at which the rate of change of deficiency reaches a limit: the root of a cubic.

    ``(C V^2 / R - D) V = 3.6 L limit / k`` is ``V^3 - 3 p V - 2 h = 0`` with ``p = D R / (3 C)`` and
    ``h = 1.8 L limit R / (k C)``; Cardano's formula for ``h^2 >= p^3``, else its form with angles.

    Parameters
    ----------
    cells : tuple of str
        Cant, radius and length, canonical.
    basis : Basis
    arrays : tuple of ndarray
        Cant, radius, length, and peak factor.
    """
    cant, radius, length = cells
    cant_mm, radius_m, length_m, factor = arrays
    constant = basis.inputs.settings.constant

    def value(limit: FloatArray) -> FloatArray:
        p = cant_mm * radius_m / (3.0 * constant)
        h = 1.8 * length_m * limit * radius_m / (factor * constant)
        with np.errstate(divide="ignore", invalid="ignore"):
            over = h * h - p**3
            root = np.sqrt(np.maximum(over, 0.0))
            by_roots = np.cbrt(h + root) + np.cbrt(np.maximum(h - root, 0.0))
            by_angle = 2 * np.sqrt(p) * np.cos(np.arccos(np.minimum(h / p**1.5, 1.0)) / 3)
            return np.where(over >= 0, by_roots, by_angle)

    def text(limit: str) -> str:
        p = f"({cant}*{radius}/(3*{basis.C}))"
        h = f"(1.8*{length}*{limit}*{radius}/({token('k')}*{basis.C}))"
        over = f"({h}^2-{p}^3)"
        root = f"SQRT({positive(over)})"
        by_roots = f"(({h}+{root})^(1/3)+({positive(f'{h}-{root}')})^(1/3))"
        ratio = f"({h}/({p}^1.5+({p}=0)))"
        # A little below 1, so that rounding never takes it out of the range of the arc cosine.
        bounded = f"(({ratio}+1-ABS({ratio}-1))/2-1E-12)"
        by_angle = f"2*SQRT({p})*COS(ACOS({bounded})/3)"
        return f"(({over}>=0)*{by_roots}+({over}<0)*{by_angle})"

    return Critical("rate of change of cant deficiency", text, value)


class SpeedSearch:
    """Writes and evaluates where the rows of the limits fail.

    Parameters
    ----------
    basis : Basis
    last : ndarray of bool, shape (curves,)
        Where exceptional values count in the last tier allowed.
    """

    def __init__(self, basis: Basis, last: BoolArray) -> None:
        self._basis = basis
        self._chosen: Selection = basis.chosen
        self._last = last
        self._shown = basis.inputs.display["speed exact"]

    # -- formulas ------------------------------------------------------------------------------------------

    def failing_text(self, critical: Critical, asking: Asking, step: str) -> str:
        """Give the formula of the first multiple of the step at which a row fails."""
        limits = self._basis.limits
        if not limits.has(critical.quantity):
            return f"{NEVER:.0f}"
        speed = self._speed_text(critical, asking)
        over, up_to = limits.speed_edges(critical.quantity)
        begin = larger(speed, over) if over else speed
        multiple = f"(INT({begin}/{step}+{_SLACK})+1)*{step}"
        conditions = limits.conditions(critical.quantity, asking, speed=False)
        if up_to:
            conditions = f'({conditions}*((({up_to}="")+({multiple}<={up_to}+{_SLACK}))>0))'
        return f"IFERROR(_xlfn.AGGREGATE(15,6,{multiple}/{conditions},1),{NEVER:.0f})"

    def broken_text(self, critical: Critical, asking: Asking) -> str:
        """Give the formula that is 1 where a row fails at the planned speed, else 0."""
        limits = self._basis.limits
        if not limits.has(critical.quantity):
            return "0"
        speed = self._speed_text(critical, asking)
        conditions = limits.conditions(critical.quantity, asking)
        over = f"({asking.speed}>{speed}+{_SLACK})"
        return f"IFERROR(_xlfn.AGGREGATE(15,6,1/({conditions}*{over}),1),0)"

    def _speed_text(self, critical: Critical, asking: Asking) -> str:
        limits, inputs = self._basis.limits, self._basis.inputs
        limit = f"({limits.values(critical.quantity, asking)}+{limits.band(critical.quantity, 'tolerance')})"
        kind = limits.kind(critical.quantity)
        return inputs.shown(critical.text(f"({inputs.canonical(limit, kind)})"), "speed exact")

    # -- values --------------------------------------------------------------------------------------------

    def _limit(self, quantity: str, speed_kmh: FloatArray, at: IntArray) -> LimitAt:
        last = self._last[self._chosen.pos[at]]
        loose, normal = (self._chosen.limit(quantity, speed_kmh, which, at) for which in (True, False))
        return LimitAt(
            np.where(last, loose.value, normal.value),
            np.where(last, loose.tolerance, normal.tolerance),
            np.where(last, loose.row, normal.row),
            normal.gap,
        )

    def failing(
        self, critical: Critical, at: IntArray, step_kmh: FloatArray, there: npt.ArrayLike = True
    ) -> FloatArray:
        """Give the first multiple of the step at which a rule fails [km/h], NEVER where it does not.

        Parameters
        ----------
        critical : Critical
        at : ndarray of int
            Entries of the selection.
        step_kmh : ndarray
        there : array_like of bool
            Where the rule applies.
        """
        first = np.full(len(at), np.inf)
        low = 0.0
        for high in self._chosen.line.table.bands(critical.quantity).tolist():
            inside = np.full(len(at), high if np.isfinite(high) else low + 1.0)
            limit = self._limit(critical.quantity, inside, at)
            with np.errstate(invalid="ignore"):
                speed = critical.value(np.where(np.isfinite(limit.value), limit.value + limit.tolerance, 1e9))
            multiple = (np.floor(np.fmax(speed, low) / step_kmh + 1e-9) + 1.0) * step_kmh
            fails = np.isfinite(limit.value) & (multiple <= high + 1e-9)
            first = np.where(fails, np.minimum(first, multiple), first)
            low = high
        return np.where(np.asarray(there, dtype=np.bool_) & (first < NEVER / 100), first, np.inf)

    def broken(
        self, critical: Critical, at: IntArray, planned_kmh: FloatArray, there: npt.ArrayLike = True
    ) -> BoolArray:
        """Tell where a rule fails at the planned speed."""
        limit = self._limit(critical.quantity, planned_kmh, at)
        with np.errstate(invalid="ignore"):
            speed = critical.value(np.where(np.isfinite(limit.value), limit.value + limit.tolerance, 1e9))
            over = np.isfinite(limit.value) & (planned_kmh > speed + 1e-9)
        return np.asarray(over & np.asarray(there, dtype=np.bool_))

    def shown(self, failing_kmh: FloatArray) -> FloatArray:
        """Give failing speeds as shown, canonical again: NEVER means the same in every unit."""
        return np.where(np.isfinite(failing_kmh), failing_kmh, NEVER / self._shown.factor)


def permissible(
    failing_kmh: FloatArray, step_kmh: FloatArray, planned_kmh: FloatArray, broken: BoolArray
) -> FloatArray:
    """Give the permissible speed by the curve's own rules [km/h]."""
    fastest = np.floor(FASTEST_KMH / step_kmh + 1e-9) * step_kmh
    multiple = np.minimum(failing_kmh - step_kmh, fastest)
    return np.where(broken, multiple, np.maximum(multiple, planned_kmh))
