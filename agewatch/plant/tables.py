"""The canonical tables: what a plant may tell, column by column.

A valid row travels as a tuple in the order of `Table.columns`. Text is `str`, numbers are `float`, flags are
`bool`, times are seconds since 1970 in UTC (`float`); a value that was not given is `None`.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

Value = str | float | bool | None
Row = tuple[Value, ...]


class ColumnKind(StrEnum):
    """What a column holds."""

    TEXT = "text"
    NUMBER = "number"
    FLAG = "flag"
    TIME = "time"


class CoilStatus(StrEnum):
    """Where a coil's life stands. Only stored coils age under watch."""

    STORED = "stored"
    PRESSED = "pressed"
    SHIPPED = "shipped"
    SCRAPPED = "scrapped"


@dataclass(frozen=True, slots=True)
class Column:
    """One column. `low` and `high` bound a number (inclusive); `above` is an open lower bound."""

    name: str
    kind: ColumnKind
    required: bool = False
    low: float | None = None
    above: float | None = None
    high: float | None = None
    choices: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Table:
    """One canonical table; `key` names the columns that identify a row."""

    name: str
    columns: tuple[Column, ...]
    key: tuple[str, ...]

    @property
    def column_names(self) -> tuple[str, ...]:
        return tuple(column.name for column in self.columns)


def _text(name: str, *, required: bool = False, choices: tuple[str, ...] = ()) -> Column:
    return Column(name, ColumnKind.TEXT, required, choices=choices)


def _time(name: str, *, required: bool = False) -> Column:
    return Column(name, ColumnKind.TIME, required)


def _number(
    name: str,
    *,
    required: bool = False,
    low: float | None = None,
    above: float | None = None,
    high: float | None = None,
) -> Column:
    return Column(name, ColumnKind.NUMBER, required, low, above, high)


COILS = Table(
    "coils",
    (
        _text("coil_id", required=True),
        _text("grade", required=True),
        _time("temper_rolled_at", required=True),
        _text("location", required=True),
        _time("located_since"),
        _text("heat_id"),
        _text("parent_id"),
        _text("part"),
        _text("status", choices=tuple(CoilStatus)),
        _time("press_at"),
        _number("temper_elongation_pct", low=0.0, high=20.0),
        _number("thickness_mm", above=0.0, high=30.0),
        _number("width_mm", above=0.0, high=5000.0),
        _number("mass_kg", above=0.0, high=100_000.0),
        _number("bore_mm", above=0.0, high=2000.0),
        _number("coil_temp_c", low=-60.0, high=400.0),
        Column("wrapped", ColumnKind.FLAG),
        _number("rp02_mpa", above=0.0, high=2000.0),
        _number("rm_mpa", above=0.0, high=3000.0),
        _number("n_value", above=0.0, high=1.0),
        _number("c_pct", low=0.0, high=3.0),
        _number("n_pct", low=0.0, high=1.0),
        _number("s_pct", low=0.0, high=1.0),
        _number("ti_pct", low=0.0, high=2.0),
        _number("nb_pct", low=0.0, high=2.0),
        _number("al_pct", low=0.0, high=5.0),
    ),
    ("coil_id",),
)
MOVES = Table(
    "moves",
    (_text("coil_id", required=True), _time("at", required=True), _text("location", required=True)),
    ("coil_id", "at"),
)
PRESSES = Table("presses", (_text("coil_id", required=True), _time("press_at", required=True)), ("coil_id",))
TEMPERATURES = Table(
    "temperatures",
    (
        _time("at", required=True),
        _text("sensor", required=True),
        _number("celsius", required=True, low=-1000.0, high=5000.0),  # screening judges it, not the intake
    ),
    ("sensor", "at"),
)
OUTLOOK = Table(
    "outlook",
    (
        _time("at", required=True),
        _text("location", required=True),
        _number("celsius", required=True, low=-60.0, high=80.0),
    ),
    ("location", "at"),
)
LAB = Table(
    "lab",
    (
        _text("coil_id", required=True),
        _time("tested_at", required=True),
        _number("ype_pct", required=True, low=0.0, high=20.0),
        _number("rp02_mpa", above=0.0, high=2000.0),
        _number("aged_c", low=-60.0, high=400.0),
        _number("aged_h", low=0.0, high=100_000.0),
        _text("direction"),
    ),
    ("coil_id", "tested_at", "aged_c", "aged_h", "direction"),
)

TABLES = {table.name: table for table in (COILS, MOVES, PRESSES, TEMPERATURES, OUTLOOK, LAB)}


@dataclass(frozen=True, slots=True)
class Reject:
    """A row that cannot be used, kept as it came.

    `source` is the file, relative to the settings' folder; `line` is where the row starts in it; `column` is the
    source's own name of the first cell at fault, empty when the whole row is. `header` is the line that names the
    cells of `raw`, so that a mended row can be read again on its own.
    """

    table: str
    source: str
    line: int
    column: str
    reason: str
    raw: str
    header: str
