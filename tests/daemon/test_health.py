"""The health pages, asked for over HTTP."""

from __future__ import annotations

import json
from collections.abc import Iterator
from http.client import HTTPConnection

import pytest
from prometheus_client import CollectorRegistry, Gauge
from prometheus_client.openmetrics.parser import text_string_to_metric_families

from agewatch.daemon.health import Health
from agewatch.errors import SettingsError


class Pages:
    """Health pages on a free port, and what they rest on."""

    def __init__(self) -> None:
        self.stuck: list[str] = []
        self.unready: list[str] = []
        registry = CollectorRegistry()
        Gauge("agewatch_coils", "Stored coils", ("verdict",), registry=registry).labels("pull").set(3)
        self.health = Health(0, lambda: self.stuck, lambda: self.unready, registry)
        self.health.start()

    def get(self, path: str, method: str = "GET", **headers: str) -> tuple[int, str, bytes]:
        connection = HTTPConnection("127.0.0.1", self.health.port, timeout=10)
        try:
            connection.request(method, path, headers=headers)
            response = connection.getresponse()
            return response.status, response.headers.get("content-type", ""), response.read()
        finally:
            connection.close()


@pytest.fixture
def pages() -> Iterator[Pages]:
    served = Pages()
    yield served
    served.health.stop()


def test_well(pages: Pages) -> None:
    """Alive and ready: 200 and no trouble."""
    for path in ("/livez", "/readyz"):
        status, _, body = pages.get(path)
        assert (status, json.loads(body)) == (200, {"ok": True, "troubles": []})


def test_troubles_are_named(pages: Pages) -> None:
    """A trouble makes 503 and says what it is, each on its own page."""
    pages.unready = ["the first assessment is still to come"]
    assert pages.get("/livez")[0] == 200
    status, _, body = pages.get("/readyz")
    assert (status, json.loads(body)["troubles"]) == (503, pages.unready)
    pages.stuck = ["assess has given no sign for 300 s"]
    status, _, body = pages.get("/livez")
    assert (status, json.loads(body)["troubles"]) == (503, pages.stuck)


def test_metrics_are_open_metrics(pages: Pages) -> None:
    """A scraper that takes OpenMetrics gets it, whole to its end mark."""
    status, kind, body = pages.get("/metrics", accept="application/openmetrics-text; version=1.0.0")
    families = {family.name: family for family in text_string_to_metric_families(body.decode())}
    assert status == 200
    assert kind.startswith("application/openmetrics-text")
    assert families["agewatch_coils"].samples[0].labels == {"verdict": "pull"}
    assert body.endswith(b"# EOF\n")


def test_other_paths_and_methods(pages: Pages) -> None:
    """Other paths are not found, and nothing can be changed."""
    assert pages.get("/")[0] == 404
    assert pages.get("/metrics", "POST")[0] == 501


def test_taken_port_is_refused(pages: Pages) -> None:
    """A port that is taken is a fault of the settings, with advice."""
    with pytest.raises(SettingsError, match=r"daemon.http_port \d+: .*give a free port"):
        Health(pages.health.port, list, list, CollectorRegistry())
