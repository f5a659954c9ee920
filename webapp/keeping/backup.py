"""A copy of the embedded database while the service runs: whole, checked, and the owner's alone."""

from __future__ import annotations

import contextlib
import os
import secrets
import sqlite3
from pathlib import Path

from cant.errors import FileError, InputError, Place
from webapp.config import KEY_FILE, Config

WAIT_S = 60.0


def run(file: Path, *, replace: bool = False) -> str:
    """Back up the database that the environment names, and say what was done.

    Parameters
    ----------
    file : Path
        File to write.
    replace : bool
        Whether a file that is there already may be replaced.

    Raises
    ------
    CantError
        The database is a server's, or not there; the file is there already or cannot be written; the copy
        is not whole.
    """
    config = Config.from_environment()
    source = embedded_file(config)
    plans = back_up(source, file, replace=replace)
    said = f"Written: {file}, {plans} plans, checked."
    if not config.signing_key:
        key = config.data_directory / KEY_FILE
        said += f"\nKeep a copy of {key} apart from it: without that key no browser finds its plans again."
    return said


def embedded_file(config: Config) -> Path:
    """Give the file of the embedded database; InputError where a server keeps the plans."""
    if not config.database.startswith("sqlite"):
        message = (
            f"the plans are kept in PostgreSQL ({config.database_words}), which is backed up by its own "
            "program: pg_dump --format=custom --file=plans.dump DATABASE"
        )
        raise InputError(message)
    return Path(config.database.removeprefix("sqlite:///"))


def back_up(source: Path, file: Path, *, replace: bool = False) -> int:
    """Copy an embedded database, whatever is written to it meanwhile, and give the number of its plans.

    The copy is what the database held at one moment. It is written beside its place, checked, and put there
    whole.
    """
    if not source.is_file():
        message = "there is no database here: start the service once, or set CANT_DATA to its folder"
        raise FileError(message, Place(str(source)))
    if file.exists() and (not replace or file.is_dir() or file.samefile(source)):
        message = "is there already: name another file, or replace it with --replace"
        raise FileError(message if not file.is_dir() else "is a folder: name a file", Place(str(file)))
    draft = file.with_name(f".{file.name}-{secrets.token_hex(6)}")
    try:
        os.close(os.open(draft, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600))
        plans = _copy(source, draft)
        _put(draft, file, replace=replace)
    except FileExistsError as error:
        message = "is there already: name another file, or replace it with --replace"
        raise FileError(message, Place(str(file))) from error
    except OSError as error:
        message = f"cannot be written: {error.strerror or error}"
        raise FileError(message, Place(str(file))) from error
    except sqlite3.Error as error:
        message = f"the database could not be copied: {error}"
        raise FileError(message, Place(str(source))) from error
    finally:
        with contextlib.suppress(OSError):
            draft.unlink(missing_ok=True)
    return plans


def _copy(source: Path, draft: Path) -> int:
    """Copy in one step, which in a write-ahead log is one moment and keeps nobody from writing."""
    reading = sqlite3.connect(f"{source.absolute().as_uri()}?mode=ro", uri=True, timeout=WAIT_S)
    with contextlib.closing(reading), contextlib.closing(sqlite3.connect(draft)) as copy:
        reading.backup(copy, pages=-1)
        copy.execute("PRAGMA journal_mode=DELETE")
        checked = copy.execute("PRAGMA integrity_check").fetchone()[0]
        broken = copy.execute("PRAGMA foreign_key_check").fetchone()
        if checked != "ok" or broken is not None:
            message = (
                f"the copy is not whole ({str(checked).splitlines()[0]}); the database itself may be damaged"
            )
            raise FileError(message, Place(str(source)))
        (plans,) = copy.execute("SELECT count(*) FROM plans").fetchone()
    return int(plans)


def _put(draft: Path, file: Path, *, replace: bool) -> None:
    """Put a finished file into its place, so that a loss of power leaves the old one or the new one."""
    with draft.open("rb+") as written:
        os.fsync(written.fileno())
    if replace:
        draft.replace(file)
    else:
        os.link(draft, file)
    with contextlib.suppress(OSError):  # a folder cannot be synced on every system
        folder = os.open(file.absolute().parent, os.O_RDONLY)
        try:
            os.fsync(folder)
        finally:
            os.close(folder)
