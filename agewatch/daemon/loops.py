"""One recurring piece of work: where its errors stop, and what it has to show for itself."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from threading import Lock
from time import monotonic

OnFailure = Callable[[str, Exception, bool], None]
"""Told of a loop's name, of the error that ended one of its turns, and whether the turn before ended alike."""


@dataclass(frozen=True, slots=True)
class Progress:
    """What a loop has done so far; durations in real seconds."""

    name: str
    turns: int
    failures: int
    last_error: str
    """Of the last turn; "" when it went well."""
    last_took_s: float
    quiet_s: float
    """Since it last gave a sign of life."""
    stuck: bool


class Loop:
    """Work that is done again and again, perhaps in several threads, never twice at a time.

    allowed_s: real seconds without a sign of life after which it counts as stuck.
    """

    def __init__(self, name: str, allowed_s: float, on_failure: OnFailure) -> None:
        self.name = name
        self._allowed_s = allowed_s
        self._on_failure = on_failure
        self._turns = 0
        self._failures = 0
        self._last_error = ""
        self._last_took_s = 0.0
        self._seen_s = monotonic()
        self._lock = Lock()

    def beat(self) -> None:
        """A sign of life in the middle of a long turn."""
        self._seen_s = monotonic()

    def turn(self, work: Callable[[], None]) -> bool:
        """Do the work once; whether it went well. The one boundary: no error of the work passes it."""
        began_s = monotonic()
        self.beat()
        try:
            work()
        except Exception as error:
            told = f"{type(error).__name__}: {error}"
            again = told == self._last_error
            self._count(began_s, told)
            self._on_failure(self.name, error, again)
            return False
        self._count(began_s, "")
        return True

    def progress(self) -> Progress:
        with self._lock:
            quiet_s = monotonic() - self._seen_s
            return Progress(
                self.name,
                self._turns,
                self._failures,
                self._last_error,
                self._last_took_s,
                quiet_s,
                quiet_s > self._allowed_s,
            )

    def _count(self, began_s: float, error: str) -> None:
        with self._lock:
            self._turns += 1
            self._failures += bool(error)
            self._last_error = error
            self._seen_s = monotonic()
            self._last_took_s = self._seen_s - began_s
