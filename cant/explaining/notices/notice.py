"""A kind of finding over a whole line: on which curves, with what number, and in what words."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.explaining.wording import Words
from cant.model.plan import Finding, Severity
from cant.planning.outcome import Outcome
from cant.quantities.kinematics import equilibrium_cant

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]
Record = Mapping[str, Any]


@dataclass(frozen=True)
class Notice:
    """One kind of finding.

    Attributes
    ----------
    code : str
        As :class:`cant.model.plan.Finding` has it.
    severity : str
    curves : ndarray of int
        The curves concerned.
    say : callable
        Takes a curve and its record (or None) and gives the short sentence for it.
    whole : str
        One sentence for the whole plan, with the number of curves; "" where each curve says it all.
    clause : callable or None
        Gives the clause of the limit concerned for a curve and its record (or None).
    whole_severity : str
        Where it differs from that of a curve.
    of_plan : bool
        It is told of the plan alone, however many curves it rests on.
    """

    code: str
    severity: Severity
    curves: IntArray
    say: Callable[[int, Record | None], str]
    whole: str = ""
    clause: Callable[[int, Record | None], str] | None = None
    whole_severity: Severity | None = None
    of_plan: bool = False

    def finding(self, curve: int, record: Record | None) -> Finding:
        """Give the finding of one curve."""
        clause = self.clause(curve, record) if self.clause else ""
        return Finding(self.code, self.severity, self.say(curve, record), curve, clause)

    def summary(self) -> Finding | None:
        """Give the finding of the whole plan; None where fewer than two curves are concerned."""
        if not self.whole or (len(self.curves) < 2 and not self.of_plan):
            return None
        return Finding(self.code, self.whole_severity or self.severity, self.whole)


@dataclass
class Scene:
    """A plan as the notices look at it: arrays (n, 1) of curves and (n, k) of classes on them.

    Attributes
    ----------
    outcome : Outcome
    words : Words
    """

    outcome: Outcome
    words: Words
    names: list[str] = field(init=False)

    def __post_init__(self) -> None:
        self.names = self.outcome.traffic.class_names

    @cached_property
    def cant(self) -> FloatArray:
        """Proposed cant [mm], (n, 1); nan where not planned."""
        return self.outcome.cant_mm[:, None]

    @cached_property
    def run(self) -> FloatArray:
        """Speeds run [km/h], (n, k); nan where the class does not run."""
        return np.where(self.outcome.line.runs, self.outcome.proposed.run_kmh, np.nan)

    @cached_property
    def unbalance(self) -> FloatArray:
        """Equilibrium cant less cant [mm], (n, k): deficiency where positive, excess where negative."""
        line = self.outcome.line
        return equilibrium_cant(self.run, line.radius_m, line.constant) - self.cant

    @cached_property
    def change(self) -> FloatArray:
        """Proposed cant less today's [mm], (n,); nan where one of them is not known."""
        return np.asarray(self.outcome.cant_mm - self.outcome.curves.cant_mm)

    def label(self, curve: int) -> str:
        """Name a curve in a sentence on the whole plan."""
        curves = self.outcome.curves
        name = (
            f"curve {curves.curve[curve]}" if curves.curve[curve] else f"the curve of row {curves.row[curve]}"
        )
        return f"{name}, track {curves.track[curve]}" if curves.track[curve] else name

    def side(self, end: int, curve: int) -> str:
        """Say ``in`` or ``out`` of the end at the smaller (0) or greater (1) chainage."""
        turned = bool(self.outcome.neighbourhood.descending[curve])
        return ("out", "in")[end] if turned else ("in", "out")[end]

    def clause(self, row: int) -> str:
        """Give the clause of a row of the limits, "" for none."""
        return self.outcome.limits.rows[row].clause if row >= 0 else ""


def on_curves(found: IntArray) -> str:
    """Begin a sentence on the whole plan: "On 1 curve", "On 12 curves"."""
    return f"On {len(found)} curve{'' if len(found) == 1 else 's'}"


def worst_class(values: FloatArray, where: BoolArray) -> tuple[IntArray, FloatArray]:
    """Give for each curve the class with the largest value of those that count, and that value: (n,)."""
    shown = np.where(where, np.nan_to_num(values, nan=-np.inf), -np.inf)
    if not shown.shape[-1]:
        return np.zeros(len(shown), dtype=np.int64), np.full(len(shown), -np.inf)
    column = shown.argmax(axis=-1).astype(np.int64)
    return column, shown[np.arange(len(shown)), column]


def most(curves: IntArray, values: FloatArray) -> int:
    """Give the curve with the largest value."""
    return int(curves[int(np.argmax(values[curves]))])
