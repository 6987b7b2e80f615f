"""The one place where the driver's errors become StoreError, each with what to do about it."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from sqlalchemy.exc import DBAPIError
from sqlalchemy.exc import TimeoutError as PoolTimeoutError

from agewatch.errors import StoreError

_BROKEN = "it is not a sound SQLite database: restore it from a backup"
_LOCKED = "another program holds it locked: end that program, or wait until it has finished"
_ADVICE = {
    sqlite3.SQLITE_BUSY: _LOCKED,
    sqlite3.SQLITE_LOCKED: _LOCKED,
    sqlite3.SQLITE_CORRUPT: _BROKEN,
    sqlite3.SQLITE_NOTADB: _BROKEN,
    sqlite3.SQLITE_FULL: "the disk is full: free some space; nothing of this change was kept",
    sqlite3.SQLITE_IOERR: "reading or writing failed: check the disk, then start again",
    sqlite3.SQLITE_READONLY: "it cannot be written: check the permissions of the file and its folder",
    sqlite3.SQLITE_CANTOPEN: "it cannot be opened: check the path and the permissions of file and folder",
    sqlite3.SQLITE_CONSTRAINT: "a row contradicts what is stored; nothing of this change was kept",
}


@contextmanager
def as_store_errors(path: Path) -> Iterator[None]:
    """Raise StoreError, chained, for whatever the driver raises inside."""
    try:
        yield
    except DBAPIError as error:
        raise _store_error(path, error.orig or error) from error
    except (sqlite3.Error, PoolTimeoutError) as error:
        raise _store_error(path, error) from error
    except UnicodeEncodeError as error:  # half a surrogate pair, which JSON can smuggle in
        text = ascii(error.object[error.start : error.end])
        raise StoreError(f"store {path}: {text} is no character; give a text without it") from error


def _store_error(path: Path, error: BaseException) -> StoreError:
    code = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_ERROR) & 0xFF  # the low byte of an extended code
    advice = _ADVICE.get(code)
    return StoreError(f"store {path}: {error}" if advice is None else f"store {path}: {advice} ({error})")
