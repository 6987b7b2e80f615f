"""What the daemon counts for plant IT. Base units, one prefix, and no coil in any label."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from typing import TYPE_CHECKING

import numpy as np
from prometheus_client import CollectorRegistry, Counter, Gauge, Info
from prometheus_client.core import CounterMetricFamily, GaugeMetricFamily
from prometheus_client.metrics_core import Metric
from prometheus_client.registry import Collector

from agewatch import __version__
from agewatch.alarms import Alarm, AlarmKind, Priority
from agewatch.daemon.loops import Progress
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.records import Put

if TYPE_CHECKING:
    from agewatch.messages import Outcome


class Metrics:
    """All counters and gauges, in a registry of their own. Usable from several threads."""

    def __init__(self, progress: Callable[[], Iterable[Progress]]) -> None:
        """`progress` gives that of every loop, asked for at each look."""
        self.registry = CollectorRegistry()
        self.registry.register(_Loops(progress))
        Info("agewatch", "The program", registry=self.registry).info({"version": __version__})
        self._coils = self._gauge("coils", "Stored coils", "verdict")
        self._assessed = self._gauge("last_assessment_timestamp_seconds", "Plant time of the last assessment")
        self._took = self._gauge(
            "last_assessment_duration_seconds", "Real time that the last assessment took"
        )
        self._alarms = self._gauge("alarms", "Standing alarms", "kind", "priority")
        self._unacknowledged = self._gauge("alarms_unacknowledged", "Alarms that wait for a person")
        self._rows = self._counter("feed_rows", "Rows taken in", "feed", "result")
        self._rejects = self._counter("feed_rejects", "Rows rejected", "feed")
        self._readable = self._gauge("feed_readable", "1 when the feed could be read at the last try", "feed")
        self._attempts = self._counter(
            "delivery_attempts", "Attempts to deliver a message", "endpoint", "outcome"
        )

    def took_in(self, feed: str, put: Put, rejects: int) -> None:
        for result, count in (("new", put.new), ("changed", put.changed), ("same", put.same)):
            self._rows.labels(feed, result).inc(count)
        self._rejects.labels(feed).inc(rejects)

    def looked_at(self, feed: str, *, readable: bool) -> None:
        self._readable.labels(feed).set(readable)

    def assessed(self, assessment: Assessment, alarms: Iterable[Alarm], took_s: float) -> None:
        counts = np.bincount(assessment.verdict, minlength=len(Verdict))
        for verdict in Verdict:
            self._coils.labels(verdict.word).set(int(counts[verdict]))
        self._assessed.set(assessment.at_s)
        self._took.set(took_s)
        standing = dict.fromkeys(((kind, priority) for kind in AlarmKind for priority in Priority), 0)
        waiting = 0
        for alarm in alarms:
            waiting += alarm.needs_acknowledging
            if alarm.standing:
                standing[alarm.kind, alarm.priority] += 1
        for (kind, priority), count in standing.items():
            self._alarms.labels(kind, priority).set(count)
        self._unacknowledged.set(waiting)

    def attempted(self, endpoint: str, outcome: Outcome) -> None:
        self._attempts.labels(endpoint, outcome.kind.name.lower()).inc()

    def _gauge(self, name: str, text: str, *labels: str) -> Gauge:
        return Gauge(f"agewatch_{name}", text, labels, registry=self.registry)

    def _counter(self, name: str, text: str, *labels: str) -> Counter:
        return Counter(f"agewatch_{name}", text, labels, registry=self.registry)


class _Loops(Collector):
    """Every loop's progress, as it is at the time of the look."""

    def __init__(self, progress: Callable[[], Iterable[Progress]]) -> None:
        self._progress = progress

    def collect(self) -> Iterator[Metric]:
        turns = CounterMetricFamily("agewatch_job_turns", "Turns of a job", labels=("job",))
        failures = CounterMetricFamily("agewatch_job_failures", "Turns that failed", labels=("job",))
        took = GaugeMetricFamily(
            "agewatch_job_last_duration_seconds", "Time of the last turn", labels=("job",)
        )
        quiet = GaugeMetricFamily("agewatch_job_quiet_seconds", "Time since a sign of life", labels=("job",))
        for loop in self._progress():
            turns.add_metric((loop.name,), loop.turns)
            failures.add_metric((loop.name,), loop.failures)
            took.add_metric((loop.name,), loop.last_took_s)
            quiet.add_metric((loop.name,), loop.quiet_s)
        return iter((turns, failures, took, quiet))
