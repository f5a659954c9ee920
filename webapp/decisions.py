"""What an engineer decides over the unchanged file, and how that is written down.

A plan is its file and a list of decisions. The last of each kind rules; earlier ones stay as the history. The
text form is JSON in which an unlimited value is the word ``none``, so that any database and any program can
hold it.
"""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any, Literal

from cant.model.limits import LimitSet
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from webapp.changes import Taken, follow

Kind = Literal["answers", "traffic", "limits", "settings", "confirmed", "change"]
KINDS: tuple[Kind, ...] = ("answers", "traffic", "limits", "settings", "confirmed", "change")
CHANGE = "change"
"""The kind whose decisions are events that add up (:mod:`webapp.changes`), where of others the last rules."""
UNLIMITED = "none"


@dataclass(frozen=True)
class Decision:
    """One decision as stored.

    Attributes
    ----------
    kind : str
        One of :data:`KINDS`.
    content : str
        JSON text; ``null`` takes back what was decided before.
    reason : str
        Why, in the engineer's words; may be "".
    made : datetime
        When, in UTC.
    who : str
        The name that the engineer gave, or "".
    account : str
        The account that decided, where people sign in; else "".
    """

    kind: str
    content: str
    reason: str
    made: datetime
    who: str = ""
    account: str = ""


@dataclass(frozen=True)
class Decided:
    """All that holds after a list of decisions; None where the file alone speaks.

    Attributes
    ----------
    answers : dict or None
        Answers and corrections to how the file is read.
    traffic, limits, settings : Traffic, LimitSet, Settings or None
        What replaces the file's own.
    confirmed : bool
        The reading, the trains and the limits have been confirmed: cants may be shown.
    changes : tuple of Taken
        Changes over the list as read that hold, in the order in which they were taken.
    texts : dict of str to str
        The ruling text of each kind, from which :meth:`digest` is made.
    """

    answers: dict[str, Any] | None = None
    traffic: Traffic | None = None
    limits: LimitSet | None = None
    settings: Settings | None = None
    confirmed: bool = False
    changes: tuple[Taken, ...] = ()
    texts: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, decisions: Iterable[Decision]) -> Decided:
        """Fold a list of decisions, oldest first."""
        texts: dict[str, str] = {}
        changes: tuple[Taken, ...] = ()
        for decision in decisions:
            texts[decision.kind] = decision.content
            if decision.kind == CHANGE:
                changes = follow(changes, json.loads(decision.content))
                plain = [one.as_plain() for one in changes]
                texts[CHANGE] = as_text(plain or None)
        return cls.of_texts(texts)

    @classmethod
    def of_texts(cls, texts: Mapping[str, str]) -> Decided:
        """Give what holds from the ruling text of each kind, as :attr:`texts` has it."""
        values = {kind: json.loads(content) for kind, content in texts.items()}
        traffic, limits, settings = (values.get(kind) for kind in ("traffic", "limits", "settings"))
        return cls(
            answers=values.get("answers"),
            traffic=None if traffic is None else Traffic.model_validate(traffic),
            limits=None if limits is None else limits_from_plain(limits),
            settings=None if settings is None else Settings.model_validate(settings),
            confirmed=bool(values.get("confirmed")),
            changes=tuple(Taken.from_plain(plain) for plain in values.get(CHANGE) or ()),
            texts=texts,
        )

    def digest(self, *kinds: str) -> str:
        """Give a digest of the ruling decisions of some kinds, for use as a key."""
        made = hashlib.sha256()
        for kind in kinds:
            made.update(f"{kind}={self.texts.get(kind, 'null')}\n".encode())
        return made.hexdigest()


def limits_as_plain(limits: LimitSet) -> dict[str, Any]:
    """Give a limit set as plain JSON values, an unlimited value as ``none``."""
    plain = limits.model_dump(mode="python")
    for row in plain["rows"]:
        for name in ("normal", "exceptional"):
            if isinstance(row[name], float) and math.isinf(row[name]):
                row[name] = UNLIMITED
    plain["rows"] = list(plain["rows"])
    plain["situations"] = list(plain["situations"])
    return plain


def limits_from_plain(plain: Mapping[str, Any]) -> LimitSet:
    """Give the limit set that :func:`limits_as_plain` wrote; ValidationError where it is not one."""
    rows = [
        {
            name: math.inf if value == UNLIMITED and name in ("normal", "exceptional") else value
            for name, value in row.items()
        }
        for row in plain.get("rows", ())
    ]
    return LimitSet.model_validate({**plain, "rows": rows})


def as_text(value: Any) -> str:
    """Give JSON values as text that is the same for the same values."""
    return json.dumps(value, sort_keys=True, ensure_ascii=False, allow_nan=False)


def traffic_text(traffic: Traffic) -> str:
    """Give a traffic table as the text of a decision."""
    return as_text(traffic.model_dump(mode="json"))


def limits_text(limits: LimitSet) -> str:
    """Give a limit set as the text of a decision."""
    return as_text(limits_as_plain(limits))


def settings_text(settings: Settings) -> str:
    """Give settings as the text of a decision."""
    return as_text(settings.model_dump(mode="json"))
