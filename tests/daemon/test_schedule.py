"""Jobs at intervals of plant time."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import timedelta
from threading import Event, Lock
from time import monotonic

import pytest

from agewatch.clock import Clock, ReplayClock, SystemClock
from agewatch.daemon.schedule import SHORTEST_S, Schedule

LONG_S = 10.0


class Jobs:
    """A schedule and the failures that it told of."""

    def __init__(self, clock: Clock) -> None:
        self.failures: list[tuple[str, str]] = []
        self.schedule = Schedule(clock, lambda name, error, again: self.failures.append((name, str(error))))


@pytest.fixture
def fast() -> Iterator[Jobs]:
    """A schedule on a replay at 600 times real time."""
    jobs = Jobs(ReplayClock(0.0, 600.0))
    yield jobs
    assert jobs.schedule.stop(LONG_S) == []


def test_plant_interval_becomes_real_interval() -> None:
    """At 600 times real time five minutes of the plant are half a second, and nothing comes oftener than 0.2 s."""
    fast, plain = Jobs(ReplayClock(0.0, 600.0)).schedule, Jobs(SystemClock()).schedule
    assert fast.real_s(timedelta(minutes=5)) == pytest.approx(0.5)
    assert fast.real_s(timedelta(seconds=30)) == SHORTEST_S
    assert plain.real_s(timedelta(minutes=5)) == 300.0


def test_job_comes_again(fast: Jobs) -> None:
    """A job runs again and again, and its progress counts it."""
    thrice = Event()
    count: list[int] = []

    def work() -> None:
        count.append(1)
        if len(count) == 3:
            thrice.set()

    fast.schedule.add("assess", timedelta(minutes=2), work)
    fast.schedule.start()
    assert thrice.wait(LONG_S)
    assert fast.schedule.stop(LONG_S) == []
    (progress,) = fast.schedule.progress()
    assert progress.turns == len(count) >= 3


def test_failing_job_comes_again_and_stops_no_other(fast: Jobs) -> None:
    """A job that raises is told of and tried again, while other jobs go on."""
    twice, well = Event(), Event()

    def fail() -> None:
        if len(fast.failures) >= 1:
            twice.set()
        raise RuntimeError("no such share")

    fast.schedule.add("read", timedelta(minutes=2), fail)
    fast.schedule.add("assess", timedelta(minutes=2), well.set)
    fast.schedule.start()
    assert twice.wait(LONG_S)
    assert well.wait(LONG_S)
    assert fast.failures[0] == ("read", "no such share")


def test_slow_job_runs_alone_and_delays_no_other(fast: Jobs) -> None:
    """A job that takes longer than its interval never runs beside itself, and others keep their pace."""
    alone, others, release = Lock(), Event(), Event()
    beside_itself: list[int] = []
    count: list[int] = []

    def slow() -> None:
        if alone.acquire(blocking=False):
            release.wait(LONG_S)
            alone.release()
        else:
            beside_itself.append(1)

    def quick() -> None:
        count.append(1)
        if len(count) == 4:
            others.set()

    fast.schedule.add("slow", timedelta(minutes=2), slow)
    fast.schedule.add("quick", timedelta(minutes=2), quick)
    fast.schedule.start()
    assert others.wait(LONG_S)
    release.set()
    assert beside_itself == []


def test_stop_waits_for_what_is_under_way_but_not_for_ever(fast: Jobs) -> None:
    """Stopping names the job that does not finish in time, and does not wait for it any longer."""
    begun, release = Event(), Event()

    def hang() -> None:
        begun.set()
        release.wait(LONG_S)

    fast.schedule.add("hang", timedelta(minutes=2), hang)
    fast.schedule.start()
    assert begun.wait(LONG_S)
    began_s = monotonic()
    assert fast.schedule.stop(0.1) == ["hang"]
    assert monotonic() - began_s < LONG_S / 2
    release.set()


def test_do_now_is_a_turn_in_this_thread() -> None:
    """Before the start a job can be done by hand, once; a failure is told of and does not get out."""
    jobs = Jobs(SystemClock())
    done: list[int] = []
    jobs.schedule.add("read", timedelta(minutes=5), lambda: done.append(1))
    jobs.schedule.add("fail", timedelta(minutes=5), lambda: done.remove(7))
    assert jobs.schedule.names() == ["read", "fail"]
    assert jobs.schedule.do_now("read")
    assert not jobs.schedule.do_now("fail")
    assert done == [1]
    assert [name for name, _ in jobs.failures] == ["fail"]
