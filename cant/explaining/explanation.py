"""The words of a plan: why each cant, what would help, what else to notice, what other methods would set.

Apart from the planner because a number is decided once and told in several places: page, workbook, terminal
and JSON all take their sentences from here. Nothing is worked out before somebody asks; who will ask for many
curves says so first (:meth:`Explanation.prepare`), and they are worked out together.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from functools import cached_property
from typing import Any

from cant.explaining.binding import Binding, bindings
from cant.explaining.figures import add_figures
from cant.explaining.local import Surroundings
from cant.explaining.methods import Methods
from cant.explaining.notices import Notice, notices_of
from cant.explaining.notices.everything import repeated
from cant.explaining.options import Options
from cant.explaining.reasons import Reason
from cant.explaining.wording import Words, governing_words
from cant.model.display import Display
from cant.model.plan import Finding
from cant.planning import Plan

__all__ = ["Explanation", "explain", "governing_words"]

Record = dict[str, Any]
_HELD = 4096


class Explanation:
    """The words of one plan, in the units of its settings.

    Parameters
    ----------
    plan : Plan
        The decisions to put into words.
    """

    def __init__(self, plan: Plan) -> None:
        self._plan = plan
        self._words = Words(Display(plan.settings.units))
        surroundings = Surroundings(plan.outcome)
        self._options = Options(plan, self._words, surroundings)
        self._methods = Methods(plan, surroundings, self._words)
        self._bindings: dict[int, Binding] = {}

    def prepare(self, indices: Sequence[int], rest_follows: bool = False) -> None:
        """Get ready to speak of some curves; asked for one by one they would cost far more.

        Parameters
        ----------
        indices : sequence of int
            The curves.
        rest_follows : bool
            They are a block of the whole list, whose other blocks are asked for in turn.
        """
        planned = [i for i in indices if self._plan.outcome.planned[i]]
        self._options.prepare(planned)
        self._methods.prepare(planned, rest_follows)

    def forget(self, indices: Sequence[int]) -> None:
        """Let go of what was worked out for some curves; whoever asks for them again waits again."""
        self._options.forget(indices)
        self._methods.forget(indices)

    @cached_property
    def _of_planner(self) -> dict[int | None, list[Finding]]:
        found: dict[int | None, list[Finding]] = defaultdict(list)
        for finding in self._plan.findings:
            found[finding.curve].append(finding)
        return found

    @cached_property
    def _notices(self) -> list[Notice]:
        return notices_of(self._plan, self._words)

    @cached_property
    def _notices_by_curve(self) -> dict[int, list[Notice]]:
        found: dict[int, list[Notice]] = defaultdict(list)
        for notice in self._notices:
            for curve in notice.curves.tolist():
                found[curve].append(notice)
        return found

    @cached_property
    def plan_findings(self) -> list[Finding]:
        """Findings of the whole plan: what concerns no single curve, and what many curves have in common."""
        summaries = [notice.summary() for notice in self._notices]
        return [
            *self._of_planner.get(None, []),
            *repeated(self._plan.findings),
            *(finding for finding in summaries if finding is not None),
        ]

    def listed(self) -> list[tuple[int, int, str, str]]:
        """List the findings of all curves without their words, which take far longer.

        Returns
        -------
        list of (int, int, str, str)
            Curve in input order, place among its :meth:`findings`, code, severity.
        """
        found = []
        for index in self._plan.assessed.tolist():
            here = [*self._of_planner.get(index, ()), *self._notices_by_curve.get(index, ())]
            found += [(index, place, one.code, one.severity) for place, one in enumerate(here)]
        return found

    def findings(self, index: int, record: Record | None = None) -> list[Finding]:
        """Give the findings of one curve, each short; the plan's own findings say what many have in common.

        Parameters
        ----------
        index : int
            Index of the curve in the list.
        record : dict, optional
            Its record, where it is at hand.
        """
        notices = self._notices_by_curve.get(index, ())
        if notices and record is None:
            record = self._plan.record(index)
        return [
            *self._of_planner.get(index, ()),
            *(notice.finding(index, record) for notice in notices),
        ]

    def options(self, index: int) -> list[dict[str, Any]]:
        """Give what would help where nothing fits, each with its decision as data; empty where all fits."""
        return self._options.of(index)

    def methods(self, index: int) -> list[dict[str, Any]]:
        """Give what each method would set; see :meth:`cant.explaining.methods.Methods.of`."""
        return self._methods.of(index)

    def methods_verdict(self, index: int) -> str:
        """Say in one sentence whether the choice of method matters on a curve."""
        return self._methods.verdict(self.methods(index), float(self._plan.outcome.grid.step_mm[index]))

    def reason(self, index: int, record: Record | None = None) -> str:
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
            texts = [f.text for f in self._of_planner.get(index, []) if f.severity == "stop"]
            return " ".join(texts) or "Not assessed."
        return self._reason(index, record).sentence()

    def reasons(self, indices: Sequence[int], records: Sequence[Record]) -> list[str]:
        """Give the reasons of some curves, made together, and no other words, for a table of many curves.

        Parameters
        ----------
        indices : sequence of int
            Curves that were not rejected.
        records : sequence of dict
            Their records as :meth:`cant.planning.Plan.records` gives them; each gains figures.
        """
        add_figures(self._plan, indices, records)
        self._bind(indices)
        return [self.reason(index, record) for index, record in zip(indices, records, strict=True)]

    def because(self, index: int, record: Record | None = None) -> dict[str, Any] | None:
        """Give the numbers behind the reason, metric; None for a curve that is not assessed."""
        record = record or self._plan.record(index)
        if record["status"] == "not assessed":
            return None
        return self._reason(index, record).numbers()

    def add_to(self, indices: Sequence[int], records: Sequence[Record]) -> None:
        """Add figures and words to records of the planner, in place.

        Parameters
        ----------
        indices : sequence of int
            Curves.
        records : sequence of dict
            Their records as :meth:`cant.planning.Plan.record` gives them; each gains the figures of
            :func:`cant.explaining.figures.add_figures` and the keys ``reason``, ``because``, ``findings``,
            ``options``, ``methods`` and ``methods_verdict``.
        """
        add_figures(self._plan, indices, records)
        self._bind(indices)
        for index, record in zip(indices, records, strict=True):
            record["reason"] = self.reason(index, record)
            record["because"] = self.because(index, record)
            record["findings"] = [finding.as_json() for finding in self.findings(index, record)]
            record["options"] = self.options(index)
            record["methods"] = methods = self.methods(index)
            step = float(self._plan.outcome.grid.step_mm[index])
            record["methods_verdict"] = self._methods.verdict(methods, step)

    def _bind(self, indices: Sequence[int]) -> None:
        wanted = [i for i in indices if i not in self._bindings and self._plan.outcome.planned[i]]
        if not wanted:
            return
        if len(self._bindings) > _HELD:
            self._bindings = {}
            wanted = [i for i in indices if self._plan.outcome.planned[i]]
        self._bindings = {**self._bindings, **dict(zip(wanted, bindings(self._plan, wanted), strict=True))}

    def _reason(self, index: int, record: Record) -> Reason:
        self._bind([index])
        outcome = self._plan.outcome
        if record["classes"] and "share_of_limit" not in record["classes"][0]:
            add_figures(self._plan, [index], [record])
        return Reason(
            record,
            self._bindings[index],
            self._plan.settings,
            float(outcome.grid.step_mm[index]),
            bool(self._plan.curves.cant_fixed[index] and outcome.line.fixed[index, 0]),
            self._words,
        )


def explain(plan: Plan) -> Explanation:
    """Put a plan into words.

    Parameters
    ----------
    plan : Plan
        The decisions.
    """
    return Explanation(plan)
