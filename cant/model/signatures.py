"""Who has signed a plan, and over what: for the block on the summary sheet that people sign.

A record only; whether a signature holds is judged where it is given.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from datetime import date

STEPS = ("prepared", "checked", "approved")


@dataclass(frozen=True)
class Signature:
    """That somebody has signed one step.

    Attributes
    ----------
    step : str
        One of :data:`STEPS`.
    name : str
        Who has signed.
    day : date
        When.
    """

    step: str
    name: str
    day: date


@dataclass(frozen=True)
class Signatures:
    """The signatures under a plan that hold.

    Attributes
    ----------
    digest : str
        SHA-256 of what they are over, in hexadecimal digits.
    signed : tuple of Signature
        In the order of :data:`STEPS`, those steps left out that nobody has signed.
    """

    digest: str
    signed: tuple[Signature, ...]

    def of(self, step: str) -> Signature | None:
        """Give the signature of a step, None where nobody has signed it."""
        return next((one for one in self.signed if one.step == step), None)

    def as_text(self) -> str:
        """Give them as text, JSON: to be carried elsewhere, and to tell others apart from them."""
        signed = [[one.step, one.name, one.day.isoformat()] for one in self.signed]
        return json.dumps({"digest": self.digest, "signed": signed})

    @classmethod
    def from_text(cls, text: str) -> Signatures:
        """Give what :meth:`as_text` wrote."""
        plain = json.loads(text)
        signed = (Signature(step, name, date.fromisoformat(day)) for step, name, day in plain["signed"])
        return cls(plain["digest"], tuple(signed))
