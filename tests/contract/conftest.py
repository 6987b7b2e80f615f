"""The stores that the contract is held to: every test here runs once for each."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from agewatch.store import Reader, Store, open_reader, open_store


class Sqlite:
    """A plant's folder with an SQLite store in it."""

    url = "sqlite:///var/agewatch.db"

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def open(self) -> Store:
        return open_store(self.url, self.folder)

    def open_reader(self) -> Reader:
        return open_reader(self.url, self.folder)


BACKENDS = {"sqlite": Sqlite}
Backend = Sqlite


@pytest.fixture(params=BACKENDS)
def backend(request: pytest.FixtureRequest, tmp_path: Path) -> Backend:
    return BACKENDS[request.param](tmp_path)


@pytest.fixture
def store(backend: Backend) -> Iterator[Store]:
    with backend.open() as opened:
        yield opened
