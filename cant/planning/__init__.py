"""From tables to a plan: arrays, rules, one evaluation, and the choice of cants along a chain."""
