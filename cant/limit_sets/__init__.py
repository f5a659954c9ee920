"""Limit sets that come with the program, as data, and the loader that makes them into models.

A set holds what its document says, each value beside its clause, and says what it lacks: nothing is filled
in.
"""

from cant.limit_sets.loading import describe, load, names
from cant.limit_sets.table import as_table, headers

__all__ = ["as_table", "describe", "headers", "load", "names"]
