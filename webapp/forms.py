"""Fields of a form: text to values, with a message beside each field that cannot be used.

All problems of a form are collected, and what was typed is shown again.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from webapp.measures import Measures

LONGEST_TEXT = 300
LARGEST = 1e8
"""No number of a plan is larger, in any unit; one that is much larger cannot be computed with."""


@dataclass
class Fields:
    """The fields of a form that was sent.

    Attributes
    ----------
    given : mapping of str to str
    measures : Measures
        Units in which the form was shown.
    problems : dict of str to str
        Message by name of the field.
    """

    given: Mapping[str, str]
    measures: Measures
    problems: dict[str, str] = field(default_factory=dict)

    def text(self, name: str, *, words: str = "", needed: bool = False) -> str:
        """Give a text without blanks at its ends; a problem where it is needed and blank, or too long."""
        found = " ".join(self.given.get(name, "").split())
        if needed and not found:
            self.problems[name] = f"{words} is missing"
        if len(found) > LONGEST_TEXT:
            self.problems[name] = f"at most {LONGEST_TEXT} characters"
        if not found.isprintable():
            self.problems[name] = "only printable characters, please"
        return found

    def number(
        self,
        name: str,
        kind: str | None = None,
        *,
        before: float | None = None,
        lowest: float | None = 0.0,
        above: float | None = None,
        unlimited: bool = False,
    ) -> float | None:
        """Give a number in its canonical unit, None where the field is blank.

        Parameters
        ----------
        name : str
            Name of the field.
        kind : str, optional
            Kind of measure; a bare number where there is none.
        before : float, optional
            Value that the form was shown with: kept to the last digit where the text was not changed.
        lowest, above : float, optional
            The number may not be below ``lowest``; it must be over ``above``.
        unlimited : bool
            Whether the word ``none`` is taken for infinity.
        """
        text = self.given.get(name, "").strip()
        if not text:
            return None
        if unlimited and text.casefold() == "none":
            return math.inf
        if before is not None and text == self.shown(before, kind):
            return before
        try:
            value = float(text.replace("\u2212", "-").replace(",", "."))
        except ValueError:
            value = math.nan
        if not math.isfinite(value):
            other = ", or the word none" if unlimited else ""
            self.problems[name] = f"'{text[:40]}' is not a number; write one such as 95 or 1.25{other}"
            return None
        if abs(value) > LARGEST:
            self.problems[name] = f"must be below {LARGEST:.0f}"
        if lowest is not None and value < lowest:
            self.problems[name] = f"may not be below {lowest:g}"
        if above is not None and value <= above:
            self.problems[name] = f"must be above {above:g}"
        return value if kind is None else self.measures.canonical(kind, value)

    def choice(self, name: str, choices: tuple[str, ...], default: str) -> str:
        """Give one of some words; a problem where it is none of them."""
        found = self.given.get(name, default)
        if found not in choices:
            self.problems[name] = f"choose one of: {', '.join(choices)}"
            return default
        return found

    def yes(self, name: str) -> bool:
        """Tell whether a box was ticked."""
        return bool(self.given.get(name))

    def shown(self, value: float | None, kind: str | None = None) -> str:
        """Give a value as a field shows it."""
        if value is not None and math.isinf(value):
            return "none"
        if kind is None:
            return "" if value is None else f"{round(value, 6):.10g}"
        return self.measures.field(kind, value)
