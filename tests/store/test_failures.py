"""The driver's errors become one line each that says what to do."""

from __future__ import annotations

import sqlite3
from pathlib import Path

import pytest
from sqlalchemy.exc import TimeoutError as PoolTimeoutError

from agewatch.errors import StoreError
from agewatch.store.failures import as_store_errors


@pytest.mark.parametrize(
    ("code", "advice"),
    [
        (sqlite3.SQLITE_FULL, "the disk is full"),
        (sqlite3.SQLITE_IOERR, "check the disk"),
        (sqlite3.SQLITE_IOERR_FSYNC, "check the disk"),
        (sqlite3.SQLITE_BUSY_SNAPSHOT, "another program holds it locked"),
        (sqlite3.SQLITE_LOCKED, "another program holds it locked"),
        (sqlite3.SQLITE_CORRUPT, "restore it from a backup"),
        (sqlite3.SQLITE_NOTADB, "restore it from a backup"),
        (sqlite3.SQLITE_READONLY_DIRECTORY, "check the permissions"),
        (sqlite3.SQLITE_CANTOPEN, "check the path and the permissions"),
        (sqlite3.SQLITE_CONSTRAINT_UNIQUE, "contradicts what is stored"),
        (sqlite3.SQLITE_ERROR, "store /s.db: no such thing"),
    ],
)
def test_every_failure_says_what_to_do(code: int, advice: str) -> None:
    """Extended codes count as their kind; the driver's own words and the error itself are kept."""
    error = sqlite3.OperationalError("no such thing")
    error.sqlite_errorcode = code
    with pytest.raises(StoreError, match=advice) as caught, as_store_errors(Path("/s.db")):
        raise error
    assert "no such thing" in str(caught.value)
    assert "\n" not in str(caught.value)
    assert caught.value.__cause__ is error


def test_waiting_in_vain_for_a_connection_is_the_stores_failure() -> None:
    """More readers than connections is trouble with the store, not a crash."""
    with pytest.raises(StoreError, match="store /s"), as_store_errors(Path("/s.db")):
        raise PoolTimeoutError("QueuePool limit reached")


def test_other_errors_pass() -> None:
    """What is no failure of the store stays what it is."""
    with pytest.raises(ValueError, match="bays"), as_store_errors(Path("/s.db")):
        raise ValueError("bays")
