"""The right to write a store: one process at a time holds it, by a lock of the operating system."""

from __future__ import annotations

import fcntl
import os
from pathlib import Path

from agewatch.errors import StoreError


class SoleWriter:
    """Held from creation until `release`, or until the process ends in whatever way.

    The lock lies on `<database>.lock`, which stays: were it removed, two processes could lock two files.
    """

    def __init__(self, database: Path) -> None:
        self._file = os.open(f"{database}.lock", os.O_RDWR | os.O_CREAT, 0o644)
        try:
            fcntl.flock(self._file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            holder = os.read(self._file, 20).decode("ascii", "replace").strip() or "unknown"
            os.close(self._file)
            raise StoreError(
                f"store {database}: another agewatch daemon (pid {holder}) is writing this store; "
                "stop it first"
            ) from None
        os.truncate(self._file, 0)
        os.pwrite(self._file, f"{os.getpid()}\n".encode("ascii"), 0)

    def release(self) -> None:
        os.close(self._file)
