"""Who has signed a plan, and over what: for the block on the summary sheet that people sign.

A record only; whether a signature holds is judged where it is given.
"""

from __future__ import annotations

import hashlib
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

    @property
    def key(self) -> str:
        """A text that differs where anything of them does."""
        parts = [self.digest, *(f"{one.step}\0{one.name}\0{one.day}" for one in self.signed)]
        return hashlib.sha256("\n".join(parts).encode()).hexdigest()
