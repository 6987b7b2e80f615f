"""Transactions on an open store: many that read, one at a time that writes."""

from __future__ import annotations

import sqlite3
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from sqlalchemy import Connection, Engine
from sqlalchemy.sql import Executable

from agewatch.errors import StoreError
from agewatch.store.failures import as_store_errors
from agewatch.store.sole_writer import SoleWriter


class View:
    """One consistent state of the store. The functions of queries*.py take it first."""

    def __init__(self, connection: Connection) -> None:
        self.connection = connection

    def fetch(self, statement: Executable) -> list[tuple[Any, ...]]:
        """Every row, as the driver gives it: quicker than SQLAlchemy's rows, flags as 0 and 1."""
        cursor = self.connection.execute(statement).cursor
        return [] if cursor is None else list(cursor.fetchall())


class Transaction(View):
    """Changes that are kept together or not at all. The functions of writes*.py take it first."""


class Reader:
    """A store that is only read. Usable from several threads."""

    def __init__(self, path: Path, readers: Engine) -> None:
        self.path = path
        self._readers = readers

    @contextmanager
    def read(self) -> Iterator[View]:
        """A view of the store as it stands at its first query. Raises StoreError."""
        with as_store_errors(self.path), self._readers.connect() as connection, connection.begin():
            yield View(connection)

    def close(self) -> None:
        self._readers.dispose()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()


class Store(Reader):
    """A store that this process alone writes. Usable from several threads."""

    def __init__(self, path: Path, readers: Engine, writer: Engine, claim: SoleWriter) -> None:
        super().__init__(path, readers)
        self._writer = writer
        self._claim = claim
        self._turn = threading.Lock()
        self._writing_thread: int | None = None

    @contextmanager
    def write(self) -> Iterator[Transaction]:
        """A transaction, kept when the block ends and dropped when it raises; waits for its turn.

        Raises StoreError, also when it is begun inside another one of the same thread.
        """
        if self._writing_thread == threading.get_ident():
            raise StoreError(f"store {self.path}: one transaction inside another; use the outer one")
        with self._turn:
            self._writing_thread = threading.get_ident()
            try:
                with as_store_errors(self.path), self._writer.begin() as connection:
                    yield Transaction(connection)
                    self._check_still_open(connection)
            finally:
                self._writing_thread = None

    def close(self) -> None:
        """Close every connection, the writing one last: it takes the log into the database file."""
        with self._turn:
            super().close()
            self._writer.dispose()
            self._claim.release()

    def _check_still_open(self, connection: Connection) -> None:
        # A full disk makes SQLite roll back by itself; what followed was then kept piece by piece.
        driver = connection.connection.driver_connection
        if isinstance(driver, sqlite3.Connection) and not driver.in_transaction:
            raise StoreError(f"store {self.path}: the change was dropped half-way; make all of it anew")
