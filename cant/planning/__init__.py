"""From tables to a plan: arrays, rules, one evaluation, and the choice of cants along a chain."""

from cant.planning.governed import what_governs
from cant.planning.live import levels_of, plan_at
from cant.planning.plan import Plan, plan_line

__all__ = ["Plan", "levels_of", "plan_at", "plan_line", "what_governs"]
