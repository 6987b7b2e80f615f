"""A plant with a receiver; every daemon over it is ended with the test."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.acceptance.daemons import Receiver, Works


@pytest.fixture
def receiver() -> Iterator[Receiver]:
    one = Receiver()
    yield one
    one.end()


@pytest.fixture
def works(tmp_path: Path, receiver: Receiver) -> Iterator[Works]:
    one = Works(tmp_path, receiver.port)
    yield one
    one.end_all()
