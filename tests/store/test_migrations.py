"""Migrations: the layout that the revisions make, the backup before, and other versions' stores."""

from __future__ import annotations

import shutil
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Engine

import agewatch
from agewatch.errors import StoreError
from agewatch.store import migrations, open_reader, open_store
from agewatch.store.engine import driver_of, writing_engine
from agewatch.store.migrations import HEAD, REVISIONS
from agewatch.store.queries import status
from agewatch.store.schema import metadata
from agewatch.store.upgrade import back_up, create, run_revisions
from agewatch.store.writes import put_status

URL = "sqlite:///plant.db"
NEXT = "9999"
NEXT_REVISION = f"""
import sqlalchemy as sa
from alembic import op

revision = "{NEXT}"
down_revision = "{HEAD}"


def upgrade() -> None:
    with op.batch_alter_table("sensor") as batch:
        batch.add_column(sa.Column("unit", sa.String()))
"""


@pytest.fixture
def migrated(tmp_path: Path) -> Iterator[Engine]:
    engine = writing_engine(tmp_path / "migrated.db")
    with engine.begin() as connection:
        run_revisions(connection, "head")
    yield engine
    engine.dispose()


def layout(database: Engine) -> list[tuple[str, str, str]]:
    """Everything that makes up the database: tables, indexes and triggers, in SQL."""
    return driver_of(database).execute("SELECT type, name, sql FROM sqlite_master ORDER BY name").fetchall()


def test_the_revisions_make_what_the_schema_declares(migrated: Engine) -> None:
    """Alembic finds no difference between a migrated store and the tables of schema.py."""
    with migrated.connect() as connection:
        assert compare_metadata(MigrationContext.configure(connection), metadata) == []


def test_a_new_store_is_laid_out_as_a_migrated_one(migrated: Engine, tmp_path: Path) -> None:
    """Tables, indexes and triggers are the same to the letter, whether created at once or by revisions."""
    created = writing_engine(tmp_path / "created.db")
    create(created)
    assert layout(created) == layout(migrated)
    created.dispose()


def test_the_known_revisions_are_those_of_alembic() -> None:
    """The list that is known without Alembic is its history, oldest first, and has one head."""
    scripts = ScriptDirectory(str(Path(migrations.__file__).parent))
    assert scripts.get_heads() == [HEAD]
    assert tuple(script.revision for script in scripts.walk_revisions())[::-1] == REVISIONS


def run(program: str, *paths: Path) -> str:
    """What a program prints that runs elsewhere, with the package found in the first of `paths`."""
    packages, folder = paths
    lines = f"from pathlib import Path\nfolder = Path({str(folder)!r})\nurl = {URL!r}\n{program}"
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", lines],
        cwd=folder,
        env={"PYTHONPATH": str(packages), "PATH": ""},
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    return done.stdout + done.stderr


def test_opening_a_current_store_does_not_need_alembic(tmp_path: Path) -> None:
    """Neither creating nor opening loads it: its import takes longer than both."""
    program = (
        "import sys\nfrom agewatch.store import open_store\n"
        "open_store(url, folder).close()\nopen_store(url, folder).close()\nprint('alembic' in sys.modules)"
    )
    assert run(program, Path(agewatch.__file__).parents[1], tmp_path) == "False\n"


@pytest.fixture
def newer(tmp_path: Path) -> Path:
    """The program as a later version would be installed: one revision and one column more."""
    source = Path(agewatch.__file__).parent
    packages = tmp_path / "site-packages"
    shutil.copytree(source, packages / "agewatch", ignore=shutil.ignore_patterns("__pycache__"))
    store = packages / "agewatch" / "store"
    (store / "migrations" / "versions" / f"r{NEXT}_units.py").write_text(NEXT_REVISION)
    known = store / "migrations" / "__init__.py"
    known.write_text(known.read_text().replace(f'"{HEAD}",', f'"{HEAD}", "{NEXT}",'))
    return packages


def plant(tmp_path: Path) -> Path:
    """A folder with a store of this version, in which there is something to lose."""
    folder = tmp_path / "plant"
    with open_store(URL, folder) as store, store.write() as tx:
        put_status(tx, "count", 1, 0.0)
        tx.connection.exec_driver_sql("INSERT INTO sensor VALUES (7, 'T7')")
        tx.connection.exec_driver_sql("INSERT INTO reading VALUES (7, 1000, 20.5)")
    return folder


def columns_of(database: Path, table: str) -> list[str]:
    with closing(sqlite3.connect(database)) as driver:
        return [row[1] for row in driver.execute(f"PRAGMA table_info({table})")]


def test_an_older_store_is_brought_up_to_date_after_a_backup(tmp_path: Path, newer: Path) -> None:
    """The installed newer daemon copies the store aside, migrates it, and loses no row; the copy is as it was."""
    folder = plant(tmp_path)
    program = (
        "from agewatch.store import open_store\nfrom agewatch.store.queries import readings, status\n"
        "with open_store(url, folder) as store, store.write() as tx:\n"
        "    held = tx.connection.exec_driver_sql('PRAGMA foreign_keys').scalar()\n"
        "    print(status(tx), readings(tx).celsius, held)"
    )
    assert run(program, newer, folder) == "{'count': 1} [20.5] 1\n"
    assert columns_of(folder / "plant.db", "sensor") == ["sensor_id", "name", "unit"]
    backup = folder / f"plant.db.before-{NEXT}"
    assert columns_of(backup, "sensor") == ["sensor_id", "name"]
    with open_reader(f"sqlite:///{backup}", folder) as reader, reader.read() as view:
        assert status(view) == {"count": 1}


def test_a_store_of_another_version_is_refused_in_words(tmp_path: Path, newer: Path) -> None:
    """The newer program does not read an older store, the older one neither reads nor writes a newer store."""
    folder = plant(tmp_path)
    read = (
        "from agewatch.errors import StoreError\nfrom agewatch.store import open_reader\n"
        "try: open_reader(url, folder)\nexcept StoreError as error: print(error)"
    )
    assert f"laid out by an older agewatch (revision {HEAD}, here {NEXT}); start this" in run(
        read, newer, folder
    )
    assert run("from agewatch.store import open_store\nopen_store(url, folder)", newer, folder) == ""
    for opener in (open_reader, open_store):
        with pytest.raises(StoreError, match=rf"newer agewatch \(revision {NEXT}, here {HEAD}\); install"):
            opener(URL, folder)


def test_a_migration_that_fails_leaves_the_store_as_it_was(tmp_path: Path, newer: Path) -> None:
    """A store whose rows refer to nothing is not migrated; the message names the row."""
    folder = plant(tmp_path)
    with closing(sqlite3.connect(folder / "plant.db", isolation_level=None)) as driver:
        driver.execute("INSERT INTO reading VALUES (8, 1000, 20.5)")
    program = (
        "from agewatch.errors import StoreError\nfrom agewatch.store import open_store\n"
        "try: open_store(url, folder)\nexcept StoreError as error: print(error)"
    )
    assert "of table reading refers to a row that is not there; nothing was migrated" in run(
        program, newer, folder
    )
    with open_reader(URL, folder) as reader, reader.read() as view:
        assert status(view) == {"count": 1}


def test_a_backup_of_a_store_in_use_is_whole(tmp_path: Path) -> None:
    """The copy has what was kept up to then, log included, and replaces an older copy at once."""
    target = tmp_path / "copy.db"
    target.write_text("an older copy")
    with open_store(URL, tmp_path) as store:
        with store.write() as tx:
            put_status(tx, "count", 5, 0.0)
        back_up(store.path, target)
    with open_reader(f"sqlite:///{target}", tmp_path) as reader, reader.read() as view:
        assert status(view) == {"count": 5}
    assert not target.with_name("copy.db.partial").exists()
