"""The JSON interface: the same steps as the pages, for programs, with its OpenAPI description."""

from webapp.api import decisions, limits, plans, results, shares, work
from webapp.api.describe import describe
from webapp.api.operations import api

__all__ = ["api", "decisions", "describe", "limits", "plans", "results", "shares", "work"]
