"""One curve at cants of the engineer's choice: its records there, and what its chain would do around one.

What he sees while he moves a cant leaves the neighbours as they are; what he sees when he lets go is planned.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from cant.explaining.decisions import CantHeld, CurveKey
from cant.explaining.difference import CurveDifference, Difference
from cant.explaining.figures import add_figures
from cant.explaining.local import Surroundings, Trial, try_out
from cant.planning import Plan, plan_at


def records_at(plan: Plan, index: int, cants_mm: Sequence[float]) -> list[dict[str, Any]]:
    """Give the record of a curve at other cants, the neighbours held.

    Parameters
    ----------
    plan : Plan
    index : int
        A curve that is planned; KeyError else.
    cants_mm : sequence of float
        Cants [mm].

    Returns
    -------
    list of dict
        As :meth:`Plan.record` gives them, with the figures of :func:`cant.explaining.figures.add_figures`.
    """
    copies, at = plan_at(plan, index, cants_mm)
    records = list(copies.records(at))
    add_figures(copies, at.tolist(), records)
    return records


def chain_around(plan: Plan, index: int, cant_mm: float) -> list[CurveDifference]:
    """Plan the chain of a curve with its cant held, and give each curve of the chain before and after.

    Parameters
    ----------
    plan : Plan
        The plan as it is; it stays so.
    index : int
        A curve that is planned.
    cant_mm : float
        The cant held [mm].

    Returns
    -------
    list of CurveDifference
        The curve, and those that share transitions with it directly or through others, along the line.
    """
    surroundings = Surroundings(plan.outcome)
    held = CantHeld(on=CurveKey.of(plan.curves, index), cant_mm=cant_mm)
    (answer,) = try_out(plan.outcome, surroundings, [Trial(index, [(index, held)])])
    members = surroundings.chain(index)
    pairs = np.array([(curve, answer.at[curve]) for curve in members], dtype=np.int64)
    found = Difference(plan, Plan(answer.outcome), pairs)
    return [found.row(int(i), int(j)) for i, j in pairs]
