"""The reason for a cant in one sentence, and the numbers behind it.

A sentence says: the cant, why this one, what binds it with class, value, limit, clause and margin; where no
cant serves all classes the two limits in conflict and by how much they miss each other.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from cant.explaining.binding import Binding, Bound
from cant.explaining.wording import Words, governing_words, listed, seconds
from cant.model.settings import Settings

Record = dict[str, Any]

METHOD_WORDS = {
    "rms": "the rms speed",
    "fraction": "the fraction of the fastest class's equilibrium cant",
    "balanced": "balanced shares of deficiency and excess",
    "least": "least cant",
    "underbalance": "slightly under the balance of the class with most tonnes",
    "today": "today's cant where close",
}
_SAME_MM = 1e-3
_HALF = 0.5 + 1e-6


class Reason:
    """The words of one curve's reason.

    Parameters
    ----------
    record : dict
        Its record with the figures of its classes.
    binding : Binding
    settings : Settings
    step_mm : float
        Step of its grid.
    fixed : bool
        Its cant may not be changed.
    words : Words
    """

    def __init__(
        self,
        record: Record,
        binding: Binding,
        settings: Settings,
        step_mm: float,
        fixed: bool,
        words: Words,
    ) -> None:
        self._record, self._binding, self._words = record, binding, words
        self._fixed = fixed
        self._settings, self._step = settings, step_mm
        self._low = binding.lower[0] if binding.lower else None
        self._high = binding.upper[0] if binding.upper else None

    def sentence(self) -> str:
        """Give the sentence."""
        status = self._record["status"]
        parts = [self._why()]
        if status in ("restrict", "not compliant"):
            held = bool(self._record.get("cant_held"))
            parts = [self._why() if held else self._conflict(), *self._consequence()]
        elif status == "exceptional":
            parts.append(self._approvals())
        if status != "not compliant":
            parts.append(self._closest())
        parts.append(self._unknown_transitions())
        return f"{self._headline()}: {'; '.join(part for part in parts if part)}."

    def numbers(self) -> dict[str, Any]:
        """Give the numbers behind the sentence, metric."""
        low, high = self._low, self._high
        room = high.mm - low.mm if low and high else None
        nearest = self._nearest_class()
        return {
            "lower": [bound.as_json() for bound in self._binding.lower],
            "upper": [bound.as_json() for bound in self._binding.upper],
            "room_mm": room,
            "method": self._settings.method,
            "target_mm": self._record["target_cant_mm"],
            "cant_step_mm": self._step,
            "closest_to_its_limit": nearest,
            "shortfall_mm": -room if room is not None and room < 0 else None,
            "smallest_radius_for_mix_m": self._binding.radius_of_mix_m or None,
            "classes_of_mix": list(self._binding.mix) if self._binding.radius_of_mix_m else [],
        }

    def _headline(self) -> str:
        record, words = self._record, self._words
        cant, today = record["recommended_cant_mm"], record["existing_cant_mm"]
        if today is None:
            return f"{words.cant(cant)} (today's not known)"
        if abs(today - cant) <= _SAME_MM:
            return f"{words.cant(cant)} as today"
        return f"{words.cant(cant)} (today {words.cant(today)})"

    def _bound(self, bound: Bound) -> str:
        """Write a bound: ``84.3 mm (cant deficiency of Fast at most 75.0 mm, clause)``."""
        words = self._words
        if bound.quantity.startswith("cant at"):
            return f"{words.exact(bound.mm)} ({bound.quantity} of the site)"
        what = bound.quantity + (f" of {bound.class_name}" if bound.class_name else "")
        if bound.quantity == "cant":
            return f"{words.exact(bound.mm)} (largest {what}{', ' + bound.clause if bound.clause else ''})"
        limit = f" at most {words.limited(bound.quantity, bound.limit)}"
        return f"{words.exact(bound.mm)} ({what}{limit}{', ' + bound.clause if bound.clause else ''})"

    def _why(self) -> str:
        """Say why this cant among those that the limits allow."""
        record, words, low, high = self._record, self._words, self._low, self._high
        cant, target = record["recommended_cant_mm"], record["target_cant_mm"]
        held = record.get("cant_held")
        if held:
            why = f" ({held['because'].rstrip('.')})" if held["because"] else ""
            return f"held by hand{why}, {self._range()}"
        if self._fixed:
            return "today's cant is fixed here"
        method = METHOD_WORDS[self._settings.method]
        named = f"the {words.exact(target)} of {method}" if self._settings.method != "least" else method
        between = self._range()
        if abs(cant - target) <= self._step * _HALF:
            return f"the multiple of {words.cant(self._step)} nearest to {named}, {between}"
        if record["status"] == "kept":
            return f"today's cant is kept, {named} being the target, {between}"
        if (
            high is not None
            and target > high.mm
            and cant <= high.mm + _SAME_MM
            and high.mm - cant < self._step
        ):
            return f"as near to {named} as {self._bound(high)} lets it{self._other_side(low, 'at least')}"
        if low is not None and target < low.mm and -_SAME_MM <= cant - low.mm < self._step:
            return f"as near to {named} as {self._bound(low)} lets it{self._other_side(high, 'at most')}"
        with_whom = "best"
        if self._shares():
            with_whom = "best together with the curves that share its transitions"
        return f"{with_whom}, {named} being out of reach, {between}"

    def _other_side(self, bound: Bound | None, word: str) -> str:
        if bound is None or (word == "at least" and bound.mm <= 0):
            return ""
        return f", {word} {self._bound(bound)}"

    def _shares(self) -> bool:
        return any(end["kind"] == "shared" for end in self._record["transitions"].values())

    def _range(self) -> str:
        low = self._low if self._low and self._low.mm > 0 else None
        high = self._high
        if low and high and low.mm <= high.mm:
            room = self._words.exact(high.mm - low.mm)
            return f"between {self._bound(low)} and {self._bound(high)}, {room} of room"
        if low and not high:
            return f"at least {self._bound(low)}"
        if high and not low:
            return f"at most {self._bound(high)}"
        if low and high:
            return f"{self._bound(low)} lying over {self._bound(high)}"
        return "no limit bounding it"

    def _conflict(self) -> str:
        """Say which two limits exclude each other, by how much, and whether any cant at all could serve."""
        low, high, words = self._low, self._high, self._words
        radius, mix = self._binding.radius_of_mix_m, self._binding.mix
        if low is None or high is None or low.mm <= high.mm + _SAME_MM:
            if (
                low is not None
                and high is not None
                and high.mm - low.mm < self._step
                and self._no_step_between()
            ):
                return (
                    f"no multiple of {words.cant(self._step)} lies between {self._bound(low)} and "
                    f"{self._bound(high)}"
                )
            if self._shares():
                return "no cants of the curves that share transitions serve all classes at planned speeds"
            return "no cant serves all classes at their planned speeds"
        said = (
            f"at least {self._bound(low)} is needed and at most {self._bound(high)} allowed, "
            f"{words.exact(low.mm - high.mm)} short"
        )
        actual = self._record["radius_m"] or np.inf
        if radius > actual:
            return (
                f"{said}; no cant at all serves {mix[0]} and {mix[1]} together below a radius of "
                f"{words.radius(radius)}"
            )
        return said

    def _no_step_between(self) -> bool:
        if self._low is None or self._high is None:
            return False
        return bool(np.ceil(self._low.mm / self._step - 1e-9) > np.floor(self._high.mm / self._step + 1e-9))

    def _consequence(self) -> list[str]:
        record, words = self._record, self._words
        parts = []
        if record["status"] == "not compliant":
            broken = [p for p in record["limits_passed"] if not p["within_exceptional"]] or record[
                "limits_passed"
            ]
            bound = "the cant held by hand" if record.get("cant_held") else "the cant bound to this site"
            parts.append(f"{bound} breaks " + listed(map(self._passed, broken[:3])))
        slow: dict[tuple[float, float, str], list[str]] = {}
        for e in record["classes"]:
            if e["run_speed_kmh"] is not None and e["run_speed_kmh"] < e["speed_kmh"] - 1e-6:
                by = governing_words({**e["permissible_by"], "class": None}) if e["permissible_by"] else ""
                slow.setdefault((e["run_speed_kmh"], e["speed_kmh"], by), []).append(e["class"])
        if slow:
            said = listed(
                f"{listed(names)} to {words.speed(run)} instead of "
                f"{words.speed(planned)}{f' ({by})' if by else ''}"
                for (run, planned, by), names in slow.items()
            )
            lost = record.get("running_time_lost_s")
            lost_words = f", {seconds(lost)} a day lost over the curve alone" if lost else ""
            parts.append(f"restricted: {said}{lost_words}")
        if record["status"] == "restrict" and record["limits_passed"]:
            parts.append(self._approvals())
        return parts

    def _passed(self, p: Record) -> str:
        words = self._words
        name = f" of {p['class']}" if p.get("class") else ""
        where = " on the shared transition" if p.get("place") == "between" else ""
        clause = f", {p['clause']}" if p.get("clause") else ""
        if p["quantity"] == "equal cants":
            return f"the need for equal cants where the arcs touch, {words.exact(p['value'])} apart"
        value, limit = (words.limited(p["quantity"], p[key]) for key in ("value", "limit"))
        return f"{p['quantity']}{name}{where} {value} against {limit}{clause}"

    def _approvals(self) -> str:
        return "needs approval: " + listed(map(self._passed, self._record["limits_passed"]))

    def _nearest_class(self) -> Record | None:
        """Give the class with the largest share of a limit of the arc."""
        entries = [e for e in self._record["classes"] if e.get("share_of_limit") is not None]
        if not entries:
            return None
        e = max(entries, key=lambda entry: entry["share_of_limit"])
        quantity = e["share_of"]
        value, limit = {
            "cant deficiency": (e["deficiency_mm"], e.get("deficiency_limit_mm")),
            "cant excess": (e["excess_mm"], e.get("excess_limit_mm")),
            "felt acceleration": (abs(e["felt_acceleration_ms2"] or 0.0), e.get("felt_limit_ms2")),
        }[quantity]
        return {
            "class": e["class"],
            "quantity": quantity,
            "value": value,
            "limit": limit,
            "margin": None if limit is None else limit - value,
            "share": e["share_of_limit"],
            "clause": e.get("share_clause"),
        }

    def _closest(self) -> str:
        found = self._nearest_class()
        if not found or found["limit"] is None or found["share"] > 1.0 + 1e-6:
            return ""  # a limit that is passed has been told
        words, quantity = self._words, found["quantity"]
        clause = f", {found['clause']}" if found["clause"] else ""
        margin = found["margin"]
        side = f"{words.limited(quantity, abs(margin))} under"
        return (
            f"closest to its limit is {found['class']}, {quantity} "
            f"{words.limited(quantity, found['value'])}, {side} "
            f"{words.limited(quantity, found['limit'])} ({words.share(found['share'])}{clause})"
        )

    def _unknown_transitions(self) -> str:
        parts = []
        for side, end in self._record["transitions"].items():
            if end["kind"] != "not known":
                continue
            lengths = [v for v in (end["ramp_needed_m"], end["transition_needed_m"]) if v is not None]
            if lengths:
                parts.append(
                    f"the transition {side}, not known, needs {self._words.length(np.ceil(max(lengths)))}"
                )
        return " and ".join(parts)
