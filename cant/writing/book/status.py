"""What each status of a curve means, and how it looks: one list for sheets, columns and terminal."""

from __future__ import annotations

STATUS_WORDS: dict[str, str] = {
    "not assessed": "the limits or the data have a gap there",
    "not compliant": "its fixed or site-bound cant keeps no limit that no lower speed can mend",
    "restrict": "some class may not run at its planned speed",
    "exceptional": "an exceptional value is needed, which takes approval",
    "kept": "today's cant is the one to have",
    "change": "another cant than today's is proposed, within normal limits",
}
"""What each status means, for people."""

NOT_ASSESSED = "not assessed"
FILLS: dict[str, str] = {
    NOT_ASSESSED: "D9D9D9",
    "not compliant": "F2B8B0",
    "restrict": "F7D9A8",
    "exceptional": "F6EFB0",
}
"""Ground of the status cell; a cant that simply changes or stays has none."""
