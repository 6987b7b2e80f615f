"""How the database is connected to: the engine that writes, the engine that only reads, and their rules."""

from __future__ import annotations

import sqlite3
from pathlib import Path
from typing import cast

from sqlalchemy import Connection, Engine, create_engine, event, make_url
from sqlalchemy.exc import ArgumentError
from sqlalchemy.pool import QueuePool, StaticPool

from agewatch.errors import StoreError

BUSY_TIMEOUT_S = 5.0
_WRITER_CACHE_KIB = 65_536
_WAL_LIMIT_BYTES = 64 * 1024 * 1024


def sqlite_version() -> str:
    """The version of the SQLite library in use, for the daemon's log."""
    return sqlite3.sqlite_version


def database_path(url: str, folder: Path) -> Path:
    """The database file that `url` names; a relative one lies in `folder`. StoreError where it names none."""
    try:
        parts = make_url(url)
    except ArgumentError:
        parts = None
    if (
        parts is None
        or parts.get_backend_name() != "sqlite"
        or parts.host
        or parts.query
        or parts.database in (None, "", ":memory:")
    ):
        raise StoreError(f'store {url}: allowed is "sqlite:///" and the path of a file')
    return (folder / str(parts.database)).absolute()


def writing_engine(path: Path) -> Engine:
    """The process's one writing connection, which alone checkpoints. Creates the file where there is none.

    SQLite before 3.51.3 can corrupt a database when two connections write or checkpoint at once.
    """

    def connect() -> sqlite3.Connection:
        driver = _connect(path, "rwc")
        driver.execute("PRAGMA journal_mode = WAL")
        driver.execute("PRAGMA synchronous = FULL")
        driver.execute("PRAGMA foreign_keys = ON")
        driver.execute("PRAGMA temp_store = MEMORY")
        driver.execute(f"PRAGMA cache_size = -{_WRITER_CACHE_KIB}")
        driver.execute(f"PRAGMA journal_size_limit = {_WAL_LIMIT_BYTES}")
        return driver

    engine = create_engine("sqlite://", creator=connect, poolclass=StaticPool)
    _begin_with(engine, "BEGIN IMMEDIATE")
    return engine


def reading_engine(path: Path, busy_timeout_s: float = BUSY_TIMEOUT_S) -> Engine:
    """Connections that cannot write, checkpoint, or create the file."""
    engine = create_engine(
        "sqlite://", creator=lambda: _connect(path, "ro", busy_timeout_s), poolclass=QueuePool
    )
    _begin_with(engine, "BEGIN")
    return engine


def driver_of(engine: Engine) -> sqlite3.Connection:
    """The writing engine's own sqlite3 connection, outside of any transaction."""
    pooled = engine.raw_connection()
    driver = cast(sqlite3.Connection, pooled.driver_connection)
    pooled.close()
    return driver


def _connect(path: Path, mode: str, busy_timeout_s: float = BUSY_TIMEOUT_S) -> sqlite3.Connection:
    # Without isolation_level=None the driver decides itself when a transaction begins, and loses updates.
    return sqlite3.connect(
        f"{path.as_uri()}?mode={mode}",
        uri=True,
        timeout=busy_timeout_s,
        isolation_level=None,
        check_same_thread=False,
    )


def _begin_with(engine: Engine, statement: str) -> None:
    # One that reads before it writes must be IMMEDIATE: it fails at once otherwise, whatever the timeout.
    def begin(connection: Connection) -> None:
        connection.exec_driver_sql(statement)

    event.listen(engine, "begin", begin)
