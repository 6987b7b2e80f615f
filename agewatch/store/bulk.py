"""Many rows at once: the only statements that are written for one kind of database."""

from __future__ import annotations

import json
from collections.abc import Collection, Iterable, Iterator, Sequence
from itertools import chain
from operator import itemgetter
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Column, ColumnElement, Select, Table, func, select

from agewatch.plant.records import Put
from agewatch.store.access import Transaction, View

_FETCHED_AT_ONCE = 64  # few enough to stay in the processor's cache while they become columns
ABSENT = float("inf")
"""What `read_columns` wants in place of NULL: infinite numbers are never stored."""

Item = TypeVar("Item")


def batches(items: Sequence[Item], size: int) -> Iterator[Sequence[Item]]:
    for start in range(0, len(items), size):
        yield items[start : start + size]


def one_of(column: Column[Any], values: Collection[str | int]) -> ColumnElement[bool]:
    """Whether the column holds one of any number of values."""
    listed = func.json_each(json.dumps(list(values))).table_valued("value")
    return column.in_(select(listed.c.value))


def insert_unknown(
    tx: Transaction, table: Table, columns: Sequence[str], rows: Sequence[tuple[Any, ...]]
) -> int:
    """Insert rows whose key is not there yet; how many there were. Rows hold `columns` in order."""
    names = ", ".join(_quoted(tx, name) for name in columns)
    places = ", ".join("?" * len(columns))
    return _for_each(tx, f"INSERT INTO {table.name} ({names}) VALUES ({places}) ON CONFLICT DO NOTHING", rows)  # noqa: S608


def replace(
    tx: Transaction,
    table: Table,
    rows: Iterable[tuple[Any, ...]],
    *,
    where_differs: Sequence[str] = (),
) -> int:
    """Give each row's values to the row with its key, if any of `where_differs` would change; how many did.

    Rows hold all columns of the table in order; its key comes first.
    """
    names = [column.name for column in table.columns]
    width = len(table.primary_key)
    compared = [names.index(name) for name in where_differs]
    values = ", ".join(f"{_quoted(tx, name)} = ?" for name in names[width:])
    key = " AND ".join(f"{name} = ?" for name in names[:width])
    differs = " OR ".join(f"{_quoted(tx, name)} IS NOT ?" for name in where_differs)
    condition = f"{key} AND ({differs})" if differs else key
    return _for_each(
        tx,
        f"UPDATE {table.name} SET {values} WHERE {condition}",  # noqa: S608 - names of our own schema
        [(*row[width:], *row[:width], *(row[place] for place in compared)) for row in rows],
    )


def put_keyed(
    tx: Transaction,
    table: Table,
    rows: Iterable[tuple[Any, ...]],
    *,
    differing_in: Sequence[str] | None = None,
) -> Put:
    """Insert rows with a new key, replace those that differ; of several rows with one key the last counts.

    Parameters
    ----------
    rows
        All columns of the table in order; its key comes first.
    differing_in
        The columns that tell whether a row is another one than what stands there; all but the key if None.
    """
    names = [column.name for column in table.columns]
    width = len(table.primary_key)
    rows = list(rows)
    last = dict(zip(map(itemgetter(*range(width)), rows), rows, strict=True))
    new = insert_unknown(tx, table, names, [*last.values()])
    changed = 0
    if new < len(last):
        changed = replace(tx, table, last.values(), where_differs=differing_in or names[width:])
    return Put(new, changed, len(last) - new - changed)


def read_columns(
    view: View, statement: Select[Any], texts: int
) -> tuple[list[list[Any]], NDArray[np.float64]]:
    """Columns of a long result: the first `texts` as lists, all others as numbers, (n_numbers, n_rows).

    A number is never NULL in `statement`: `number_or_absent` sees to that. NaN where it is absent.
    """
    cursor = view.connection.execute(statement).cursor
    lists: list[list[Any]] = [[] for _ in range(texts)]
    numbers: list[NDArray[np.float64]] = []
    width = len(statement.selected_columns) - texts
    while cursor is not None and (rows := cursor.fetchmany(_FETCHED_AT_ONCE)):
        columns = list(zip(*rows, strict=True))
        for whole, part in zip(lists, columns[:texts], strict=True):
            whole.extend(part)
        flat = np.fromiter(chain.from_iterable(columns[texts:]), np.float64, width * len(rows))
        numbers.append(flat.reshape(width, len(rows)))
    whole_numbers = np.concatenate(numbers, axis=1) if numbers else np.empty((width, 0))
    whole_numbers[np.isinf(whole_numbers)] = np.nan
    return lists, whole_numbers


def number_or_absent(column: ColumnElement[Any]) -> ColumnElement[Any]:
    return func.coalesce(column, ABSENT)


def _for_each(tx: Transaction, statement: str, rows: Sequence[tuple[Any, ...]]) -> int:
    """Run a statement once for each row; how many rows of the table it touched in all."""
    if not rows:
        return 0
    return tx.connection.exec_driver_sql(statement, list(rows)).rowcount


def _quoted(tx: Transaction, name: str) -> str:
    return tx.connection.dialect.identifier_preparer.quote(name)
