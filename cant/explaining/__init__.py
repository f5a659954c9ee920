"""Why a plan is as it is, in words and in figures that no limit asks for."""

from cant.explaining.explanation import Explanation, explain

__all__ = ["Explanation", "explain"]
