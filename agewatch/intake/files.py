"""Finding the files of a feed and reading them whole, or not at all."""

from __future__ import annotations

import glob
import os
import stat
from pathlib import Path

from agewatch.errors import FeedError

LARGEST_BYTES = 2**29
"""A larger file is refused: it would take the daemon's memory."""


def matches(feed: str, pattern: str, folder: Path) -> list[str]:
    """The files that a pattern means, sorted by name and spelt as the pattern spells them, relative to `folder`.

    A name that a pattern found must lie where the pattern looks: a link that leads elsewhere is refused. Raises
    FeedError when there is none.
    """
    if not glob.has_magic(pattern) or (folder / pattern).is_file():
        return [pattern]
    found = sorted(glob.glob(pattern, root_dir=folder, recursive=True))
    files = [name for name in found if not (folder / name).is_dir()]
    if not files:
        raise FeedError(
            feed, pattern, f"no file matches in {folder}; write one there, or mend the feed's path"
        )
    root = os.path.realpath(folder / _fixed_part(pattern))
    for name in files:
        if os.path.commonpath([root, os.path.realpath(folder / name)]) != root:
            raise FeedError(feed, name, f"is a link that leads out of {root}; put the file itself there")
    return files


def _fixed_part(pattern: str) -> Path:
    """The folders that a pattern names before its first wildcard."""
    fixed: list[str] = []
    for part in Path(pattern).parent.parts:
        if glob.has_magic(part):
            break
        fixed.append(part)
    return Path(*fixed)


def read_whole(feed: str, name: str, folder: Path) -> bytes:
    """The content of a regular file that nobody wrote to meanwhile. Raises FeedError."""
    try:
        with open(folder / name, "rb", opener=_at_once) as file:
            before = os.fstat(file.fileno())
            if not stat.S_ISREG(before.st_mode):
                raise FeedError(feed, name, "is no regular file; name a file")
            if before.st_size > LARGEST_BYTES:
                raise FeedError(feed, name, f"is larger than {LARGEST_BYTES >> 20} MB; split it")
            content = file.read(before.st_size + 1)
            after = os.fstat(file.fileno())
    except OSError as fault:
        raise FeedError(
            feed, name, f"{fault.strerror}; {_REMEDY.get(type(fault), 'see to the disk')}"
        ) from None
    if (len(content), after.st_size, after.st_mtime_ns) != (
        before.st_size,
        before.st_size,
        before.st_mtime_ns,
    ):
        raise FeedError(feed, name, "is still being written; it is left for the next reading")
    return content


_REMEDY: dict[type[OSError], str] = {
    FileNotFoundError: "write it there, or mend the feed's path",
    PermissionError: "let the user that runs agewatch read it",
    IsADirectoryError: "name a file",
}


def _at_once(path: str, flags: int) -> int:
    """Opening a pipe waits for its writer, unless told not to."""
    return os.open(path, flags | os.O_NONBLOCK)
