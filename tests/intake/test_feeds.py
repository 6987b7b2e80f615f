"""Files of a feed: found, read whole, known again, or left where they are with a reason."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from hashlib import sha256
from pathlib import Path

import pytest

from agewatch.intake import files, read_feed
from tests.intake.samples import COILS_HEAD, NOW_S, feed, read

MOVES = "coil_id,at,location\nA,2026-06-01T06:00:00Z,BAY\n"


def write(folder: Path, **contents: str) -> None:
    for name, text in contents.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8", newline="")


def test_a_file_is_read_once(tmp_path: Path) -> None:
    """Its fingerprint is SHA-256 of its bytes; by it the same content is known again, and gives no rows twice."""
    write(tmp_path, x=MOVES)
    (first,) = read(tmp_path)
    assert first.fingerprint == sha256(MOVES.encode()).hexdigest()
    assert len(first.rows) == 1
    (again,) = read_feed(feed(), tmp_path, now_s=NOW_S, known={"x.csv": first.fingerprint})
    assert again.unchanged
    assert again.rows == []
    write(tmp_path, x=MOVES + "B,2026-06-01T06:00:00Z,BAY\n")
    (changed,) = read_feed(feed(), tmp_path, now_s=NOW_S, known={"x.csv": first.fingerprint})
    assert not changed.unchanged
    assert len(changed.rows) == 2


def test_the_same_bytes_give_the_same(tmp_path: Path) -> None:
    """Rows, rejects and fingerprint do not depend on when or how often a file is read."""
    write(tmp_path, x=MOVES + "B,never,BAY\n")
    assert read(tmp_path) == read(tmp_path)


def test_files_of_a_pattern_come_by_name(tmp_path: Path) -> None:
    """So that later ones rule."""
    (tmp_path / "in").mkdir()
    (tmp_path / "in" / "folder.csv").mkdir()
    write(tmp_path / "in", b=MOVES, a=MOVES, c=MOVES)
    found = read(tmp_path, path="in/*.csv")
    assert [source.path for source in found] == ["in/a.csv", "in/b.csv", "in/c.csv"]
    assert [source.path for source in read(tmp_path, path="i*/b.csv")] == ["in/b.csv"]
    assert [source.path for source in read(tmp_path, path="**/c.csv")] == ["in/c.csv"]


def test_one_bad_file_stops_no_other(tmp_path: Path) -> None:
    """Each file of a pattern stands for itself."""
    write(tmp_path, a="", b=MOVES)
    bad, good = read(tmp_path, path="*.csv")
    assert bad.error is not None
    assert good.error is None
    assert len(good.rows) == 1


def test_a_name_with_brackets_is_a_name(tmp_path: Path) -> None:
    """A pattern that is the name of a file means that file."""
    write(tmp_path, **{"x[1]": MOVES})
    assert [source.path for source in read(tmp_path, path="x[1].csv")] == ["x[1].csv"]


def test_a_path_that_leads_elsewhere_is_taken_from_the_settings_alone(tmp_path: Path) -> None:
    """The settings may name any folder; a link that a pattern finds may not lead out of it."""
    inside, outside = tmp_path / "in", tmp_path / "out"
    inside.mkdir()
    outside.mkdir()
    write(outside, x=MOVES)
    (inside / "link.csv").symlink_to(outside / "x.csv")
    for path in ("../out/x.csv", "../out/*.csv", str(outside / "x.csv"), str(outside / "*.csv"), "link.csv"):
        assert [source.error for source in read(inside, path=path)] == [None], path
    (found,) = read(inside, path="*.csv")
    assert "leads out of" in str(found.error)
    write(outside, here=MOVES)
    (outside / "near.csv").symlink_to("here.csv")
    assert {source.error for source in read(outside, path="*.csv")} == {None}


@pytest.mark.parametrize(
    ("path", "words"),
    [
        ("none.csv", "No such file"),
        ("none*.csv", "no file matches"),
        ("folder", "Is a directory; name a file"),
        ("pipe", "no regular file"),
        ("loop", "symbolic links"),
        ("n" * 300, "name too long"),
        ("file/x.csv", "Not a directory"),
    ],
)
def test_what_is_no_file_is_told(tmp_path: Path, path: str, words: str) -> None:
    """One line with feed, path and reason; a pipe is not waited for."""
    (tmp_path / "folder").mkdir()
    (tmp_path / "file").touch()
    os.mkfifo(tmp_path / "pipe")
    (tmp_path / "loop").symlink_to("loop")
    (found,) = read(tmp_path, path=path)
    assert found.error is not None
    assert found.error.startswith(f"feed moves:{path}: {path}: ")
    assert words.casefold() in found.error.casefold()
    assert "\n" not in found.error
    assert (found.fingerprint, found.rows, found.rejects) == ("", [], [])


@contextmanager
def anybody() -> Iterator[None]:
    """Give up the rights of the superuser for a while."""
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)


def test_a_file_without_the_right_to_read_is_told() -> None:
    """And what to do about it."""
    import tempfile

    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        folder.chmod(0o755)
        write(folder, x=MOVES)
        (folder / "x.csv").chmod(0)
        with anybody():
            (found,) = read(folder)
    assert "Permission denied; let the user that runs agewatch read it" in str(found.error)


@pytest.mark.parametrize(
    "cut",
    ["A,2026-06-01T06:00:00Z", "A,2026-0", "A", 'A,2026-06-01T06:00:00Z,"BA', 'A,"2026-06-01\nT06:00'],
)
def test_a_half_written_file_waits(tmp_path: Path, cut: str) -> None:
    """A last line without its end that lacks cells is still being written: nothing of the file is taken in yet."""
    write(tmp_path, x=MOVES + cut)
    (found,) = read(tmp_path)
    assert "still being written" in str(found.error)
    assert (found.rows, found.rejects, found.fingerprint) == ([], [], "")


def test_a_half_written_header_waits(tmp_path: Path) -> None:
    """A header without its end that lacks columns may still grow."""
    write(tmp_path, x="coil_id,at,loc")
    (found,) = read(tmp_path)
    assert "still being written" in str(found.error)


def test_a_last_line_without_its_end_will_do_when_it_is_whole(tmp_path: Path) -> None:
    """Many programs write none."""
    write(tmp_path, x=MOVES.rstrip())
    (found,) = read(tmp_path)
    assert found.error is None
    assert len(found.rows) == 1


def test_a_file_that_grows_while_it_is_read_waits(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What was read is not what stands there now: the next reading takes it."""
    write(tmp_path, x=MOVES)
    fstat, looks = os.fstat, []

    def growing(descriptor: int) -> os.stat_result:
        looks.append(descriptor)
        if len(looks) == 2:
            with (tmp_path / "x.csv").open("a") as file:
                file.write("B,2026-06-01T06:00:00Z,BAY\n")
        return fstat(descriptor)

    monkeypatch.setattr(files.os, "fstat", growing)
    (found,) = read(tmp_path)
    assert "still being written" in str(found.error)


def test_a_file_too_large_for_the_memory_is_refused(tmp_path: Path) -> None:
    """By its size, before anything of it is read."""
    with (tmp_path / "x.csv").open("wb") as file:
        file.truncate(files.LARGEST_BYTES + 1)
    (found,) = read(tmp_path)
    assert "larger than 512 MB" in str(found.error)


@pytest.mark.parametrize("content", ["", "\n\n", "\ufeff", " \r\n"])
def test_an_empty_file_is_told(tmp_path: Path, content: str) -> None:
    """Not even a header: something went wrong where it was written."""
    write(tmp_path, x=content)
    (found,) = read(tmp_path)
    assert "is empty" in str(found.error)


@pytest.mark.parametrize("end", ["", "\n", "\r\n"])
def test_a_header_alone_has_no_rows(tmp_path: Path, end: str) -> None:
    """An empty table is no fault."""
    write(tmp_path, x=COILS_HEAD + end)
    (found,) = read(tmp_path, "coils")
    assert (found.error, found.rows, found.rejects) == (None, [], [])
    assert found.fingerprint


def test_bytes_of_another_encoding_are_told_with_their_place(tmp_path: Path) -> None:
    """Byte and line, and the key by which the settings name the encoding."""
    (tmp_path / "x.csv").write_bytes(MOVES.encode() + "B,2026-06-01T06:00:00Z,Kühlhalle\n".encode("cp1250"))
    (found,) = read(tmp_path)
    assert f"byte {len(MOVES) + 25} (in line 3) is not utf-8" in str(found.error)
    assert 'encoding = "cp1250"' in str(found.error)
    (named,) = read(tmp_path, encoding="cp1250")
    assert named.rows[1][2] == "Kühlhalle"


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1", "cp1252", "cp852"])
def test_every_declared_encoding_is_read(tmp_path: Path, encoding: str) -> None:
    """With its own byte order mark where it has one."""
    (tmp_path / "x.csv").write_bytes(MOVES.replace("BAY", "Kühlhalle").encode(encoding))
    (found,) = read(tmp_path, encoding=encoding)
    assert [row[2] for row in found.rows] == ["Kühlhalle"]


def test_two_byte_text_without_its_declaration_is_refused(tmp_path: Path) -> None:
    """UTF-16 read as UTF-8 is no CSV."""
    (tmp_path / "x.csv").write_bytes(MOVES.encode("utf-16"))
    (found,) = read(tmp_path)
    assert "byte 1 (in line 1) is not utf-8" in str(found.error)
