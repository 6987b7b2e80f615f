"""Opening a store: for its one writer, who brings it up to date first, and for those who only read."""

from __future__ import annotations

from pathlib import Path

from sqlalchemy import Engine

from agewatch.errors import StoreError
from agewatch.store.access import Reader, Store
from agewatch.store.engine import BUSY_TIMEOUT_S, database_path, reading_engine, writing_engine
from agewatch.store.failures import as_store_errors
from agewatch.store.migrations import HEAD, REVISIONS
from agewatch.store.sole_writer import SoleWriter
from agewatch.store.upgrade import create, stored_revision, upgrade


def open_store(url: str, folder: Path) -> Store:
    """The store at `url` for writing: created where there is none, brought up to date after a backup.

    Parameters
    ----------
    url
        `sqlite:///PATH`; a relative path lies in `folder`.

    Raises StoreError when another process writes it, when it is not sound, or when it is no store of AgeWatch
    or one of a newer version.
    """
    path = database_path(url, folder)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        claim = SoleWriter(path)
    except OSError as error:
        raise StoreError(f"store {path}: {error}; check the path and its permissions") from error
    readers, writer = reading_engine(path), writing_engine(path)
    try:
        with as_store_errors(path):
            _bring_up_to_date(path, readers, writer)
    except BaseException:
        readers.dispose()
        writer.dispose()
        claim.release()
        raise
    return Store(path, readers, writer, claim)


def open_reader(url: str, folder: Path, *, busy_timeout_s: float = BUSY_TIMEOUT_S) -> Reader:
    """The store at `url` for reading only; never creates it. `busy_timeout_s`: how long to wait for a lock.

    Raises StoreError when it is absent, locked, not sound, no store of AgeWatch, or one of another version.
    """
    path = database_path(url, folder)
    if not path.exists():
        raise StoreError(f"store {path}: none is there; start the daemon (agewatch run) or correct store.url")
    readers = reading_engine(path, busy_timeout_s)
    try:
        with as_store_errors(path):
            _check_current(path, _revision(path, readers))
    except BaseException:
        readers.dispose()
        raise
    return Reader(path, readers)


def _bring_up_to_date(path: Path, readers: Engine, writer: Engine) -> None:
    # Looked at through a reader first: nobody else's database is changed in any way.
    revision = _revision(path, readers) if path.exists() and path.stat().st_size else None
    if revision is None:
        create(writer)
    elif revision in REVISIONS[:-1]:
        upgrade(writer, path, to=HEAD)
    else:
        _check_current(path, revision)


def _revision(path: Path, readers: Engine) -> str | None:
    with readers.connect() as connection:
        return stored_revision(connection, path)


def _check_current(path: Path, revision: str | None) -> None:
    if revision is None:
        raise StoreError(f"store {path}: it is empty; start the daemon (agewatch run), which fills it")
    if revision in REVISIONS[:-1]:
        raise StoreError(
            f"store {path}: it was laid out by an older agewatch (revision {revision}, here {HEAD}); "
            "start this version's daemon (agewatch run), which brings it up to date"
        )
    if revision != HEAD:
        raise StoreError(
            f"store {path}: it was laid out by a newer agewatch (revision {revision}, here {HEAD}); "
            "install that version, or restore an older backup"
        )
