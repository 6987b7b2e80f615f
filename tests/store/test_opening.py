"""Opening an SQLite store: who may, what is refused and in which words, what is left untouched."""

from __future__ import annotations

import os
import signal
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

import pytest
from sqlalchemy import text

from agewatch.errors import StoreError
from agewatch.store import Store, View, open_reader, open_store, sqlite_version
from agewatch.store.queries import status
from agewatch.store.writes import put_status

URL = "sqlite:///plant.db"


def pragma(view: View, name: str) -> object:
    return view.connection.execute(text(f"PRAGMA {name}")).scalar()


def fill(folder: Path, count: int = 1) -> None:
    with open_store(URL, folder) as store, store.write() as tx:
        put_status(tx, "count", count, 0.0)


def count_in(folder: Path) -> object:
    with open_reader(URL, folder) as reader, reader.read() as view:
        return status(view)["count"]


@contextmanager
def other_process(folder: Path, program: str) -> Iterator[subprocess.Popen[str]]:
    """Another process that runs `program` with `store` open; begun once it has printed a line."""
    lines = (
        "import os, signal, sys",
        "from pathlib import Path",
        "from agewatch.store import open_store",
        "from agewatch.store.writes import put_status",
        f"store = open_store({URL!r}, Path({str(folder)!r}))",
        program,
    )
    command = [sys.executable, "-c", "\n".join(lines)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as process:
        try:
            yield process
        finally:
            process.kill()


def test_the_writer_is_durable_and_holds_references(tmp_path: Path) -> None:
    """The writing connection keeps every commit through a power cut, and rows that refer to each other."""
    with open_store(URL, tmp_path) as store, store.write() as tx:
        wanted = {"journal_mode": "wal", "synchronous": 2, "foreign_keys": 1, "busy_timeout": 5000}
        assert {name: pragma(tx, name) for name in wanted} == wanted


def test_a_transaction_holds_the_right_to_write_from_its_begin(tmp_path: Path) -> None:
    """What it reads first cannot be changed by any other program before it writes."""
    with open_store(URL, tmp_path) as store, closing(sqlite3.connect(store.path, timeout=0.05)) as other:
        with store.write(), pytest.raises(sqlite3.OperationalError, match="database is locked"):
            other.execute("BEGIN IMMEDIATE")
        other.execute("BEGIN IMMEDIATE")


def test_a_view_cannot_write(tmp_path: Path) -> None:
    """Connections that read are refused any change."""
    fill(tmp_path)
    with (
        open_store(URL, tmp_path) as store,
        pytest.raises(StoreError, match="cannot be written"),
        store.read() as view,
    ):
        view.connection.execute(text("DELETE FROM status"))


def test_a_relative_path_lies_in_the_settings_folder(tmp_path: Path) -> None:
    """Folders on the way to a new store are made; an absolute path is taken as it is."""
    with open_store("sqlite:///var/lib/plant.db", tmp_path) as store:
        assert store.path == tmp_path / "var/lib/plant.db"
    assert store.path.exists()
    with open_store(f"sqlite:///{tmp_path}/here.db", Path("/nowhere")) as store:
        assert store.path == tmp_path / "here.db"


@pytest.mark.parametrize(
    "url",
    ["plant.db", "sqlite://", "sqlite:///:memory:", "sqlite:///plant.db?mode=ro", "mysql://host/plant", ""],
)
def test_a_url_that_names_no_file_is_refused(tmp_path: Path, url: str) -> None:
    """The message says what is allowed."""
    with pytest.raises(StoreError, match='allowed is "sqlite:///" and the path of a file'):
        open_store(url, tmp_path)


def test_a_second_writer_is_refused(tmp_path: Path) -> None:
    """The message names the process that writes; readers are not kept out."""
    fill(tmp_path)
    with other_process(tmp_path, "print(os.getpid(), flush=True); sys.stdin.read()") as process:
        assert process.stdout is not None
        pid = int(process.stdout.readline())
        with pytest.raises(StoreError, match=rf"another agewatch daemon \(pid {pid}\) is writing this store"):
            open_store(URL, tmp_path)
        assert count_in(tmp_path) == 1


def test_a_second_writer_in_the_same_process_is_refused(tmp_path: Path) -> None:
    """The right to write is held by the opening, not by the process; closing hands it on."""
    with open_store(URL, tmp_path), pytest.raises(StoreError, match=f"pid {os.getpid()}"):
        open_store(URL, tmp_path)
    open_store(URL, tmp_path).close()


def test_a_killed_writer_leaves_what_it_had_kept_and_nothing_else(tmp_path: Path) -> None:
    """Its right to write ends with it; a change that it had not finished is gone."""
    program = """
with store.write() as tx:
    put_status(tx, "count", 1, 0.0)
with store.write() as tx:
    put_status(tx, "count", 2, 0.0)
    os.kill(os.getpid(), signal.SIGKILL)
"""
    with other_process(tmp_path, program) as process:
        assert process.wait(30) == -signal.SIGKILL
    assert count_in(tmp_path) == 1
    fill(tmp_path, 3)
    assert count_in(tmp_path) == 3


def test_a_store_that_is_not_there_is_not_made_by_reading(tmp_path: Path) -> None:
    """The message says who makes it; the folder stays empty."""
    with pytest.raises(StoreError, match="none is there; start the daemon"):
        open_reader(URL, tmp_path)
    assert list(tmp_path.iterdir()) == []


def test_an_empty_file_is_no_store_to_read(tmp_path: Path) -> None:
    """A reader does not fill it, the daemon does."""
    (tmp_path / "plant.db").touch()
    with pytest.raises(StoreError, match="it is empty; start the daemon"):
        open_reader(URL, tmp_path)
    fill(tmp_path)
    assert count_in(tmp_path) == 1


@pytest.mark.parametrize("content", [b"coil_id;grade\n" * 100, os.urandom(9000)])
def test_what_is_no_database_is_refused_and_left_alone(tmp_path: Path, content: bytes) -> None:
    """Neither reader nor writer touches a file that is something else."""
    (tmp_path / "plant.db").write_bytes(content)
    for opener in (open_reader, open_store):
        with pytest.raises(StoreError, match="not a sound SQLite database: restore it from a backup"):
            opener(URL, tmp_path)
    assert (tmp_path / "plant.db").read_bytes() == content


def test_somebody_elses_database_is_refused_and_left_alone(tmp_path: Path) -> None:
    """A database without the store's mark is not written, not even its journal mode."""
    with closing(sqlite3.connect(tmp_path / "plant.db")) as other:
        other.execute("CREATE TABLE orders (number)")
    content = (tmp_path / "plant.db").read_bytes()
    for opener in (open_reader, open_store):
        with pytest.raises(StoreError, match=r"not one of agewatch; correct store\.url"):
            opener(URL, tmp_path)
    assert (tmp_path / "plant.db").read_bytes() == content


def test_a_torn_store_is_refused(tmp_path: Path) -> None:
    """A database whose pages are damaged says what to do."""
    fill(tmp_path)
    size = (tmp_path / "plant.db").stat().st_size
    with (tmp_path / "plant.db").open("r+b") as file:
        file.seek(4096)
        file.write(b"\xff" * (size - 4096))
    with pytest.raises(StoreError, match="not a sound SQLite database"):
        count_in(tmp_path)


def test_a_locked_store_is_refused_after_the_time_allowed(tmp_path: Path) -> None:
    """A program that holds the whole database keeps readers out; the message says so."""
    fill(tmp_path)
    with closing(sqlite3.connect(tmp_path / "plant.db", isolation_level=None)) as other:
        other.execute("PRAGMA locking_mode = EXCLUSIVE")
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(StoreError, match="another program holds it locked"):
            open_reader(URL, tmp_path, busy_timeout_s=0.05)


def test_a_path_through_a_file_is_told(tmp_path: Path) -> None:
    """A folder of the path that is a file is an error of the path."""
    (tmp_path / "var").touch()
    with pytest.raises(StoreError, match="check the path and its permissions"):
        open_store("sqlite:///var/plant.db", tmp_path)


def test_reading_leaves_the_database_file_as_a_killed_writer_left_it(tmp_path: Path) -> None:
    """Only the writer moves its log into the database: a reader reads the log and leaves both alone."""
    program = """
with store.write() as tx:
    put_status(tx, "count", 1, 0.0)
os.kill(os.getpid(), signal.SIGKILL)
"""
    with other_process(tmp_path, program) as process:
        process.wait(30)
    files = [tmp_path / name for name in ("plant.db", "plant.db-wal")]
    before = [file.read_bytes() for file in files]
    assert count_in(tmp_path) == 1
    assert [file.read_bytes() for file in files] == before


def test_closing_takes_the_log_into_the_database(tmp_path: Path) -> None:
    """A store that was closed is one file, fit to be copied."""
    fill(tmp_path)
    assert sorted(file.name for file in tmp_path.iterdir()) == ["plant.db", "plant.db.lock"]


def test_a_full_disk_keeps_nothing_of_the_change(tmp_path: Path) -> None:
    """The change is refused whole; once there is room the store goes on."""
    fill(tmp_path)
    with open_store(URL, tmp_path) as store:
        with pytest.raises(StoreError, match="the disk is full: free some space"):
            overfill(store)
        with store.write() as tx:
            assert status(tx) == {"count": 1}
            pragma(tx, "max_page_count = 1000000")
            put_status(tx, "count", 2, 0.0)
    assert count_in(tmp_path) == 2


def overfill(store: Store) -> None:
    with store.write() as tx:
        pragma(tx, f"max_page_count = {pragma(tx, 'page_count')}")
        put_status(tx, "count", 99, 0.0)
        put_status(tx, "long", "x" * 1_000_000, 0.0)


def test_a_change_that_was_dropped_half_way_is_not_kept_in_part(tmp_path: Path) -> None:
    """Where SQLite rolled back by itself, what follows in the block is not taken for the whole change."""
    with open_store(URL, tmp_path) as store:
        with pytest.raises(StoreError, match="dropped half-way"):
            drop_half_way(store)
        with store.write() as tx:
            put_status(tx, "count", 2, 0.0)
    assert count_in(tmp_path) == 2


def drop_half_way(store: Store) -> None:
    with store.write() as tx:
        put_status(tx, "count", 1, 0.0)
        tx.connection.exec_driver_sql("ROLLBACK")


def test_the_library_names_its_version() -> None:
    """Three numbers, for the log."""
    assert len(sqlite_version().split(".")) == 3
