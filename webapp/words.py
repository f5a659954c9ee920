"""The words of the pages that more than one page needs: what a status, a bound or a finding is called.

The plan's own reasons and findings come from :mod:`cant.explaining`; nothing is reworded here.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from webapp.measures import Measures

STATUS_HELP: dict[str, str] = {
    "not assessed": "data or limits are missing, so nothing is proposed",
    "not compliant": "no cant keeps the limits that no lower speed can mend",
    "restrict": "some class may not run at its planned speed",
    "exceptional": "rests on exceptional limits, which need approval",
    "kept": "today's cant stays",
    "change": "another cant is proposed, within the normal limits",
}
"""What each status means, in a few words."""

STATUS_MARK: dict[str, str] = {
    "not assessed": "?",
    "not compliant": "✕",
    "restrict": "▼",
    "exceptional": "!",
    "kept": "=",
    "change": "↕",
}
"""A sign before each status, so that colour alone tells nothing."""

SEVERITY_MARK: dict[str, str] = {"stop": "✕", "warning": "!", "advice": "i"}
PLACE_WORDS: dict[str, str] = {
    "before": "transition in",
    "after": "transition out",
    "between": "shared transition",
}
CONFIDENCE_WORDS: dict[str, str] = {
    "certain": "certain",
    "likely": "likely: please check",
    "asked": "not settled: please answer",
}
UNIT_FROM_WORDS: dict[str, str] = {
    "heading": "stated in the heading",
    "unit row": "stated in the row of units",
    "values": "judged from the values",
    "answer": "as you answered",
    "canonical": "usual unit of this column",
}


def status_class(status: str) -> str:
    """Give the style sheet's class of a status."""
    return f"status-{status.replace(' ', '-')}"


def sentence(text: str) -> str:
    """Give a text with a capital at its start."""
    return text[:1].upper() + text[1:]


def governing(bound: Mapping[str, Any] | None) -> str:
    """Give what governs a bound or a speed: quantity, class and clause as far as there are any."""
    if not bound:
        return ""
    parts = [str(bound.get("quantity", ""))]
    if bound.get("class"):
        parts.append(f"of {bound['class']}")
    if bound.get("place") in PLACE_WORDS:
        parts.append(f"on the {PLACE_WORDS[bound['place']]}")
    if bound.get("clause"):
        parts.append(f"({bound['clause']})")
    return " ".join(part for part in parts if part)


KEY_KINDS: dict[str, str] = {
    "smallest_radius_m": "radius",
    "wheel_load_shift": "share",
    "wheel_load_shift_at_rest": "share",
    "permissible_speed_kmh": "speed",
    "permissible_speed_normal_kmh": "speed",
}
"""Kind of number of some keys, where the ending does not say it."""

UNIT_ENDINGS: tuple[tuple[str, str], ...] = (
    ("_mm_per_m", "gradient"),
    ("_mm_m", "gradient"),
    ("_mm_per_s", "rate"),
    ("_mms", "rate"),
    ("_mm_s", "rate"),
    ("_ms3", "jerk"),
    ("_ms2", "acceleration"),
    ("_deg_s", "angular rate"),
    ("_kmh", "speed exact"),
    ("_mm", "cant exact"),
    ("_km", "chainage"),
    ("_m", "length"),
)
"""Ending of a key of the JSON, and the kind of number that it says."""


SECONDS = "_s"


def kind_of(key: str) -> str | None:
    """Give the kind of number that a key of the JSON says by its ending, None where it says none."""
    if key in KEY_KINDS:
        return KEY_KINDS[key]
    return next((kind for ending, kind in UNIT_ENDINGS if key.endswith(ending)), None)


def heading(key: str) -> str:
    """Give a key of the JSON as words, its unit left out."""
    endings = [ending for ending, _ in UNIT_ENDINGS if key.endswith(ending)] or [SECONDS]
    return sentence(key.removesuffix(endings[0]).replace("_", " "))


def value(key: str, found: Any, measures: Measures, *, unit: bool = True) -> str:
    """Give a value of the JSON as words, in the units of the page where its key says which it has."""
    if found is None or found == "":
        return "–"
    if isinstance(found, bool):
        return "yes" if found else "no"
    if isinstance(found, Mapping):
        return governing(found) if "quantity" in found else ", ".join(f"{k} {v}" for k, v in found.items())
    if isinstance(found, (list, tuple)):
        return ", ".join(str(item) for item in found) or "–"
    kind = kind_of(key)
    if isinstance(found, (int, float)):
        if kind is None and key.endswith(SECONDS):
            return f"{found:.1f} s"
        if kind is None:
            return f"{found:.4g}"
        return measures.with_unit(kind, found) if unit else measures.show(kind, found)
    return str(found)
