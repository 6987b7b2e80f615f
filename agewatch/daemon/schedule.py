"""The one place that knows the scheduling library: jobs at intervals of plant time, with their progress."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import UTC, datetime, timedelta
from threading import Lock, Thread, current_thread
from time import monotonic
from typing import Any

from apscheduler.executors.base import BaseExecutor, run_job
from apscheduler.schedulers.background import BackgroundScheduler

from agewatch.clock import Clock
from agewatch.daemon.loops import Loop, OnFailure, Progress

SHORTEST_S = 0.2
"""However fast plant time runs, a job comes no oftener than this [real s]."""
PATIENCE_S = 60.0
"""A job is stuck when it misses three turns and this much more [real s]."""


class Schedule:
    """Jobs that come again: missed turns are made up for once, and no job runs beside itself."""

    def __init__(self, clock: Clock, on_failure: OnFailure) -> None:
        """`clock` tells how fast plant time runs."""
        self._rate = clock.rate
        self._on_failure = on_failure
        self._loops: dict[str, Loop] = {}
        self._work: dict[str, Callable[[], None]] = {}
        self._threads = _OwnThreads()
        self._scheduler: Any = BackgroundScheduler(
            executors={"default": self._threads},
            job_defaults={"coalesce": True, "max_instances": 1, "misfire_grace_time": None},
            timezone=UTC,
        )

    def add(self, name: str, every: timedelta, work: Callable[[], None]) -> None:
        """Have `work` done every so often, in plant time; the first time one interval after the start."""
        every_s = self.real_s(every)
        loop = Loop(name, 3 * every_s + PATIENCE_S, self._on_failure)
        self._loops[name] = loop
        self._work[name] = work
        self._scheduler.add_job(loop.turn, "interval", (work,), seconds=every_s, id=name)

    def names(self) -> Sequence[str]:
        """Of all jobs, in the order in which they were added."""
        return [*self._loops]

    def do_now(self, name: str) -> bool:
        """One turn of a job, in this thread; whether it went well. Only before the start."""
        return self._loops[name].turn(self._work[name])

    def real_s(self, every: timedelta) -> float:
        """The interval in real seconds."""
        return max(SHORTEST_S, every.total_seconds() / self._rate)

    def start(self) -> None:
        for loop in self._loops.values():
            loop.beat()
        self._scheduler.start()

    def progress(self) -> list[Progress]:
        return [loop.progress() for loop in self._loops.values()]

    def stop(self, within_s: float) -> Sequence[str]:
        """Begin no more turns and wait for those under way; the names of jobs that still run afterwards."""
        if self._scheduler.running:
            self._scheduler.shutdown(wait=False)
        return self._threads.wait(within_s)


class _OwnThreads(BaseExecutor):  # type: ignore[misc]
    """A thread for each turn, which dies with the process: a turn that hangs holds up neither job nor end."""

    def __init__(self) -> None:
        super().__init__()
        self._under_way: set[Thread] = set()
        self._turn = Lock()

    def wait(self, within_s: float) -> Sequence[str]:
        until_s = monotonic() + within_s
        with self._turn:
            threads = list(self._under_way)
        for thread in threads:
            thread.join(max(0.0, until_s - monotonic()))
        return [thread.name for thread in threads if thread.is_alive()]

    def _do_submit_job(self, job: Any, run_times: list[datetime]) -> None:
        thread = Thread(target=self._work, args=(job, run_times), name=job.id, daemon=True)
        with self._turn:
            self._under_way.add(thread)
        thread.start()

    def _work(self, job: Any, run_times: list[datetime]) -> None:
        events = run_job(job, job._jobstore_alias, run_times, self._logger.name)
        with self._turn:
            self._under_way.discard(current_thread())
        self._run_job_success(job.id, events)
