"""The connection to the database, and its migrations.

SQLite in a file, or PostgreSQL by a URL; what differs between the two is known here alone.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

from alembic import command
from alembic.config import Config as AlembicConfig
from sqlalchemy import Connection, Engine, create_engine, event, text
from sqlalchemy.exc import SQLAlchemyError
from sqlalchemy.orm import Session, sessionmaker

from cant.errors import FileError, InputError

MIGRATIONS = Path(__file__).parents[1] / "migrations"
MIGRATION_LOCK = 0x63616E74
"""Number of the advisory lock under which one process at a time migrates a PostgreSQL database."""


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
        self.sessions: sessionmaker[Session] = sessionmaker(self.engine, expire_on_commit=False)
        try:
            self._migrate()
        except (SQLAlchemyError, OSError) as error:
            shown = self.engine.url.render_as_string(hide_password=True)
            message = f"the database {shown} cannot be used: {str(error).splitlines()[0]}"
            raise FileError(message) from error

    def _migrate(self) -> None:
        config = AlembicConfig()
        config.set_main_option("script_location", str(MIGRATIONS).replace("%", "%%"))
        config.set_main_option("path_separator", "os")
        with self.engine.connect() as connection:
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

    def close(self) -> None:
        """Close all connections."""
        self.engine.dispose()


def _unlock(connection: Connection) -> None:
    if connection.dialect.name == "postgresql":
        connection.rollback()
        connection.execute(text("SELECT pg_advisory_unlock(:lock)"), {"lock": MIGRATION_LOCK})
        connection.commit()


def _engine(url: str) -> Engine:
    if url.startswith("sqlite"):
        engine = create_engine(url, connect_args={"timeout": 30})
        file = engine.url.database
        if file and file != ":memory:":
            try:
                Path(file).parent.mkdir(parents=True, exist_ok=True)
            except OSError as error:
                message = f"the data directory {Path(file).parent} cannot be made: {error.strerror}"
                raise FileError(message) from error
        event.listen(engine, "connect", _prepare_sqlite)
        return engine
    if url.startswith("postgresql"):
        try:
            return create_engine(url, pool_pre_ping=True)
        except ModuleNotFoundError as error:
            message = f"PostgreSQL needs the driver {error.name}: install the package with [postgresql]"
            raise InputError(message) from error
    message = "plans can be kept in SQLite (sqlite:///file) or PostgreSQL (postgresql://...) only"
    raise InputError(message)


def _prepare_sqlite(connection: Any, _record: Any) -> None:
    """Let readers and a writer work side by side, and let the database itself delete what hangs on a plan."""
    cursor = connection.cursor()
    for pragma in ("foreign_keys=ON", "journal_mode=WAL", "synchronous=FULL", "busy_timeout=30000"):
        cursor.execute(f"PRAGMA {pragma}")
    cursor.close()
