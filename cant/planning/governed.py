"""Which quantity bounds the cant of which curves: for a filter over a whole line, without making records."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from cant.planning.governing import bounds
from cant.planning.plan import Plan

BoolArray = npt.NDArray[np.bool_]


def what_governs(plan: Plan) -> dict[str, BoolArray]:
    """Tell where each quantity makes the lower or the upper bound of a curve's own cant.

    Parameters
    ----------
    plan : Plan
        Of n curves.

    Returns
    -------
    dict of str to ndarray of bool, shape (n,)
        By quantity, in alphabetical order; as ``lower_by`` and ``upper_by`` of the records name them. A
        quantity that governs nowhere is left out.
    """
    outcome = plan.outcome
    n = len(plan.curves)
    found: dict[str, BoolArray] = {}
    tiers = (False, True) if outcome.settings.allows_exceptional else (False,)
    for exceptional in tiers:
        where = outcome.planned.copy()
        if len(tiers) > 1:
            where &= outcome.exceptional == exceptional
        for side in bounds(outcome.line, exceptional):
            for number, rule in enumerate(side.rules):
                here = where & (side.rule == number)
                if here.any():
                    found[rule.quantity] = found.get(rule.quantity, np.zeros(n, dtype=np.bool_)) | here
    return dict(sorted(found.items()))
