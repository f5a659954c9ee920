"""From tables to a plan: arrays, rules, one evaluation, and the choice of cants along a chain."""

from cant.planning.plan import Plan, plan_line

__all__ = ["Plan", "plan_line"]
