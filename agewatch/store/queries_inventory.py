"""The stored coils as columns, each with all that is known of its past."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np
from sqlalchemy import ColumnElement, Select, func, not_, or_, select

from agewatch.plant.inventory import Coded, Floats, Inventory
from agewatch.plant.tables import CoilStatus
from agewatch.store.access import View
from agewatch.store.bulk import number_or_absent, one_of, read_columns
from agewatch.store.location_history import Moves, Told, present, whole_histories
from agewatch.store.schema import coil, lab_test, move, press_plan
from agewatch.store.values import to_ms

_PAST = (
    coil.c.coil_id,
    coil.c.location,
    coil.c.parent_id,
    coil.c.temper_rolled_ms,
    number_or_absent(coil.c.located_since_ms),
)
_MOVE = (move.c.coil_id, move.c.location, move.c.at_ms)
_MEASURED = (
    "temper_elongation_pct",
    "width_mm",
    "mass_kg",
    "bore_mm",
    "coil_temp_c",
    "rp02_mpa",
    "rm_mpa",
    "n_value",
    "c_pct",
    "n_pct",
    "s_pct",
    "ti_pct",
    "nb_pct",
    "al_pct",
)


@dataclass(frozen=True, slots=True)
class _Past:
    """What the feed of coils tells of coils' pasts, a row each."""

    ids: list[str]
    location: list[str]
    parent: list[str | None]
    times_s: Floats
    """Temper rolling and arrival at the location, (2, n)."""

    def followed_by(self, other: _Past) -> _Past:
        return _Past(
            self.ids + other.ids,
            self.location + other.location,
            self.parent + other.parent,
            np.concatenate([self.times_s, other.times_s], axis=1),
        )


def inventory(view: View, at_s: float, coil_ids: Collection[str] | None = None) -> Inventory:
    """The stored coils as they are known, with their moves up to `at_s` (s); of `coil_ids` only, if given.

    `location` and `located_since_s` tell where a coil stands after its last move. Histories are whole: the
    moves of a coil that has any begin at or before its temper rolling, and a slit coil has its parent's.
    """
    wanted = coil.c.status == CoilStatus.STORED.value
    if coil_ids is not None:
        wanted &= one_of(coil.c.coil_id, coil_ids)
    past, grade, part, press_s, numbers = _stored_coils(view, wanted)
    count = len(past.ids)
    told, moves, places = _told(view, wanted, past)
    moves = whole_histories(told, moves, at_s)
    location, located_since_s = present(moves, told)
    moves = moves.where(moves.coil < count)  # the others' are those of ancestors
    lab_ype_pct, lab_tested_s = _lab(view, wanted, past.ids, at_s)
    return Inventory(
        coil_id=np.array([*past.ids, None], dtype=object)[:-1],
        grade=Coded.of(grade),
        location=Coded(location[:count], places),
        part=Coded.of(part),
        temper_rolled_s=past.times_s[0],
        located_since_s=located_since_s[:count],
        press_s=press_s,
        wrapped=numbers[-1] == 1.0,
        lab_ype_pct=lab_ype_pct,
        lab_tested_s=lab_tested_s,
        move_coil=moves.coil.astype(np.int32),
        move_s=moves.at_s,
        move_location=Coded(moves.location, places),
        **dict(zip(_MEASURED, numbers[:-1], strict=True)),
    )


def _stored_coils(
    view: View, wanted: ColumnElement[bool]
) -> tuple[_Past, list[str], list[str | None], Floats, Floats]:
    """Pasts, grades, parts, pressings, and the measured values with `wrapped` behind them."""
    press_ms = func.coalesce(press_plan.c.press_ms, coil.c.press_ms)  # the feed of presses rules
    numbers = (press_ms, *(coil.c[name] for name in _MEASURED), coil.c.wrapped)
    (ids, location, parent, grade, part), found = read_columns(
        view,
        select(*_PAST[:3], coil.c.grade, coil.c.part, *_PAST[3:], *map(number_or_absent, numbers))
        .select_from(coil.outerjoin(press_plan, press_plan.c.coil_id == coil.c.coil_id))
        .where(wanted)
        .order_by(coil.c.coil_id),
        texts=5,
    )
    return _Past(ids, location, parent, found[:2] / 1000.0), grade, part, found[2] / 1000.0, found[3:]


def _told(view: View, wanted: ColumnElement[bool], past: _Past) -> tuple[Told, Moves, tuple[str, ...]]:
    """What is told of the wanted coils and, behind them, of their ancestors; and the labels of all places."""
    older = _ancestors(view, wanted) if any(past.parent) else None
    own = select(*_MOVE).join(coil, coil.c.coil_id == move.c.coil_id).where(wanted)
    movers, places, moved_s = _moves(view, own)
    if older is not None:
        past = past.followed_by(older)
        more = _moves(view, select(*_MOVE).where(one_of(move.c.coil_id, older.ids)))
        movers, places, moved_s = movers + more[0], places + more[1], np.append(moved_s, more[2])
    row_of: dict[str | None, int] = {coil_id: row for row, coil_id in enumerate(past.ids)}
    coded = Coded.of(chain(past.location, places))
    codes, move_codes = np.split(coded.codes, [len(past.ids)])
    parent = np.fromiter((row_of.get(name, -1) for name in past.parent), np.intp, len(past.ids))
    mover = np.fromiter(map(row_of.__getitem__, movers), np.intp, len(movers))
    told = Told(past.times_s[0], past.times_s[1], codes, parent)
    return told, Moves(mover, moved_s, move_codes), coded.labels


def _ancestors(view: View, wanted: ColumnElement[bool]) -> _Past:
    """Coils that the wanted ones were slit from, at any remove and of any status, if they are known."""
    slit = coil.c.parent_id.is_not(None)
    line = select(coil.c.parent_id.label("coil_id")).where(wanted, slit).cte("line", recursive=True)
    line = line.union(select(coil.c.parent_id).join(line, line.c.coil_id == coil.c.coil_id).where(slit))
    known = select(*_PAST).where(coil.c.coil_id.in_(select(line.c.coil_id)), not_(wanted))
    (ids, location, parent), times_ms = read_columns(view, known, texts=3)
    return _Past(ids, location, parent, times_ms / 1000.0)


def _moves(view: View, moves: Select[Any]) -> tuple[list[str], list[str], Floats]:
    """Coils, locations and times of moves."""
    (movers, places), (at_ms,) = read_columns(view, moves, texts=2)
    return movers, places, at_ms / 1000.0


def _lab(view: View, wanted: ColumnElement[bool], ids: list[str], at_s: float) -> tuple[Floats, Floats]:
    """The latest test of each coil as it is stored since temper rolling, the worst direction; NaN: none."""
    as_stored = or_(lab_test.c.aged_h.is_(None), lab_test.c.aged_h == 0.0)
    tested_ms = lab_test.c.tested_ms
    tests = (
        select(coil.c.coil_id, func.max(lab_test.c.ype_pct), tested_ms)
        .join(coil, coil.c.coil_id == lab_test.c.coil_id)
        .where(wanted, as_stored, tested_ms >= coil.c.temper_rolled_ms, tested_ms <= to_ms(at_s))
        .group_by(coil.c.coil_id, tested_ms)
        .order_by(tested_ms)  # the latest stands last, and stays
    )
    (tested,), (ype_pct, at_ms) = read_columns(view, tests, texts=1)
    row_of = {coil_id: row for row, coil_id in enumerate(ids)}
    rows = [row_of[coil_id] for coil_id in tested]
    lab_ype_pct, lab_tested_s = np.full((2, len(ids)), np.nan)
    lab_ype_pct[rows], lab_tested_s[rows] = ype_pct, at_ms / 1000.0
    return lab_ype_pct, lab_tested_s
