"""What work there is, and what each piece of it follows from.

A piece carries the decisions under which it is computed, so that a proposal, or a moment of the history, is
worked out without being stored, and two who ask for the same ask for one piece.
"""

from __future__ import annotations

import hashlib
import json
import platform
from dataclasses import dataclass
from functools import cache, cached_property
from importlib.metadata import version
from pathlib import Path
from typing import Any

import cant
import webapp
from webapp.basis import PLAN_KINDS, READING_KINDS, Basis
from webapp.decisions import Decided, as_text

READING, PLAN, WORKBOOK, DOCUMENT = "reading", "plan", "workbook", "document"
QUICK = (READING, PLAN)
"""Kinds that take seconds where others take minutes: one of them is always done beside the others."""
KINDS = (READING, PLAN, WORKBOOK, DOCUMENT)
MATTER = {READING: READING_KINDS, PLAN: PLAN_KINDS, WORKBOOK: PLAN_KINDS, DOCUMENT: PLAN_KINDS}
WORDS = {
    READING: "reading the list",
    PLAN: "planning the cants",
    WORKBOOK: "making the workbook",
    DOCUMENT: "writing the plan as JSON",
}
"""What each kind of work is called."""
GIVES = {READING: "the list", PLAN: "the plan", WORKBOOK: "the workbook", DOCUMENT: "the plan as JSON"}
"""What each kind of work gives."""
LIBRARIES = ("numpy", "pandas", "pydantic")


@dataclass(frozen=True)
class Order:
    """A piece of work as asked for.

    Attributes
    ----------
    kind : str
        One of :data:`KINDS`.
    basis : Basis
    more : tuple of (str, str)
        What else the result follows from, such as the units of a workbook.
    """

    kind: str
    basis: Basis
    more: tuple[tuple[str, str], ...] = ()

    @cached_property
    def content(self) -> str:
        """Everything that the result follows from, as text."""
        return as_text(
            {
                "file_name": self.basis.file_name,
                "file_digest": self.basis.file_digest,
                "decided": self.basis.texts(MATTER[self.kind]),
                "more": dict(self.more),
            }
        )

    @cached_property
    def key(self) -> str:
        """Digest of what the result follows from, the program among it."""
        made = hashlib.sha256(f"{self.kind}\n{program()}\n{self.content}".encode())
        return f"{self.kind}-{made.hexdigest()}"

    @classmethod
    def of(cls, kind: str, content: str) -> Order:
        """Give the order that a piece carries."""
        plain: dict[str, Any] = json.loads(content)
        basis = Basis(plain["file_name"], plain["file_digest"], Decided.of_texts(plain["decided"]))
        return cls(kind, basis, tuple(sorted(plain["more"].items())))

    def needs(self, kind: str) -> Order:
        """Give the order of another kind that this one is made of."""
        return Order(kind, self.basis)

    def told(self, name: str) -> str:
        """Give one of the further values, "" where it has none."""
        return dict(self.more).get(name, "")


@cache
def program() -> str:
    """Give a digest of the program: no other version takes a result for its own."""
    made = hashlib.sha256(platform.python_version().encode())
    for name in LIBRARIES:
        made.update(f"{name} {version(name)}\n".encode())
    for package in (cant, webapp):
        folder = Path(str(package.__file__)).parent
        for file in sorted(folder.rglob("*")):
            if file.suffix in (".py", ".toml"):
                made.update(f"{file.relative_to(folder)}\n".encode())
                made.update(file.read_bytes())
    return made.hexdigest()
