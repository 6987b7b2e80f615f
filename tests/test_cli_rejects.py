"""`agewatch rejects`: out of the store to be mended, and in again."""

from __future__ import annotations

import csv
import json
import os
import pwd
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from agewatch.cli import main
from agewatch.daemon.actions import answer
from agewatch.daemon.control import ControlSocket
from agewatch.daemon.desk import Desk
from tests.daemon.samples import COIL_HEAD, FRESH, OLD, TinyPlant

ME = f"user:{pwd.getpwuid(os.getuid()).pw_name}"
BAD = [FRESH.replace("C-FRESH", name).replace("2026-07-10", "10.7.2026") for name in ("=C-1", "C-2")]

Rejects = Callable[..., tuple[int, str, str]]


@pytest.fixture
def plant(tmp_path: Path) -> Iterator[TinyPlant]:
    """Two rows that could not be used are in the store, which no daemon has open."""
    one = TinyPlant(tmp_path)
    one.write("coils.csv", COIL_HEAD + OLD + "".join(BAD))
    one.read()
    one.close()
    yield one
    one.close()


@pytest.fixture
def rejects(plant: TinyPlant, capsys: pytest.CaptureFixture[str]) -> Rejects:
    """Run a sub-command; exit status, stdout, stderr."""

    def run(name: str, *arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as ended:
            main(["rejects", name, "--config", str(plant.folder / "plant.toml"), *arguments])
        assert isinstance(ended.value.code, int)
        return ended.value.code, *capsys.readouterr()

    return run


def mend(file: Path, *, wrong: str, right: str, only: str = "") -> None:
    """Mend the exported rows as a person would in a spreadsheet."""
    with file.open(newline="") as table:
        rows = list(csv.DictReader(table))
    for row in rows:
        if only in row["raw"]:
            row["raw"] = row["raw"].replace(wrong, right)
    with file.open("w", newline="") as table:
        writer = csv.DictWriter(table, rows[0])
        writer.writeheader()
        writer.writerows(rows)


def test_list(rejects: Rejects) -> None:
    """Every waiting row with source, line, column and reason, in each form."""
    status, out, _ = rejects("list")
    assert status == 0
    assert out.splitlines()[-1] == "rows that wait to be mended: 2"
    assert out.splitlines()[1].split()[1:4] == ["coils.csv", "3", "temper_rolled_at"]
    document = json.loads(rejects("list", "--json")[1])
    assert [reject["raw"] for reject in document] == [row.strip() for row in BAD]
    table = list(csv.DictReader(rejects("list", "--csv")[1].splitlines()))
    assert [row["line"] for row in table] == ["3", "4"]
    assert table[0]["raw"].startswith("'=C-1")


def test_list_of_one_feed(rejects: Rejects) -> None:
    """Of one feed only; a feed that is not there is bad usage."""
    assert json.loads(rejects("list", "--json", "--feed", "temperatures:temps.csv")[1]) == []
    status, _, err = rejects("list", "--feed", "coils")
    assert status == 2
    assert "there is coils:coils*.csv, temperatures:temps.csv" in err


def test_mended_rows_go_in(rejects: Rejects, plant: TinyPlant) -> None:
    """Exported, mended and submitted, the rows are coils like any other, and wait no more."""
    file = plant.folder / "mend.csv"
    assert rejects("export", str(file))[1] == f"2 rows written to {file}\n"
    mend(file, wrong="10.7.2026", right="2026-07-10")
    assert rejects("resubmit", str(file))[:2] == (0, "2 taken in\n")
    plant.reopen()
    assert plant.rejects() == []
    assert {"=C-1", "C-2"} <= set(plant.round())
    told = [row for row in plant.journal() if row.kind == "resubmitted"]
    assert [(row.actor, row.before) for row in told] == [(ME, row.strip()) for row in BAD]


def test_row_that_is_still_wrong_waits_on(rejects: Rejects, plant: TinyPlant) -> None:
    """What is mended goes in; what is not is named with its reason and waits on."""
    file = plant.folder / "mend.csv"
    rejects("export", str(file))
    mend(file, wrong="10.7.2026", right="2026-07-10", only="C-2")
    status, out, _ = rejects("resubmit", str(file))
    assert status == 1
    assert out.startswith("1 taken in, 1 still rejected: 1: temper_rolled_at: ")
    plant.reopen()
    assert [stored.reject.raw for stored in plant.rejects()] == [BAD[0].strip()]


def test_same_file_twice(rejects: Rejects, plant: TinyPlant) -> None:
    """Rows that were taken in already are not taken in again."""
    file = plant.folder / "mend.csv"
    rejects("export", str(file))
    mend(file, wrong="10.7.2026", right="2026-07-10")
    rejects("resubmit", str(file))
    status, out, _ = rejects("resubmit", str(file))
    assert status == 1
    assert out == "0 taken in, 2 still rejected: 1: no such row waits; 2: no such row waits\n"


def test_by_a_running_daemon(rejects: Rejects, plant: TinyPlant) -> None:
    """While a daemon has the store, the rows go in by its socket."""
    file = plant.folder / "mend.csv"
    rejects("export", str(file))
    mend(file, wrong="10.7.2026", right="2026-07-10")
    desk = Desk(plant.reopen(), plant.loaded.settings, plant.clock)
    control = ControlSocket(
        plant.folder / "agewatch.sock",
        lambda request, actor: answer(desk, request, actor),
        lambda actor, reason: desk.refuse({}, actor, reason),
    )
    control.start()
    try:
        assert rejects("resubmit", str(file))[:2] == (0, "2 taken in\n")
    finally:
        control.stop()
    assert plant.rejects() == []


def test_many_rows_go_in_several_requests(rejects: Rejects, plant: TinyPlant) -> None:
    """More rows than one request can hold go in all the same."""
    many = [BAD[1].replace("C-2", f"C-{number}") for number in range(800)]
    plant.write("coils-many.csv", COIL_HEAD + "".join(many))
    plant.reopen()
    plant.read()
    plant.close()
    file = plant.folder / "mend.csv"
    rejects("export", str(file))
    mend(file, wrong="10.7.2026", right="2026-07-10")
    status, out, _ = rejects("resubmit", str(file))
    assert status == 0
    assert sum(int(line.split()[0]) for line in out.splitlines()) == 802
    assert len(out.splitlines()) > 1


@pytest.mark.parametrize(
    ("content", "told"),
    [(None, "No such file"), (b"a,b\n1,2\n", "columns reject_id and raw"), (b"\xff", "UTF-8")],
)
def test_file_that_is_none_of_ours(
    rejects: Rejects, plant: TinyPlant, content: bytes | None, told: str
) -> None:
    """A file that `export` did not write is refused, and says what is expected."""
    file = plant.folder / "mend.csv"
    if content is not None:
        file.write_bytes(content)
    status, _, err = rejects("resubmit", str(file))
    assert status == 2
    assert told in err


def test_export_overwrites_nothing(rejects: Rejects, plant: TinyPlant) -> None:
    """A file that is there already may hold somebody's work: it is left alone."""
    status, _, err = rejects("export", str(plant.folder / "coils.csv"))
    assert status == 2
    assert "name a new file" in err


def test_store_that_is_not_there(rejects: Rejects, plant: TinyPlant) -> None:
    """Without a store there is nothing to list, and the status says so."""
    plant.store.path.unlink()
    assert rejects("list")[0] == 3
