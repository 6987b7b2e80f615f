"""The store: what the plant told, what was made of it, and what was done. The only room that knows SQL."""

from agewatch.store.access import Reader, Store, Transaction, View
from agewatch.store.engine import sqlite_version
from agewatch.store.opening import open_reader, open_store

__all__ = ["Reader", "Store", "Transaction", "View", "open_reader", "open_store", "sqlite_version"]
