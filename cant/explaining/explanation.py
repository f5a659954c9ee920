"""The words of a plan: why this cant, what else to notice.

Apart from the planner because a number is decided once and told in several places: page, workbook, terminal
and JSON all take their sentences from here.
"""

from __future__ import annotations

from collections import defaultdict
from functools import cached_property
from typing import Any

from cant.model.display import Display
from cant.model.plan import Finding
from cant.planning import Plan

_METHOD_WORDS = {"rms": "the equilibrium cant of the rms speed"}


class Explanation:
    """The words of one plan.

    Parameters
    ----------
    plan : Plan
        The decisions to put into words.
    """

    def __init__(self, plan: Plan) -> None:
        self._plan = plan
        self._display = Display(plan.settings.units)

    @cached_property
    def _by_curve(self) -> dict[int | None, list[Finding]]:
        found: dict[int | None, list[Finding]] = defaultdict(list)
        for finding in self._plan.findings:
            found[finding.curve].append(finding)
        return found

    @property
    def plan_findings(self) -> list[Finding]:
        """Findings of the whole plan."""
        return self._by_curve.get(None, [])

    def findings(self, index: int) -> list[Finding]:
        """Give the findings of one curve.

        Parameters
        ----------
        index : int
            Index of the curve in the list.
        """
        return self._by_curve.get(index, [])

    def options(self, index: int) -> list[dict[str, Any]]:
        """Give what would help where nothing fits, each as it could be planned; empty where all fits."""
        return []

    def methods(self, index: int) -> list[dict[str, Any]]:
        """Give what each method would set; empty where they were not compared."""
        return []

    def reason(self, index: int, record: dict[str, Any] | None = None) -> str:
        """Give the reason for a curve's cant in one sentence.

        Parameters
        ----------
        index : int
            Index of a curve that was not rejected.
        record : dict, optional
            Its record, where it is at hand.
        """
        record = record or self._plan.record(index)
        if record["status"] == "not assessed":
            texts = [f.text for f in self.findings(index) if f.severity == "stop"]
            return " ".join(texts) or "Not assessed."
        cant = self._display.text("cant", record["recommended_cant_mm"])
        sentence = f"{cant}: the curve by itself allows {self._range(record)}"
        target = record.get("target_cant_mm")
        if target is not None:
            words = _METHOD_WORDS.get(self._plan.settings.method, f"the method {self._plan.settings.method}")
            sentence += f"; {words} is {self._display.text('cant exact', target)}"
        return sentence + self._consequence(record) + "."

    def _range(self, record: dict[str, Any]) -> str:
        """Say between which cants a curve lies and what makes each bound."""
        parts = []
        for word, key, by in (("from", "lower_mm", "lower_by"), ("to", "upper_mm", "upper_by")):
            if record[key] is not None:
                bound = self._display.text("cant exact", record[key])
                parts.append(f"{word} {bound} ({governing_words(record[by])})")
        return " ".join(parts) or "any cant"

    def _consequence(self, record: dict[str, Any]) -> str:
        """Say what the status rests on."""
        if record["status"] == "restrict":
            slow = [self._slowed(e) for e in record["classes"] if e["run_speed_kmh"] < e["speed_kmh"]]
            return "; no cant serves all classes, so it restricts " + ", ".join(slow)
        if record["status"] == "exceptional":
            passed = dict.fromkeys(entry["quantity"] for entry in record.get("limits_passed", []))
            return "; it needs the exceptional value of " + ", ".join(passed)
        if record["status"] == "not compliant":
            return "; the cant bound to this site keeps no limit that no lower speed can mend"
        if record["status"] == "kept":
            return "; today's cant stays"
        return ""

    def _slowed(self, entry: dict[str, Any]) -> str:
        """Say to what speed a class is restricted, and by what."""
        run, planned = (self._display.text("speed", entry[k]) for k in ("run_speed_kmh", "speed_kmh"))
        return f"{entry['class']} to {run} instead of {planned} ({governing_words(entry['permissible_by'])})"


def governing_words(by: dict[str, Any] | None) -> str:
    """Say what governs: ``cant excess of Freight, clause``."""
    if not by:
        return "no limit"
    words = str(by["quantity"])
    if by.get("class"):
        words += f" of {by['class']}"
    return f"{words}, {by['clause']}" if by.get("clause") else words


def explain(plan: Plan) -> Explanation:
    """Put a plan into words.

    Parameters
    ----------
    plan : Plan
        The decisions.
    """
    return Explanation(plan)
