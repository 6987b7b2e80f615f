"""Signals that would kill the demo end it in order instead, so that no daemon is left behind."""

from __future__ import annotations

import signal
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from types import FrameType, TracebackType
from typing import Any, Self

ENDING = (signal.SIGTERM, signal.SIGINT, signal.SIGHUP)


class EndedBySignals:
    """While open, the first signal raises SystemExit in the main thread, and further ones are ignored."""

    def __enter__(self) -> Self:
        self._held = False
        self._came: int | None = None
        self._before: dict[int, Any] = {each: signal.signal(each, self._leave) for each in ENDING}
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        for each, handler in self._before.items():
            signal.signal(each, handler)

    @contextmanager
    def held(self) -> Iterator[None]:
        """What is done here is done whole: a signal takes effect at its end."""
        self._held = True
        try:
            yield
        finally:
            self._held = False
        if self._came is not None:
            self._leave(self._came, None)

    def _leave(self, number: int, _: FrameType | None) -> None:
        self._came = number
        if not self._held:
            for each in ENDING:
                signal.signal(each, signal.SIG_IGN)
            sys.exit(128 + number)
