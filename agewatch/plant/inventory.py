"""What the plant has told, as columns: the whole store in a handful of arrays.

Times are seconds since 1970 in UTC. A number that was not given is NaN, a name that was not given has code -1.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Codes = NDArray[np.int32]


@dataclass(frozen=True, slots=True)
class Coded:
    """A column of names: `labels[codes[i]]` is the name of row `i`; code -1 is no name."""

    codes: Codes
    labels: tuple[str, ...]

    @classmethod
    def of(cls, names: Iterable[str | None]) -> Coded:
        """Encode names in order of first appearance; None and "" become -1."""
        seen: dict[str, int] = {}
        codes = np.fromiter(
            (-1 if not name else seen.setdefault(name, len(seen)) for name in names), dtype=np.int32
        )
        return cls(codes, tuple(seen))

    def name(self, row: int) -> str | None:
        code = int(self.codes[row])
        return None if code < 0 else self.labels[code]

    def names(self) -> NDArray[np.object_]:
        """Every row's name (None where there is none)."""
        return np.array([*self.labels, None], dtype=object)[self.codes]

    def take(self, rows: NDArray[np.intp] | NDArray[np.bool_]) -> Coded:
        return Coded(self.codes[rows], self.labels)

    def recode(self, labels: tuple[str, ...]) -> Codes:
        """Codes into another list of labels; names that it lacks become -1."""
        place = {label: code for code, label in enumerate(labels)}
        table = np.array([*(place.get(label, -1) for label in self.labels), -1], dtype=np.int32)
        return table[self.codes]


@dataclass(frozen=True, slots=True)
class Inventory:
    """The stored coils, one row each, ordered by `coil_id`."""

    coil_id: NDArray[np.object_]
    grade: Coded
    location: Coded
    part: Coded
    temper_rolled_s: Floats
    located_since_s: Floats
    press_s: Floats
    temper_elongation_pct: Floats
    width_mm: Floats
    mass_kg: Floats
    bore_mm: Floats
    coil_temp_c: Floats
    wrapped: NDArray[np.bool_]
    rp02_mpa: Floats
    rm_mpa: Floats
    n_value: Floats
    c_pct: Floats
    n_pct: Floats
    s_pct: Floats
    ti_pct: Floats
    nb_pct: Floats
    al_pct: Floats
    lab_ype_pct: Floats
    """Latest YPE measured on the coil as stored (not after an accelerated test); NaN: none."""
    lab_tested_s: Floats
    move_coil: Codes
    """Row of the coil that each move is about; moves are ordered by (coil, time)."""
    move_s: Floats
    move_location: Coded

    def __len__(self) -> int:
        return len(self.coil_id)

    def take(self, rows: NDArray[np.intp]) -> Inventory:
        """The inventory of some coils, `rows` rising."""
        place = np.full(len(self), -1, dtype=np.int32)
        place[rows] = np.arange(len(rows), dtype=np.int32)
        moves = place[self.move_coil] >= 0
        columns: dict[str, Any] = {}
        for field in fields(self):
            column = getattr(self, field.name)
            if field.name == "move_coil":
                column = place[column]
            chosen = moves if field.name.startswith("move_") else rows
            columns[field.name] = column.take(chosen) if isinstance(column, Coded) else column[chosen]
        return Inventory(**columns)

    def between(self, begin: int, end: int) -> Inventory:
        """The inventory of the coils from row `begin` to before row `end`, without a copy of what it holds."""
        first, last = np.searchsorted(self.move_coil, [begin, end])
        columns: dict[str, Any] = {}
        for field in fields(self):
            column = getattr(self, field.name)
            chosen = slice(first, last) if field.name.startswith("move_") else slice(begin, end)
            part = Coded(column.codes[chosen], column.labels) if isinstance(column, Coded) else column[chosen]
            columns[field.name] = part
        columns["move_coil"] = self.move_coil[first:last] - np.int32(begin)
        return Inventory(**columns)


@dataclass(frozen=True, slots=True)
class Readings:
    """Sensor readings, ordered by (sensor, time)."""

    sensor: Coded
    at_s: Floats
    celsius: Floats


@dataclass(frozen=True, slots=True)
class OutlookRows:
    """Supplied temperatures to come, ordered by (location, time)."""

    location: Coded
    at_s: Floats
    celsius: Floats
