"""The tables put into the arrays of a line: words become codes, rows of traffic columns of classes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import numpy.typing as npt

from cant.model.curves import DOES_NOT_RUN, CurveList
from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic, TrainClass
from cant.model.turnouts import Turnout
from cant.planning.branches import TURNOUT, make_branches
from cant.planning.chainages import shape_factors
from cant.planning.limit_table import NO_CATEGORY, LimitTable
from cant.planning.line import Line, column, take_curves
from cant.planning.neighbours import Neighbourhood

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]


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
    categories = sorted({row.category for row in traffic.rows} | {t.category for t in turnouts if t.category})
    code = {word: number for number, word in enumerate(categories)}
    kinds = _Situations(curves)
    of_turnout = {i: kinds.with_turnout(i) for i in placed or {}}
    table = LimitTable(limits, settings, categories, kinds.words, kinds.exceptional)
    trains = _spread_traffic(curves, traffic, code, neighbourhood.track)
    planned = _planned_speeds(curves, traffic.class_names, trains.speed_kmh)
    runs = trains.runs & ~np.isnan(planned)
    planned[~runs] = np.nan
    lengths = (neighbourhood.transition_m, neighbourhood.ramp_m)
    only = _only_cants(curves)
    return Line(
        table=table,
        constant=settings.constant,
        spacing_mm=settings.spacing_mm,
        radius_m=column(curves.radius_m),
        hand=column(curves.hand),
        situation=kinds.codes[:, None],
        cant_today_mm=column(curves.cant_mm),
        at_most_mm=column(np.where(np.isnan(curves.cant_at_most_mm), np.inf, curves.cant_at_most_mm)),
        at_least_mm=column(np.where(np.isnan(curves.cant_at_least_mm), -np.inf, curves.cant_at_least_mm)),
        weight_length_m=column(neighbourhood.weight_length_m),
        factor=column(shape_factors(curves)),
        transition_m=(column(lengths[0][0]), column(lengths[0][1])),
        ramp_m=(column(lengths[1][0]), column(lengths[1][1])),
        fixed=~np.isnan(column(only)),
        only_mm=column(only),
        runs=runs,
        regular=_binding_excess(curves, traffic.class_names, trains.regular) & runs,
        planned_kmh=planned,
        trains=trains.trains,
        mass_t=trains.mass_t,
        roll=trains.roll,
        gravity_height_m=trains.gravity_height_m,
        category=np.where(runs, trains.category, NO_CATEGORY),
        kind=np.where(runs, trains.kind, NO_CATEGORY),
        branches=(
            make_branches(turnouts, dict(placed), curves, settings.constant, code, of_turnout)
            if placed
            else None
        ),
    )


class _Situations:
    """Codes for sets of situation words, apart where exceptional values may not be used."""

    def __init__(self, curves: CurveList) -> None:
        allowed = curves.exceptional_allowed
        self._curves = curves
        self._allowed = np.ones(len(curves), dtype=np.bool_) if allowed is None else allowed
        number = {words: i for i, words in enumerate(dict.fromkeys(curves.situations))}
        of_words = np.fromiter(map(number.__getitem__, curves.situations), np.int64, len(curves))
        found, codes = np.unique(2 * of_words + self._allowed, return_inverse=True)
        every = list(number)
        self.codes: IntArray = codes.astype(np.int64)
        self._kinds = [(every[kind // 2], bool(kind % 2)) for kind in found.tolist()]

    def with_turnout(self, curve: int) -> int:
        """Give the code of a curve's words with the word for a turnout besides."""
        kind = (self._curves.situations[curve] | {TURNOUT}, bool(self._allowed[curve]))
        if kind not in self._kinds:
            self._kinds.append(kind)
        return self._kinds.index(kind)

    @property
    def words(self) -> list[frozenset[str]]:
        return [words for words, _ in self._kinds]

    @property
    def exceptional(self) -> list[bool]:
        return [allowed for _, allowed in self._kinds]


def _only_cants(curves: CurveList) -> FloatArray:
    """Give the one cant of a curve that is fixed or held [mm], shape (n,); nan elsewhere."""
    fixed = np.where(curves.cant_fixed, curves.cant_mm, np.nan)
    if curves.held_mm is None:
        return fixed
    return np.where(np.isnan(curves.held_mm), fixed, curves.held_mm)


class _Trains:
    """The classes that run on some curves or tracks, (n, k) each."""

    def __init__(self, n: int, k: int) -> None:
        self.runs = np.zeros((n, k), dtype=np.bool_)
        self.regular = np.zeros((n, k), dtype=np.bool_)
        self.category = np.full((n, k), NO_CATEGORY, dtype=np.int64)
        self.kind = np.full((n, k), NO_CATEGORY, dtype=np.int64)
        self.speed_kmh, self.trains, self.mass_t, self.roll, self.gravity_height_m = (
            np.full((n, k), np.nan) for _ in range(5)
        )

    def put(self, at: tuple[int, int], train: TrainClass, category: int, kind: int) -> None:
        """Enter a class in one place."""
        self.runs[at] = True
        self.regular[at] = train.regular
        self.category[at] = category
        self.kind[at] = kind
        for array, value in (
            (self.speed_kmh, train.speed_kmh),
            (self.trains, train.trains_per_day),
            (self.mass_t, train.mass_t),
            (self.roll, train.roll_coefficient),
            (self.gravity_height_m, train.centre_of_gravity_m),
        ):
            if value is not None:
                array[at] = value

    def spread(self, places: IntArray) -> _Trains:
        """Give what is entered at some places."""
        spread = _Trains(0, 0)
        for name, array in vars(self).items():
            setattr(spread, name, take_curves(array, places))
        return spread


def _spread_traffic(curves: CurveList, traffic: Traffic, code: dict[str, int], track: IntArray) -> _Trains:
    """Find the trains of each line and track once, and spread them over its curves."""
    at = {name: j for j, name in enumerate(traffic.class_names)}
    _, first = np.unique(track, return_index=True)
    of_track = _Trains(len(first), len(at))
    kinds: dict[tuple[str, float | None], int] = {}
    for number, curve in enumerate(first.tolist()):
        for name, train in traffic.on(curves.line[curve], curves.track[curve]).items():
            kind = kinds.setdefault((train.category, train.roll_coefficient), len(kinds))
            of_track.put((number, at[name]), train, code[train.category], kind)
    return of_track.spread(track)


def _planned_speeds(curves: CurveList, names: list[str], class_kmh: FloatArray) -> FloatArray:
    """Give planned speeds, shape (n, k) [km/h]; nan where the class does not run or no speed is known."""
    planned = np.fmin(class_kmh, curves.speed_kmh[:, None])
    planned[np.isnan(class_kmh)] = np.nan
    for j, name in enumerate(names):
        given = curves.class_speeds.get(name)
        if given is not None:
            stated = np.where(given == DOES_NOT_RUN, np.nan, given)
            planned[:, j] = np.where(np.isnan(given), planned[:, j], stated)
    return planned


def _binding_excess(curves: CurveList, names: list[str], regular: BoolArray) -> BoolArray:
    """Tell which classes' excess binds, (n, k): not where a decision waives it."""
    binding = regular.copy(order="K")
    for j, name in enumerate(names):
        if name in curves.excess_waived:
            binding[:, j] &= ~curves.excess_waived[name]
    return binding
