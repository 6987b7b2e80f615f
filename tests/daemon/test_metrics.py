"""What the daemon counts, as a scraper sees it."""

from __future__ import annotations

from prometheus_client.openmetrics.exposition import generate_latest
from prometheus_client.openmetrics.parser import text_string_to_metric_families

from agewatch.daemon.loops import Progress
from agewatch.daemon.metrics import Metrics
from agewatch.messages import Outcome, OutcomeKind
from tests.daemon.samples import TinyPlant


def samples(metrics: Metrics) -> dict[str, float]:
    """Every sample by name and labels; reading it back checks the form."""
    text = generate_latest(metrics.registry).decode()
    return {
        sample.name + "".join(f" {value}" for value in sample.labels.values()): sample.value
        for family in text_string_to_metric_families(text)
        for sample in family.samples
    }


def test_counts_of_a_turn(plant: TinyPlant) -> None:
    """Coils by verdict, alarms by kind and priority, rows by feed, jobs by name, and no coil in any label."""
    loop = Progress("assess", 7, 2, "", 0.25, 1.5, False)
    metrics = Metrics(lambda: [loop])
    for reading in plant.read().values():
        metrics.took_in(reading.feed, reading.put, reading.rejects)
        metrics.looked_at(reading.feed, readable=not reading.trouble)
    turn = plant.turn()
    metrics.assessed(turn.assessment, turn.alarms, 0.25)
    metrics.attempted("logistics", Outcome(OutcomeKind.IN_TROUBLE, "no connection"))
    found = samples(metrics)
    assert found["agewatch_coils hold"] == 1
    assert found["agewatch_coils pull"] == 0
    assert found["agewatch_alarms returned-in-store medium"] == 1
    assert found["agewatch_alarms returned-in-store high"] == 0
    assert found["agewatch_alarms_unacknowledged"] == 1
    assert found["agewatch_last_assessment_timestamp_seconds"] == turn.assessment.at_s
    assert found["agewatch_feed_rows_total coils:coils*.csv new"] == 2
    assert found["agewatch_feed_readable temperatures:temps.csv"] == 1
    assert found["agewatch_delivery_attempts_total logistics in_trouble"] == 1
    assert found["agewatch_job_turns_total assess"] == 7
    assert found["agewatch_job_failures_total assess"] == 2
    assert not any("C-" in name for name in found)
