"""Why a plan is as it is, what would help, what to notice, and figures that no limit asks for."""

from cant.explaining.at_cant import chain_around, records_at
from cant.explaining.decisions import CantHeld, CurveKey, Decision, Inputs, apply, read_decision
from cant.explaining.difference import CurveDifference, Difference
from cant.explaining.explanation import Explanation, explain
from cant.explaining.wording import Words

__all__ = [
    "CantHeld",
    "CurveDifference",
    "CurveKey",
    "Decision",
    "Difference",
    "Explanation",
    "Inputs",
    "Words",
    "apply",
    "chain_around",
    "explain",
    "read_decision",
    "records_at",
]
