"""Several files put in place together: all of them, or none.

A plan's workbook and its JSON belong together; one beside an older other would tell two stories.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterable, Mapping
from pathlib import Path

from cant.errors import FileError, Place


def check_places(paths: Iterable[Path], inputs: Iterable[Path]) -> None:
    """Refuse, before any work is done, what could not be written in the end.

    Parameters
    ----------
    paths : iterable of Path
        Files that will be written.
    inputs : iterable of Path
        Files that are read: none of them may be overwritten.

    Raises
    ------
    FileError
        A folder is missing, two outputs are the same file, or an output is an input, a folder or a device.
    """
    read = {path.resolve() for path in inputs}
    seen: set[Path] = set()
    for path in paths:
        target = path.resolve()
        if target in read:
            message = "is read from and would be overwritten: give another name for the output"
            raise FileError(message, Place(str(path)))
        if target in seen:
            message = "is named for two outputs: give each its own name"
            raise FileError(message, Place(str(path)))
        if target.is_dir():
            message = "is a folder: name a file"
            raise FileError(message, Place(str(path)))
        if target.exists() and not target.is_file():
            message = "is a device or pipe, and a file put in its place would replace it: name a file"
            raise FileError(message, Place(str(path)))
        if not target.parent.is_dir():
            message = "cannot be written: its folder does not exist"
            raise FileError(message, Place(str(path)))
        seen.add(target)


def write_together(contents: Mapping[Path, bytes | Iterable[bytes | memoryview]]) -> None:
    """Write several files so that either all are new or all are as they were.

    Parameters
    ----------
    contents : mapping of Path to bytes or iterable of bytes
        What each file is to hold, made in this order; an iterable that raises leaves every file as it was.

    Raises
    ------
    FileError
        A folder cannot be written or the disk is full: nothing was changed.
    """
    staged: dict[Path, Path] = {}
    try:
        for path, data in contents.items():
            staged[path] = _staged(path, data)
        _put_in_place(staged)
    finally:
        for waiting in staged.values():
            waiting.unlink(missing_ok=True)


def _staged(path: Path, data: bytes | Iterable[bytes | memoryview]) -> Path:
    """Write a file's content beside its place under another name."""
    target = path.resolve()
    waiting: Path | None = None
    try:
        handle, name = tempfile.mkstemp(prefix=f".{target.name}.", suffix=".part", dir=target.parent)
        waiting = Path(name)
        with os.fdopen(handle, "wb") as stream:
            for piece in [data] if isinstance(data, bytes) else data:
                stream.write(piece)
            stream.flush()
            os.fsync(stream.fileno())
        waiting.chmod(target.stat().st_mode & 0o777 if target.exists() else 0o666 & ~_umask())
    except BaseException as error:
        if waiting is not None:
            waiting.unlink(missing_ok=True)
        if isinstance(error, OSError):
            raise _refusal(path, error) from error
        raise
    return waiting


def _put_in_place(staged: Mapping[Path, Path]) -> None:
    """Move the waiting files to their places; where one fails, put back what was there before."""
    kept: list[tuple[Path, Path | None]] = []
    try:
        for path, waiting in staged.items():
            target = path.resolve()
            try:
                kept.append((target, _set_aside(target)))
                waiting.replace(target)
            except OSError as error:
                raise _refusal(path, error) from error
    except BaseException:
        for target, old in reversed(kept):
            if old is not None:
                old.replace(target)
            else:
                target.unlink(missing_ok=True)
        raise
    for _, old in kept:
        if old is not None:
            old.unlink(missing_ok=True)


def _set_aside(target: Path) -> Path | None:
    """Keep a second name for what a place holds now; None where it holds nothing."""
    if not target.exists():
        return None
    handle, name = tempfile.mkstemp(prefix=f".{target.name}.", suffix=".old", dir=target.parent)
    os.close(handle)
    aside = Path(name)
    aside.unlink()
    try:
        os.link(target, aside)
    except OSError:  # a file system without second names: a copy does as well
        aside.write_bytes(target.read_bytes())
    return aside


def _refusal(path: Path, error: OSError) -> FileError:
    message = f"cannot be written: {error.strerror or error}"
    return FileError(message, Place(str(path)))


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
