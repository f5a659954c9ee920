"""The sentence of an option, made from its numbers."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from cant.explaining.candidate import Candidate
from cant.explaining.wording import Words, listed, seconds

Record = dict[str, Any]


def option_text(candidate: Candidate, record: Record, words: Words) -> str:
    """Say in a sentence or two what an option changes, what it costs, and what the cant then is.

    Parameters
    ----------
    candidate : Candidate
    record : dict
        The record of its curve, planned with the option.
    words : Words
    """
    said = _SAY[candidate.kind](candidate.facts, record, words)
    cant = words.cant(record["recommended_cant_mm"])
    still = ""
    if record["status"] == "exceptional" and not candidate.exceptional:
        still = ", still with an exceptional value"
    return f"{said} The cant is then {cant}{still}."


def _speeds(facts: Record, words: Words) -> str:
    """Say which classes change to what speed, those that change alike together."""
    alike: dict[tuple[str, float, float], list[str]] = {}
    for f in facts["speeds"]:
        alike.setdefault((f.get("curve") or "", f["to_kmh"], f["from_kmh"]), []).append(f["class"])
    return listed(
        f"{listed(names)}{' on curve ' + curve if curve else ''} to {words.speed(to)} "
        f"instead of {words.speed(before)}"
        for (curve, to, before), names in alike.items()
    )


def _lost(facts: Record) -> str:
    return (
        f"{seconds(facts['seconds'])} a day lost over the curve alone, braking and accelerating not counted"
    )


def _slower(facts: Record, record: Record, words: Words) -> str:
    return f"Lower {_speeds(facts, words)}: {_lost(facts)}."


def _fewer(facts: Record, record: Record, words: Words) -> str:
    return f"Do without the exceptional value: lower {_speeds(facts, words)}: {_lost(facts)}."


def _approved(facts: Record, record: Record, words: Words) -> str:
    values = listed(
        f"{p['quantity']}{' of ' + p['class'] if p.get('class') else ''} "
        f"{words.limited(p['quantity'], p['value'])} (normal {words.limited(p['quantity'], p['limit'])}, "
        f"exceptional {words.limited(p['quantity'], p['exceptional_limit'])}"
        f"{', ' + p['clause'] if p.get('clause') else ''})"
        for p in record["limits_passed"]
    )
    said = f"Use the exceptional value with approval: {values or 'on a neighbour in the chain'}"
    if facts.get("speeds"):
        said += f", and lower {_speeds(facts, words)}: {_lost(facts)}"
    return said + "."


def _faster(facts: Record, record: Record, words: Words) -> str:
    return f"Raise {_speeds(facts, words)}, where the trains really run so fast here; recorded speeds tell."


def _waived(facts: Record, record: Record, words: Words) -> str:
    parts = []
    now = {entry["class"]: entry["excess_mm"] for entry in record["classes"]}
    for f in facts["excesses"]:
        excess = now.get(f["class"]) or f["excess_mm"]
        parts.append(
            f"{f['class']}, {words.exact(excess)} against {words.exact(f['limit_mm'])}, "
            f"{words.exact(excess - f['limit_mm'])} over"
        )
    return f"Waive the excess limit with approval for {'; '.join(parts)}."


def _longer(facts: Record, record: Record, words: Words) -> str:
    parts = []
    for f in facts["transitions"]:
        before = words.length(f["from_m"]) if f["from_m"] > 0 else "none"
        shared = f.get("shared_with")
        which = f"shared with curve {shared}" if shared is not None else str(f["end"])
        moves = "the two arcs apart" if shared is not None else "the arc inwards"
        parts.append(
            f"the transition {which} from {before} to {words.length(f['to_m'])}, which moves {moves} "
            f"by {words.offset(f['shift_m'])}"
        )
    return f"Lengthen {listed(parts)}."


def _flatter(facts: Record, record: Record, words: Words) -> str:
    said = f"Flatten the curve from {words.radius(facts['from_m'])} to {words.radius(facts['to_m'])}"
    if facts["offset_m"] is not None:
        said += f", which moves its apex inwards by {words.offset(facts['offset_m'])}"
    return said + "."


def _realigned(facts: Record, record: Record, words: Words) -> str:
    longer = _longer(facts, record, words)
    return f"{_flatter(facts, record, words)[:-1]}; and {longer[0].lower()}{longer[1:]}"


def _released(facts: Record, record: Record, words: Words) -> str:
    parts = []
    if facts["fixed_mm"] is not None:
        parts.append(f"let the fixed cant of {words.cant(facts['fixed_mm'])} be changed")
    for key, name in (("at_most_mm", "at most"), ("at_least_mm", "at least")):
        if facts[key]:
            old, new = facts[key]
            parts.append(f"move the site's bound from {name} {words.cant(old)} to {name} {words.cant(new)}")
    return listed(parts).capitalize() + "."


_SAY: dict[str, Callable[[Record, Record, Words], str]] = {
    "lower speed": _slower,
    "fewer approvals": _fewer,
    "exceptional value": _approved,
    "faster slow class": _faster,
    "excess waived": _waived,
    "longer transition": _longer,
    "flatter curve": _flatter,
    "flatter curve and longer transition": _realigned,
    "site bound": _released,
}
