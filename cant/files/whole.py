"""Files written whole or not at all."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path


def write_whole(path: str | Path, data: bytes | Iterable[bytes]) -> None:
    """Write a file so that a reader sees the old content or all of the new, never a part.

    Parameters
    ----------
    path : str or Path
        Where; an existing file is replaced and keeps its permissions.
    data : bytes or iterable of bytes
        The content; an iterable that raises leaves the old file as it was.

    Raises
    ------
    FileError
        The folder does not exist or cannot be written, or the disk is full.
    """
    raise NotImplementedError
