"""Creating a store's tables, and bringing an older store up to date after a backup."""

from __future__ import annotations

import os
import sqlite3
from pathlib import Path

from sqlalchemy import Column, Connection, Engine, MetaData, String, Table, inspect, select

from agewatch.errors import StoreError
from agewatch.store.engine import driver_of
from agewatch.store.migrations import HEAD
from agewatch.store.schema import metadata

_version = Table(  # as Alembic itself would create it
    "alembic_version",
    MetaData(naming_convention={"pk": "alembic_version_pkc"}),
    Column("version_num", String(32), primary_key=True),
)


def stored_revision(connection: Connection, path: Path) -> str | None:
    """The revision of the store's layout; None: the database is empty. StoreError: it is somebody else's."""
    tables = inspect(connection).get_table_names()
    if not tables:
        return None
    if _version.name not in tables:
        raise StoreError(f"store {path}: it is a database, but not one of agewatch; correct store.url")
    return str(connection.execute(select(_version.c.version_num)).scalar_one())


def create(writer: Engine) -> None:
    """All tables in an empty database, as the revisions together would have made them."""
    with writer.begin() as connection:
        metadata.create_all(connection)
        _version.create(connection)
        connection.execute(_version.insert().values(version_num=HEAD))


def upgrade(writer: Engine, path: Path, *, to: str) -> None:
    """Run every revision up to `to` in one transaction, after a backup to `<database>.before-<to>`."""
    back_up(path, path.with_name(f"{path.name}.before-{to}"))
    driver = driver_of(writer)
    driver.execute("PRAGMA foreign_keys = OFF")  # tables are rebuilt under the names that others refer to
    try:
        with writer.begin() as connection:
            run_revisions(connection, to)
            broken = connection.exec_driver_sql("PRAGMA foreign_key_check").first()
            if broken is not None:
                raise StoreError(
                    f"store {path}: row {broken[1]} of table {broken[0]} refers to a row that is not there; "
                    "nothing was migrated: restore a backup that is sound"
                )
    finally:
        driver.execute("PRAGMA foreign_keys = ON")


def run_revisions(connection: Connection, to: str) -> None:
    """Migrate on `connection`, inside its transaction."""
    from alembic import command  # noqa: PLC0415 - takes a third of a second, and is rarely needed
    from alembic.config import Config  # noqa: PLC0415

    config = Config()
    config.set_main_option("script_location", "agewatch.store:migrations")
    config.set_main_option("path_separator", "os")
    config.attributes["connection"] = connection
    command.upgrade(config, to)


def back_up(path: Path, target: Path) -> None:
    """A consistent copy of a store that may be in use; `target` is made or replaced only once it is whole."""
    partial = target.with_name(f"{target.name}.partial")
    source = sqlite3.connect(f"{path.as_uri()}?mode=ro", uri=True)
    copy = sqlite3.connect(partial)
    try:
        source.backup(copy)
    finally:
        copy.close()
        source.close()
    _sync(partial)
    os.replace(partial, target)
    _sync(target.parent)


def _sync(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
