"""Transactions: kept whole or not at all, one writer at a time, readers undisturbed."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from threading import get_ident

import pytest

from agewatch.errors import StoreError
from agewatch.store import Store
from agewatch.store.queries import status
from agewatch.store.writes import put_status
from tests.contract.conftest import Backend


def add_one(store: Store) -> None:
    with store.write() as tx:
        count = status(tx).get("count", 0)
        put_status(tx, "count", count + 1, 0.0)


def count_and_fail(store: Store) -> None:
    with store.write() as tx:
        put_status(tx, "count", 1, 0.0)
        raise KeyError("count")


def count_and_begin_again(store: Store) -> None:
    with store.write() as tx:
        put_status(tx, "count", 1, 0.0)
        add_one(store)


def read_status(store: Store) -> dict[str, object]:
    with store.read() as view:
        return status(view)


def test_concurrent_read_modify_writes_lose_nothing(store: Store) -> None:
    """Four threads that each read, add one and write 200 times leave a count of 800."""

    def work(_: int) -> int:
        for _ in range(200):
            add_one(store)
        return get_ident()

    with ThreadPoolExecutor(4) as threads:
        list(threads.map(work, range(4)))
    assert read_status(store) == {"count": 800}


def test_a_kept_transaction_survives_closing(backend: Backend) -> None:
    """What was kept is there when the store is opened anew."""
    with backend.open() as store:
        add_one(store)
    with backend.open() as store:
        assert read_status(store) == {"count": 1}


def test_a_transaction_that_raises_leaves_nothing(store: Store) -> None:
    """An error inside the block drops everything that the block had changed, and reaches the caller as it was."""
    with pytest.raises(KeyError):
        count_and_fail(store)
    assert read_status(store) == {}


def test_the_writer_can_go_on_after_a_failure(store: Store) -> None:
    """A dropped transaction does not stand in the way of the next."""
    with pytest.raises(KeyError):
        count_and_fail(store)
    add_one(store)
    assert read_status(store) == {"count": 1}


def test_a_view_does_not_change_under_its_reader(store: Store) -> None:
    """A view goes on showing the state of its first query while others write."""
    add_one(store)
    with store.read() as view:
        before = status(view)
        add_one(store)
        assert status(view) == before == {"count": 1}
    assert read_status(store) == {"count": 2}


def test_a_transaction_sees_its_own_changes(store: Store) -> None:
    """Queries inside a transaction show what it has changed so far; others do not see it yet."""
    with store.write() as tx:
        put_status(tx, "count", 1, 0.0)
        assert status(tx) == {"count": 1}
        assert read_status(store) == {}


def test_a_transaction_inside_another_is_refused(store: Store) -> None:
    """The same thread cannot wait for itself: the inner transaction is refused, and the outer one is dropped."""
    with pytest.raises(StoreError, match="one transaction inside another"):
        count_and_begin_again(store)
    assert read_status(store) == {}


def test_a_reader_of_another_opening_sees_what_is_kept(backend: Backend, store: Store) -> None:
    """A store that is opened for reading while the daemon writes shows each change once it is kept."""
    with backend.open_reader() as reader:
        add_one(store)
        with reader.read() as view:
            assert status(view) == {"count": 1}
