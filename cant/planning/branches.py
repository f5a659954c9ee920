"""Turnouts that lie in curves: what their branches ask of the main line's cant.

The branch lies on the main line's cant D. Its curvature is the sum of the two signed curvatures; where it
curves against the main line, D is negative cant for it. At the planned branch speed::

    with the main line     D_EQ - D <= deficiency limit      D - D_EQ <= excess limit
    against it             D_EQ + D <= deficiency limit
    straight branch        D <= deficiency limit             D <= excess limit

The limits are those of the branch's category (of the strictest where it has none) at the branch's speed and
radius, with the situation words of the curve and the word ``turnout`` besides. No lower speed on the main
line mends what the branch asks.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
import numpy.typing as npt

from cant.model.curves import HAND_UNKNOWN, LEFT, RIGHT, CurveList
from cant.model.plan import Finding
from cant.model.turnouts import Turnout
from cant.planning.limit_table import NO_CATEGORY, LimitAt, LimitTable
from cant.quantities.kinematics import equilibrium_cant
from cant.quantities.turnouts import branch_curvature, curvature

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

TURNOUT = "turnout"
"""Situation word that holds for a branch."""
ANY_CATEGORY = -2
"""Category code of a branch whose category is not stated: the strictest of all counts."""
_STRAIGHT_M = 1e9
_STRAIGHT_PER_M = 1e-9


@dataclass
class Branches:
    """The branches in the curves of a line; arrays (n, t), t the most turnouts that one curve has.

    Attributes
    ----------
    number : ndarray of int
        Index of the turnout, -1 where there is none.
    sense : ndarray
        1 the branch curves with the main line, -1 against it, 0 it is straight.
    radius_m, speed_kmh, needed_mm : ndarray
        Radius of the branch, its speed, and its equilibrium cant.
    category, situation : ndarray of int
        Codes for the limit table.
    """

    number: IntArray
    sense: FloatArray
    radius_m: FloatArray
    speed_kmh: FloatArray
    needed_mm: FloatArray
    category: IntArray
    situation: IntArray

    @property
    def there(self) -> BoolArray:
        """Where there is a turnout, shape (n, t)."""
        return self.number >= 0

    def take(self, indices: npt.ArrayLike) -> Branches:
        """Give the branches of some curves."""
        at = np.asarray(indices)
        return Branches(**{item.name: getattr(self, item.name)[at] for item in fields(self)})

    def limit(self, table: LimitTable, quantity: str, exceptional: bool) -> LimitAt:
        """Give the limit of each branch, shape (n, t)."""
        found = self._asked(table, quantity, exceptional, self.category)
        open_ = self.category == ANY_CATEGORY
        if open_.any():
            for code in range(table.categories):
                other = self._asked(table, quantity, exceptional, np.full(self.category.shape, code))
                stricter = open_ & (other.value < found.value)
                found = LimitAt(
                    np.where(stricter, other.value, found.value),
                    np.where(stricter, other.tolerance, found.tolerance),
                    np.where(stricter, other.row, found.row),
                    found.gap | (open_ & other.gap),
                )
        return found

    def _asked(self, table: LimitTable, quantity: str, exceptional: bool, category: IntArray) -> LimitAt:
        return table.at(
            quantity,
            exceptional=exceptional,
            category=np.where(category == ANY_CATEGORY, NO_CATEGORY, category),
            situation=self.situation,
            speed=self.speed_kmh,
            radius=self.radius_m,
        )


def place_turnouts(
    turnouts: Sequence[Turnout], curves: CurveList
) -> tuple[dict[int, list[int]], list[Finding]]:
    """Find the curve in which each turnout lies.

    Parameters
    ----------
    turnouts : sequence of Turnout
    curves : CurveList

    Returns
    -------
    dict of int to list of int
        Turnouts of a curve, by its index. A turnout in a transition counts with the curve's full curvature.
    list of Finding
        Turnouts that lie in no curve, or in more than one, or in one whose hand is not known.
    """
    placed: dict[int, list[int]] = {}
    findings = []
    usable = ~curves.rejected & np.isfinite(curves.radius_m)
    for number, turnout in enumerate(turnouts):
        name = turnout.name or (
            f"of row {turnout.place.row}" if turnout.place.row else f"number {number + 1}"
        )
        at = _curves_of(turnout, curves, usable)
        if len(at) != 1:
            where = "no curve" if not at else f"{len(at)} curves"
            text = f"Turnout {name} lies in {where} of the list by its line, track, curve or chainage: "
            findings.append(Finding("turnout-not-placed", "warning", text + "its branch is not checked."))
        elif curves.hand[at[0]] == HAND_UNKNOWN:
            text = f"The hand of the curve is not known: the branch of turnout {name} is not checked."
            findings.append(Finding("turnout-not-checked", "warning", text, at[0]))
        else:
            placed.setdefault(at[0], []).append(number)
    return placed, findings


def _curves_of(turnout: Turnout, curves: CurveList, usable: BoolArray) -> list[int]:
    at = turnout.chainage_km
    if turnout.curve:
        found = [i for i in np.flatnonzero(usable).tolist() if turnout.curve == curves.curve[i]]
    else:
        found = np.flatnonzero(usable & _within(at, curves)).tolist()
    found = [
        i for i in found if turnout.line in ("", curves.line[i]) and turnout.track in ("", curves.track[i])
    ]
    if len(found) > 1 and at is not None:
        in_arc = _within(at, curves, arc=True)
        return [i for i in found if in_arc[i]]
    return found


def _within(chainage_km: float | None, curves: CurveList, arc: bool = False) -> BoolArray:
    """Tell on which curves a chainage lies, shape (n,): within the arc, or within its transitions too."""
    if chainage_km is None:
        return np.zeros(len(curves), dtype=np.bool_)
    turned = curves.start_km > curves.end_km
    ends = np.nan_to_num(np.stack([curves.transition_in_m, curves.transition_out_m])) * (
        0.0 if arc else 0.001
    )
    before, after = np.where(turned, ends[1], ends[0]), np.where(turned, ends[0], ends[1])
    low, high = np.minimum(curves.start_km, curves.end_km), np.maximum(curves.start_km, curves.end_km)
    with np.errstate(invalid="ignore"):
        return np.asarray((low - before - 1e-9 <= chainage_km) & (chainage_km <= high + after + 1e-9))


def make_branches(
    turnouts: Sequence[Turnout],
    placed: dict[int, list[int]],
    curves: CurveList,
    constant: float,
    category_code: dict[str, int],
    situation_code: dict[int, int],
) -> Branches:
    """Put placed turnouts into arrays.

    Parameters
    ----------
    turnouts : sequence of Turnout
    placed : dict
        As :func:`place_turnouts` gives it.
    curves : CurveList
    constant : float
        C [mm, km/h, m].
    category_code : dict of str to int
        Codes of the categories.
    situation_code : dict of int to int
        Code of each such curve's situation words with ``turnout`` besides.
    """
    shape = (len(curves), max(len(numbers) for numbers in placed.values()))
    number = np.full(shape, -1, dtype=np.int64)
    category = np.full(shape, NO_CATEGORY, dtype=np.int64)
    situation = np.zeros(shape, dtype=np.int64)
    speed, bend = np.zeros(shape), np.zeros(shape)
    for i, numbers in placed.items():
        situation[i] = situation_code[i]
        for j, t in enumerate(numbers):
            turnout = turnouts[t]
            hand = LEFT if turnout.hand == "L" else RIGHT
            number[i, j], speed[i, j] = t, turnout.branch_speed_kmh
            category[i, j] = category_code[turnout.category] if turnout.category else ANY_CATEGORY
            bend[i, j] = branch_curvature(
                curvature(curves.radius_m[i], curves.hand[i]), curvature(turnout.radius_m, hand)
            )
    straight = np.abs(bend) < _STRAIGHT_PER_M
    with np.errstate(divide="ignore"):
        radius = np.where(straight, _STRAIGHT_M, 1.0 / np.abs(bend))
    return Branches(
        number=number,
        sense=np.where(straight, 0.0, np.sign(bend) * curves.hand[:, None]),
        radius_m=radius,
        speed_kmh=speed,
        needed_mm=np.where(straight, 0.0, equilibrium_cant(speed, radius, constant)),
        category=category,
        situation=situation,
    )
