"""The parts of a package that lie in a folder, written by this program itself and not yet put together.

A package that is made only to be taken apart again need not be compressed and unpacked in between, nor stand
in memory.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path

from cant.errors import Place

_PIECE = 1 << 20


@dataclass(frozen=True)
class LooseParts:
    """Parts by their names; read like an archive's.

    Attributes
    ----------
    members : mapping of str to Path
        Where each part lies.
    place : Place
        For messages.
    """

    members: Mapping[str, Path]
    place: Place = field(default_factory=Place)

    def read(self, name: str) -> bytes:
        """Give a part."""
        return self.members[name].read_bytes()

    def pieces(self, name: str) -> Iterator[bytes]:
        """Give a part in pieces."""
        with self.members[name].open("rb") as stream:
            while piece := stream.read(_PIECE):
                yield piece
