"""The tiny plant, open for a test and closed after it."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.daemon.samples import ENDPOINT, TinyPlant


@pytest.fixture
def plant(tmp_path: Path) -> Iterator[TinyPlant]:
    one = TinyPlant(tmp_path, endpoint=ENDPOINT)
    yield one
    one.close()
