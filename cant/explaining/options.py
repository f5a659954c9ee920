"""What would help where nothing fits: two to four options a curve, each planned before it is offered.

Ranked by the share by which the thing changed departs from what is there: speed, limit, length or radius.
Every option holds its decision as data; planned as it stands, it does what it says.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.explaining.alignment import realigned
from cant.explaining.candidate import Candidate, best_of_each_kind
from cant.explaining.candidates import Proposals
from cant.explaining.decisions import Decision
from cant.explaining.local import Answer, Surroundings, Trial, no_worse, try_out
from cant.explaining.option_words import option_text
from cant.explaining.wording import Words
from cant.planning import Plan
from cant.units import FOOT_M

IntArray = npt.NDArray[np.int64]

HELPED = ("restrict", "not compliant", "exceptional")
"""Statuses for which options are looked for."""
FEWEST, MOST = 2, 4
AT_ONCE = 256
_METRIC_STEPS_M = (5.0, 5.0)
_US_STEPS_M = (10 * FOOT_M, 50 * FOOT_M)

_Tried = tuple[Candidate, Answer]


class Options:
    """The options of a plan, made when asked for and kept.

    Parameters
    ----------
    plan : Plan
    words : Words
    surroundings : Surroundings
    """

    def __init__(self, plan: Plan, words: Words, surroundings: Surroundings) -> None:
        self._plan, self._words, self._surroundings = plan, words, surroundings
        self._found: dict[int, list[dict[str, Any]]] = {}
        self._steps = _US_STEPS_M if words.us else _METRIC_STEPS_M

    def of(self, index: int) -> list[dict[str, Any]]:
        """Give the options of one curve; empty where all fits."""
        if self._plan.status[index] not in HELPED:
            return []
        if index not in self._found:
            self.prepare([index])
        return self._found[index]

    def prepare(self, indices: Sequence[int]) -> None:
        """Look for the options of many curves together, which costs far less than one by one."""
        status = self._plan.status
        needed = [i for i in indices if status[i] in HELPED and i not in self._found]
        for begin in range(0, len(needed), AT_ONCE):
            part = needed[begin : begin + AT_ONCE]
            self._found |= self._look(part)

    def forget(self, indices: Sequence[int]) -> None:
        """Let go of the options of some curves."""
        for index in indices:
            self._found.pop(index, None)

    def _look(self, curves: list[int]) -> dict[int, list[dict[str, Any]]]:
        outcome = self._plan.outcome
        proposals = Proposals(outcome, np.array(curves, dtype=np.int64), *self._steps)
        offered: dict[int, list[_Tried]] = {curve: [] for curve in curves}
        self._try(self._candidates(curves, proposals), offered)
        poor = np.array([curve for curve in curves if len(offered[curve]) < FEWEST], dtype=np.int64)
        if len(poor):
            self._try(list(realigned(outcome, poor, *self._steps)), offered)
        best = {curve: best_of_each_kind(found)[:MOST] for curve, found in offered.items()}
        told = iter(self._records([pair for found in best.values() for pair in found]))
        return {curve: [self._option(one, next(told)) for one, _ in found] for curve, found in best.items()}

    def _try(self, candidates: list[Candidate], offered: dict[int, list[_Tried]]) -> None:
        """Plan candidates and put those that fit to their curves."""
        trials = [Trial(one.curve, one.changes, moves=one.moves) for one in candidates]
        answers = try_out(self._plan.outcome, self._surroundings, trials)
        good = [pair for pair in zip(candidates, answers, strict=True) if self._fits(*pair)]
        # The rank of an approval is known only from its record; of the others only the best are looked at.
        approvals = [pair for pair in good if pair[0].exceptional]
        records = dict(zip((one.curve for one, _ in approvals), self._records(approvals), strict=True))
        for one, answer in good:
            ranked = _ranked(one, records[one.curve]) if one.exceptional else one
            offered[one.curve].append((ranked, answer))

    def _candidates(self, curves: list[int], proposals: Proposals) -> list[Candidate]:
        outcome, status = self._plan.outcome, self._plan.status
        allowed = outcome.settings.allows_exceptional
        probed = [curve for curve in curves if (status[curve] == "exceptional") == allowed]
        # One probe for all curves of a chain.
        chains = {
            curve: (self._surroundings.chain(curve)[0], status[curve] == "exceptional") for curve in probed
        }
        probes = {key: Trial(curve, exceptional=not key[1]) for curve, key in chains.items()}
        answers = try_out(outcome, self._surroundings, list(probes.values()))
        by_chain = dict(zip(probes, answers, strict=True))
        known = {curve: by_chain[key] for curve, key in chains.items()}
        found: list[Candidate | None] = []
        for j, curve in enumerate(curves):
            if status[curve] == "restrict":
                found.append(proposals.slower(curve, outcome, {curve: curve}, "lower speed"))
            if curve in known:
                answer = known[curve]
                if status[curve] == "exceptional":
                    found.append(proposals.slower(curve, answer.outcome, answer.at, "fewer approvals"))
                else:
                    found.append(proposals.approved(curve, answer))
            found += proposals.of(j)
        return [one for one in found if one is not None]

    def _fits(self, candidate: Candidate, answer: Answer) -> bool:
        """Tell whether the curve has no trouble left, and its chain no more than before."""
        curve, was = candidate.curve, self._plan.status[candidate.curve]
        good = {"kept", "change"}
        if was != "exceptional" and (candidate.exceptional or self._plan.settings.allows_exceptional):
            good.add("exceptional")
        if candidate.exceptional and not self._worth_approval(candidate, answer):
            return False
        return answer.status(curve) in good and no_worse(self._plan.outcome, answer, curve)

    def _worth_approval(self, candidate: Candidate, answer: Answer) -> bool:
        """Tell whether an exceptional value is used, and saves time where classes are slowed all the same."""
        used = bool(answer.outcome.exceptional[list(answer.at.values())].any())
        lost = self._plan.outcome.proposed.lost_s[candidate.curve]
        return used and candidate.facts.get("seconds", 0.0) < lost + (0.0 if candidate.facts else 1.0)

    def _records(self, found: list[_Tried]) -> list[dict[str, Any]]:
        """Give the records of curves as planned with a candidate."""
        by_outcome: dict[int, list[int]] = {}
        for number, (_, answer) in enumerate(found):
            by_outcome.setdefault(id(answer.outcome), []).append(number)
        records: dict[int, dict[str, Any]] = {}
        for numbers in by_outcome.values():
            plan = Plan(found[numbers[0]][1].outcome)
            positions = [found[number][1].at[found[number][0].curve] for number in numbers]
            records |= dict(zip(numbers, plan.records(positions), strict=True))
        return [records[number] for number in range(len(found))]

    def _option(self, candidate: Candidate, record: dict[str, Any]) -> dict[str, Any]:
        decision = Decision(changes=tuple(change for _, change in candidate.changes))
        facts = candidate.facts
        return {
            "kind": candidate.kind,
            "text": option_text(candidate, record, self._words),
            "departure": round(candidate.departure, 6),
            "seconds_lost_a_day": facts.get("seconds"),
            "cant_mm": record["recommended_cant_mm"],
            "status": record["status"],
            "approvals": [
                {k: p.get(k) for k in ("quantity", "class", "value", "limit", "exceptional_limit", "clause")}
                for p in record["limits_passed"]
            ],
            "facts": facts,
            "decision": decision.as_json(),
        }


def _ranked(candidate: Candidate, record: dict[str, Any]) -> Candidate:
    """Give a candidate with its departure in the light of its plan: an approval departs by its overrun."""
    if not candidate.exceptional:
        return candidate
    over = [
        p["value"] / p["limit"] - 1.0 if p["limit"] > 0 else 1.0
        for p in record["limits_passed"]
        if p["value"] > 0
    ]
    return Candidate(
        candidate.kind,
        candidate.curve,
        candidate.changes,
        max([candidate.departure, *over]),
        candidate.facts,
    )
