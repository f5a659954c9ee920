"""The connection to the database, and its migrations.

SQLite in a file, or PostgreSQL by a URL; what differs between the two is known here alone. In SQLite a
transaction that writes takes the right to write when it begins, so that none fails half-way because another
was quicker, and what is deleted is overwritten.
"""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Iterator
from contextlib import AbstractContextManager
from pathlib import Path
from typing import Any

from alembic import command
from alembic.config import Config as AlembicConfig
from alembic.util import CommandError
from filelock import FileLock
from sqlalchemy import Connection, Engine, create_engine, event, text
from sqlalchemy.exc import DBAPIError, OperationalError, SQLAlchemyError
from sqlalchemy.orm import Session, sessionmaker

from cant.errors import FileError, InputError

MIGRATIONS = Path(__file__).parents[1] / "migrations"
MIGRATION_LOCK = 0x63616E74
"""Number of the advisory lock under which one process at a time migrates a PostgreSQL database."""
WRITES = "cant_writes"
"""Execution option of a connection whose transactions write."""
OWN_ALONE = 0o600
WAIT_MS = 30_000
CLEARING_WAIT_MS = 200
QUIET = {"hide_parameters": True}
"""An error of the database goes to the log without the values that it was about."""
FULL_WORDS = ("database or disk is full", "disk I/O error", "No space left", "could not extend file")

PASSING_WORDS = (
    "database is locked",
    "connection",
    "deadlock",
    "could not serialize",
    "starting up",
    "shutting down",
)


class Sessions(sessionmaker[Session]):
    """Makes sessions; those of ``begin()`` may write, and hold the right to from their first statement."""

    def begin(self) -> AbstractContextManager[Session]:
        """Give a session in a transaction that is committed at the end, or rolled back where it fails."""
        return self._writing()

    @contextlib.contextmanager
    def _writing(self) -> Iterator[Session]:
        engine: Engine = self.kw["bind"]
        session = self(bind=engine.execution_options(**{WRITES: True}))
        with session, session.begin():
            yield session


class Database:
    """An engine whose tables are up to date.

    Parameters
    ----------
    url : str
        SQLAlchemy URL of an SQLite file or of a PostgreSQL database.

    Raises
    ------
    InputError
        Where the URL names another kind of database.
    FileError
        Where the database cannot be reached or its file cannot be made.
    """

    def __init__(self, url: str) -> None:
        self.engine = _engine(url)
        self.must_clear = False
        """Whether deleted content may still be in the write-ahead log."""
        self.sessions: sessionmaker[Session] = Sessions(self.engine, expire_on_commit=False)
        try:
            self._migrate()
        except CommandError as error:
            self.close()
            message = "the database is of a newer version of this program: start that, or restore a backup"
            raise FileError(message) from error
        except (SQLAlchemyError, OSError) as error:
            self.close()
            shown = self.engine.url.render_as_string(hide_password=True)
            message = f"the database {shown} cannot be used: {str(error).splitlines()[0]}"
            raise FileError(message) from error

    @property
    def file(self) -> Path | None:
        """The file of an SQLite database, None for a server."""
        name = self.engine.url.database
        embedded = self.engine.dialect.name == "sqlite" and name and name != ":memory:"
        return Path(name) if embedded and name else None

    def _migrate(self) -> None:
        """Bring the tables up to date, one process at a time."""
        if self.file is None:
            self._upgrade()
            return
        lock = self.file.with_name(f"{self.file.name}-lock")
        with FileLock(lock, mode=OWN_ALONE):
            _make_for_the_owner_alone(self.file)
            self._upgrade()

    def _upgrade(self) -> None:
        config = AlembicConfig()
        config.set_main_option("script_location", str(MIGRATIONS).replace("%", "%%"))
        config.set_main_option("path_separator", "os")
        with self.engine.connect().execution_options(**{WRITES: True}) as connection:
            if self.engine.dialect.name == "postgresql":
                connection.execute(text("SELECT pg_advisory_lock(:lock)"), {"lock": MIGRATION_LOCK})
                connection.commit()
            try:
                config.attributes["connection"] = connection
                command.upgrade(config, "head")
                connection.commit()
            finally:
                _unlock(connection)

    def answers(self) -> bool:
        """Tell whether the database answers (for a readiness check)."""
        try:
            with self.engine.connect() as connection:
                connection.execute(text("SELECT 1"))
        except SQLAlchemyError:
            return False
        return True

    def takes_changes(self) -> bool:
        """Tell whether the database can be written to; SQLAlchemyError where it does not answer."""
        if self.file is not None:
            return os.access(self.file, os.W_OK) and os.access(self.file.parent, os.W_OK)
        with self.engine.connect() as connection:
            return connection.execute(text("SHOW transaction_read_only")).scalar() == "off"

    def clear_away(self) -> bool:
        """Let what was deleted be in no file any more; tell whether that is so.

        Deleted pages of an SQLite file are overwritten, but its write-ahead log holds older copies until it
        is emptied, which waits for readers: where it cannot be now, it must be asked for again. In
        PostgreSQL rows are gone, and its own vacuuming takes the rest.
        """
        if self.file is None:
            return True
        raw = self.engine.raw_connection()
        try:
            cursor = raw.cursor()
            cursor.execute(f"PRAGMA busy_timeout={CLEARING_WAIT_MS}")
            try:
                row = cursor.execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchone()
            finally:
                cursor.execute(f"PRAGMA busy_timeout={WAIT_MS}")
                cursor.close()
        finally:
            raw.close()
        self.must_clear = row is None or row[0] != 0
        return not self.must_clear

    def close(self) -> None:
        """Close all connections."""
        self.engine.dispose()


def one_at_a_time(session: Session, key: str) -> None:
    """Let transactions of one key wait for each other; in SQLite all that write do anyway."""
    if session.get_bind().dialect.name == "postgresql":
        session.execute(text("SELECT pg_advisory_xact_lock(hashtextextended(:key, 0))"), {"key": key})


def write_anyway(session: Session) -> None:
    """Let a transaction that changed nothing wait for the disk at its end, as one does that changed a row."""
    if session.get_bind().dialect.name == "postgresql":
        session.execute(text("UPDATE alembic_version SET version_num = version_num"))
    else:  # a row that stays as it was is not written by SQLite; this number is nobody's
        session.execute(text(f"PRAGMA user_version = {secrets.randbits(31)}"))


def is_full(error: DBAPIError) -> bool:
    """Tell whether an error of the database means that there is no room left on its disk."""
    return any(words in str(error.orig) for words in FULL_WORDS)


def is_passing(error: DBAPIError) -> bool:
    """Tell whether another try may help after an error of the database: it is held, or does not answer."""
    text_of = str(error.orig)
    return error.connection_invalidated or (
        isinstance(error, OperationalError) and any(words in text_of for words in PASSING_WORDS)
    )


def _unlock(connection: Connection) -> None:
    if connection.dialect.name == "postgresql":
        connection.rollback()
        connection.execute(text("SELECT pg_advisory_unlock(:lock)"), {"lock": MIGRATION_LOCK})
        connection.commit()


def _engine(url: str) -> Engine:
    if url.startswith("sqlite"):
        engine = create_engine(url, connect_args={"timeout": WAIT_MS / 1000}, **QUIET)
        file = engine.url.database
        if file and file != ":memory:":
            try:
                Path(file).parent.mkdir(mode=0o700, parents=True, exist_ok=True)
            except OSError as error:
                message = f"the data directory {Path(file).parent} cannot be made: {error.strerror}"
                raise FileError(message) from error
        event.listen(engine, "connect", _prepare_sqlite)
        event.listen(engine, "begin", _begin_sqlite)
        return engine
    if url.startswith("postgresql"):
        try:
            return create_engine(url, pool_pre_ping=True, **QUIET)
        except ModuleNotFoundError as error:
            message = f"PostgreSQL needs the driver {error.name}: install the package with [postgresql]"
            raise InputError(message) from error
    message = "plans can be kept in SQLite (sqlite:///file) or PostgreSQL (postgresql://...) only"
    raise InputError(message)


def _make_for_the_owner_alone(file: Path) -> None:
    """Make the file before SQLite does, so that nobody else may read it, nor the logs that follow it."""
    os.close(os.open(file, os.O_RDWR | os.O_CREAT, OWN_ALONE))
    for one in (file, *(file.with_name(file.name + ending) for ending in ("-wal", "-shm"))):
        with contextlib.suppress(OSError):  # of another owner, or not there
            if one.stat().st_mode & 0o077:
                one.chmod(OWN_ALONE)


def _prepare_sqlite(connection: Any, _record: Any) -> None:
    """Let readers and a writer work side by side, and what hangs on a plan be deleted and overwritten."""
    connection.isolation_level = None  # transactions begin where _begin_sqlite says so
    cursor = connection.cursor()
    for pragma in (
        f"busy_timeout={WAIT_MS}",
        "journal_mode=WAL",
        "synchronous=FULL",
        "foreign_keys=ON",
        "secure_delete=ON",
    ):
        cursor.execute(f"PRAGMA {pragma}")
    cursor.close()


def _begin_sqlite(connection: Connection) -> None:
    writes = connection.get_execution_options().get(WRITES, False)
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")
