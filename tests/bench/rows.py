"""One measured figure against its bar."""

from __future__ import annotations

import gc
import time
from collections.abc import Callable
from dataclasses import asdict, dataclass


@dataclass(frozen=True, slots=True)
class Row:
    """A figure. `bar` is its limit (the value may be at most that, or at least with `at_least`); None: told only."""

    name: str
    value: float
    unit: str
    bar: float | None = None
    at_least: bool = False
    peer: str = ""
    ratio: float | None = None

    @property
    def holds(self) -> bool:
        if self.bar is None:
            return True
        return self.value >= self.bar if self.at_least else self.value <= self.bar

    def as_json(self) -> dict[str, object]:
        fields = asdict(self)
        del fields["at_least"]
        return fields | {"holds": self.holds}


def best_s(work: Callable[[], object], runs: int = 3) -> float:
    """Shortest of some runs after one that warms up, s: the least disturbed by what else the machine does."""
    work()
    times = []
    for _ in range(runs):
        gc.collect()
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return min(times)
