"""Files written whole or not at all."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterable
from pathlib import Path

from cant.errors import FileError, Place


def write_whole(path: str | Path, data: bytes | Iterable[bytes]) -> None:
    """Write a file so that a reader sees the old content or all of the new, never a part.

    Parameters
    ----------
    path : str or Path
        Where; an existing file is replaced and keeps its permissions, a link is followed.
    data : bytes or iterable of bytes
        The content; an iterable that raises leaves the old file as it was.

    Raises
    ------
    FileError
        The folder does not exist or cannot be written, or the disk is full.
    """
    target = Path(os.path.realpath(path))
    if target.exists() and not target.is_file():
        _write_through(path, target, data)
        return
    try:
        handle, temporary = tempfile.mkstemp(prefix=".", suffix=".part", dir=target.parent)
    except OSError as error:
        raise _not_written(path, error) from None
    try:
        with os.fdopen(handle, "wb") as file:
            for chunk in (data,) if isinstance(data, bytes) else data:
                file.write(chunk)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(temporary, _permissions(target))
        os.replace(temporary, target)
    except OSError as error:
        _forget(temporary)
        raise _not_written(path, error) from None
    except BaseException:
        _forget(temporary)
        raise


def _write_through(path: str | Path, target: Path, data: bytes | Iterable[bytes]) -> None:
    """Write to what is no ordinary file, such as a pipe, after the content is complete."""
    if target.is_dir():
        message = "cannot be written because it is a folder; give a file name"
        raise FileError(message, Place(str(path)))
    content = data if isinstance(data, bytes) else b"".join(data)
    try:
        target.write_bytes(content)
    except OSError as error:
        raise _not_written(path, error) from None


def _permissions(target: Path) -> int:
    """Give the permissions of the file that is replaced, else those of any new file."""
    with contextlib.suppress(OSError):
        return target.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _forget(temporary: str) -> None:
    with contextlib.suppress(OSError):
        os.unlink(temporary)


def _not_written(path: str | Path, error: OSError) -> FileError:
    reason = error.strerror or "unknown cause"
    message = f"cannot be written ({reason.lower()}); choose a folder that exists and may be written to"
    return FileError(message, Place(str(path)))
