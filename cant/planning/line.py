"""A line as arrays: curves by classes of train, every number the rules need, in one place.

Shapes: n curves, k classes, m shared transitions. Arrays of a curve are (n, 1), of a class on a curve (n, k),
so that they broadcast with trial axes put in front. The axis order is always trial, curve, class.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.model.curves import DOES_NOT_RUN, SHAPES, CurveList
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.model.turnouts import Turnout
from cant.planning.branches import TURNOUT, Branches, make_branches
from cant.planning.limit_table import NO_CATEGORY, BandedLimit, BandedLimits, LimitAt, LimitTable
from cant.planning.neighbours import Neighbourhood

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


_OF_CLASS = (
    "runs",
    "regular",
    "planned_kmh",
    "trains",
    "mass_t",
    "roll",
    "gravity_height_m",
    "category",
)


@dataclass
class Line:
    """Curves and classes as arrays.

    Attributes
    ----------
    table : LimitTable
        The limits over this line's categories and situations.
    constant, spacing_mm : float
        C [mm, km/h, m] and e [mm].
    radius_m, cant_today_mm, at_most_mm, at_least_mm, weight_length_m, factor : ndarray, shape (n, 1)
        Radius, today's cant, bounds of the site (inf and -inf where none), length that weighs, and peak over
        mean gradient of the transitions.
    hand : ndarray, shape (n, 1)
        1 left, -1 right, 0 not known.
    situation : ndarray of int, shape (n, 1)
        Code of the set of situation words.
    transition_m, ramp_m : tuple of two ndarrays, shape (n, 1)
        At each end, to a straight; nan where not known or shared.
    fixed : ndarray of bool, shape (n, 1)
        The cant is not chosen: today's may not be changed, or one is held by hand.
    only_mm : ndarray, shape (n, 1)
        The one cant of such a curve; nan elsewhere.
    runs, regular : ndarray of bool, shape (n, k)
        Whether the class runs there, and whether its excess binds.
    planned_kmh, trains, mass_t, roll, gravity_height_m : ndarray, shape (n, k)
        nan where not known or the class does not run.
    category : ndarray of int, shape (n, k)
        Code of the class's category, NO_CATEGORY where it does not run.
    branches : Branches or None
        Branches of turnouts that lie in the curves; None where there is none at all.
    banded : BandedLimits or None
        Limits looked up by band of speed: only on a line small enough, see :meth:`with_bands`.
    """

    table: LimitTable
    constant: float
    spacing_mm: float
    radius_m: FloatArray
    hand: FloatArray
    situation: IntArray
    cant_today_mm: FloatArray
    at_most_mm: FloatArray
    at_least_mm: FloatArray
    weight_length_m: FloatArray
    factor: FloatArray
    transition_m: tuple[FloatArray, FloatArray]
    ramp_m: tuple[FloatArray, FloatArray]
    fixed: BoolArray
    only_mm: FloatArray
    runs: BoolArray
    regular: BoolArray
    planned_kmh: FloatArray
    trains: FloatArray
    mass_t: FloatArray
    roll: FloatArray
    gravity_height_m: FloatArray
    category: IntArray
    branches: Branches | None = None
    banded: BandedLimits | None = None

    def __len__(self) -> int:
        return len(self.radius_m)

    @property
    def classes(self) -> int:
        """Number of classes k."""
        return int(self.runs.shape[1])

    def take(self, indices: npt.ArrayLike) -> Line:
        """Give some of the curves, in that order (arrays copied)."""
        at = np.asarray(indices)
        chosen: dict[str, Any] = {}
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                chosen[item.name] = value[at]
            elif isinstance(value, tuple):
                chosen[item.name] = tuple(array[at] for array in value)
            elif isinstance(value, (Branches, BandedLimits)):
                chosen[item.name] = value.take(at)
            else:
                chosen[item.name] = value
        return Line(**chosen)

    def limit(self, quantity: str, speed_kmh: FloatArray, exceptional: bool) -> LimitAt:
        """Ask a quantity's limit for each class at speeds (..., n, k) [km/h]."""
        if self.banded is not None:
            return self.banded[quantity, exceptional].at(speed_kmh)
        return self.table.at(
            quantity,
            exceptional=exceptional,
            category=self.category,
            situation=self.situation,
            speed=speed_kmh,
            radius=self.radius_m,
        )

    def with_bands(self) -> Line:
        """Give the same curves with their limits in every band: worth it where a few are asked often."""

        def find(key: tuple[str, bool]) -> BandedLimit:
            quantity, exceptional = key
            upper = self.table.bands(quantity)
            # Any speed of a band will do; above the last edge one more km/h.
            asked = np.where(np.isfinite(upper), upper, np.append(upper, 0.0)[len(upper) - 2] + 1.0)
            limit = self.limit(quantity, asked[:, None, None], exceptional)
            return BandedLimit.of(upper, limit, (len(upper), len(self), self.classes))

        return replace(self, banded=BandedLimits(find))

    def unfold(self, curves: IntArray, columns: IntArray) -> Line:
        """Give some classes on some curves, each as a curve of its own with one class."""
        chosen = self.take(curves)
        at = np.arange(len(curves))
        for name in _OF_CLASS:
            setattr(chosen, name, getattr(chosen, name)[at, columns][:, None])
        if chosen.banded is not None:
            chosen.banded = chosen.banded.unfold(columns)
        return chosen

    def take_classes(self, columns: IntArray) -> Line:
        """Give the same curves with some of the classes only."""
        chosen: dict[str, Any] = {item.name: getattr(self, item.name) for item in fields(self)}
        for name in _OF_CLASS:
            chosen[name] = chosen[name][:, columns]
        if self.banded is not None:
            chosen["banded"] = self.banded.take_classes(columns)
        return Line(**chosen)

    def set_ends(self, neighbourhood: Neighbourhood) -> None:
        """Take over how the curves meet."""
        transition, ramp = neighbourhood.transition_m, neighbourhood.ramp_m
        self.transition_m = (_column(transition[0]), _column(transition[1]))
        self.ramp_m = (_column(ramp[0]), _column(ramp[1]))

    @property
    def without_trains(self) -> BoolArray:
        """Whether no class at all runs on the curve, shape (n, 1)."""
        return np.asarray(np.logical_not(self.runs.any(axis=-1, keepdims=True)))

    @property
    def moving(self) -> BoolArray:
        """Whether the class runs there at more than 0 km/h, shape (n, k)."""
        return self.runs & (self.planned_kmh > 0)


def _column(values: npt.ArrayLike) -> FloatArray:
    return np.asarray(values, dtype=np.float64)[:, None]


def make_line(
    curves: CurveList,
    traffic: Traffic,
    limits: LimitSet,
    settings: Settings,
    neighbourhood: Neighbourhood,
    turnouts: Sequence[Turnout] = (),
    placed: Mapping[int, list[int]] | None = None,
) -> Line:
    """Put the tables into arrays.

    Parameters
    ----------
    curves : CurveList
        n rows; the numbers of a rejected row may be nan.
    traffic : Traffic
        k classes.
    limits : LimitSet
    settings : Settings
    neighbourhood : Neighbourhood
        How the same curves meet.
    turnouts : sequence of Turnout
    placed : mapping, optional
        The turnouts of each curve, as :func:`cant.planning.branches.place_turnouts` gives them.

    Returns
    -------
    Line
    """
    n, names = len(curves), traffic.class_names
    k = len(names)
    allowed = curves.exceptional_allowed
    tier = np.ones(n, dtype=np.bool_) if allowed is None else allowed
    known: dict[tuple[frozenset[str], bool], int] = {}
    situation = np.array(
        [
            known.setdefault(key, len(known))
            for key in zip(curves.situations, (bool(t) for t in tier), strict=True)
        ],
        dtype=np.int64,
    )
    at_turnout = {
        i: known.setdefault((curves.situations[i] | {TURNOUT}, bool(tier[i])), len(known))
        for i in (placed or {})
    }
    categories = sorted({row.category for row in traffic.rows} | {t.category for t in turnouts if t.category})
    table = LimitTable(
        limits, settings, categories, [words for words, _ in known], [allows for _, allows in known]
    )
    of_class = _TrafficArrays(n, k)
    _fill_traffic(of_class, curves, traffic, categories)
    planned = _planned_speeds(curves, names, of_class.speed)
    of_class.runs &= ~np.isnan(planned)
    for j, name in enumerate(names):
        if name in curves.excess_waived:
            of_class.regular[:, j] &= ~curves.excess_waived[name]
    lengths = (neighbourhood.transition_m, neighbourhood.ramp_m)
    only = np.where(curves.cant_fixed, curves.cant_mm, np.nan)
    if curves.held_mm is not None:
        only = np.where(np.isnan(curves.held_mm), only, curves.held_mm)
    return Line(
        table=table,
        constant=settings.constant,
        spacing_mm=settings.spacing_mm,
        radius_m=_column(curves.radius_m),
        hand=_column(curves.hand),
        situation=situation[:, None],
        cant_today_mm=_column(curves.cant_mm),
        at_most_mm=_column(np.where(np.isnan(curves.cant_at_most_mm), np.inf, curves.cant_at_most_mm)),
        at_least_mm=_column(np.where(np.isnan(curves.cant_at_least_mm), -np.inf, curves.cant_at_least_mm)),
        weight_length_m=_column(neighbourhood.weight_length_m),
        factor=_column([SHAPES[name] for name in curves.shape]),
        transition_m=(_column(lengths[0][0]), _column(lengths[0][1])),
        ramp_m=(_column(lengths[1][0]), _column(lengths[1][1])),
        fixed=_column(~np.isnan(only)) > 0,
        only_mm=_column(only),
        runs=of_class.runs,
        regular=of_class.regular & of_class.runs,
        planned_kmh=np.where(of_class.runs, planned, np.nan),
        trains=of_class.trains,
        mass_t=of_class.mass,
        roll=of_class.roll,
        gravity_height_m=of_class.gravity_height,
        category=np.where(of_class.runs, of_class.category, NO_CATEGORY),
        branches=(
            make_branches(
                turnouts,
                dict(placed),
                curves,
                settings.constant,
                {word: code for code, word in enumerate(categories)},
                at_turnout,
            )
            if placed
            else None
        ),
    )


class _TrafficArrays:
    """The traffic table spread over curves, (n, k) each."""

    def __init__(self, n: int, k: int) -> None:
        self.runs = np.zeros((n, k), dtype=np.bool_)
        self.regular = np.zeros((n, k), dtype=np.bool_)
        self.category = np.full((n, k), NO_CATEGORY, dtype=np.int64)
        self.speed, self.trains, self.mass, self.roll, self.gravity_height = (
            np.full((n, k), np.nan) for _ in range(5)
        )

    def put(self, rows: npt.ArrayLike, column: int, train: TrainClass, category: int) -> None:
        """Enter a class on some curves."""
        at = (np.asarray(rows), column)
        self.runs[at] = True
        self.regular[at] = train.regular
        self.category[at] = category
        for array, value in (
            (self.speed, train.speed_kmh),
            (self.trains, train.trains_per_day),
            (self.mass, train.mass_t),
            (self.roll, train.roll_coefficient),
            (self.gravity_height, train.centre_of_gravity_m),
        ):
            if value is not None:
                array[at] = value


def _fill_traffic(arrays: _TrafficArrays, curves: CurveList, traffic: Traffic, categories: list[str]) -> None:
    groups: dict[tuple[str, str], list[int]] = {}
    for index, key in enumerate(zip(curves.line, curves.track, strict=True)):
        groups.setdefault(key, []).append(index)
    column = {name: j for j, name in enumerate(traffic.class_names)}
    code = {word: j for j, word in enumerate(categories)}
    for (line, track), members in groups.items():
        for name, train in traffic.on(line, track).items():
            arrays.put(members, column[name], train, code[train.category])


def _planned_speeds(curves: CurveList, names: list[str], class_speed: FloatArray) -> FloatArray:
    """Give planned speeds, shape (n, k) [km/h]; nan where the class does not run or no speed is known."""
    planned = np.fmin(class_speed, curves.speed_kmh[:, None])
    planned = np.where(np.isnan(class_speed), np.nan, planned)
    for j, name in enumerate(names):
        given = curves.class_speeds.get(name)
        if given is None:
            continue
        stated = ~np.isnan(given)
        planned[stated, j] = np.where(given[stated] == DOES_NOT_RUN, np.nan, given[stated])
    return planned
