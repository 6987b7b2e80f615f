"""Whole histories, held to a plain reckoning coil by coil."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from agewatch.store.location_history import Moves, Told, present, whole_histories

NONE = float("nan")
TIME = st.integers(0, 9).map(float)
PLACE = st.integers(0, 3)


@st.composite
def plants(draw: st.DrawFn) -> tuple[Told, Moves]:
    count = draw(st.integers(0, 6))

    def column(values: st.SearchStrategy[float]) -> list[float]:
        return draw(st.lists(values, min_size=count, max_size=count))

    told = Told(
        temper_rolled_s=np.array(column(TIME)),
        located_since_s=np.array(column(st.just(NONE) | TIME)),
        location=np.array(column(PLACE), np.int32),
        parent=np.array(column(st.integers(-1, count - 1)), np.intp),
    )
    moved = draw(
        st.lists(st.tuples(st.integers(0, max(count - 1, 0)), TIME, PLACE), max_size=12 if count else 0)
    )
    coil, at_s, place = zip(*moved, strict=True) if moved else ((), (), ())
    return told, Moves(np.array(coil, np.intp), np.array(at_s, float), np.array(place, np.int32))


def own_moves(told: Told, moves: Moves, coil: int) -> dict[float, int]:
    since_s = told.located_since_s[coil]
    own = {} if np.isnan(since_s) else {float(since_s): int(told.location[coil])}
    for mover, at_s, place in zip(moves.coil, moves.at_s, moves.location, strict=True):
        if mover == coil:
            own[float(at_s)] = int(place)
    return own


def history(told: Told, moves: Moves, coil: int) -> tuple[int, dict[float, int]]:
    """Where a coil began, and its arrivals: by following the parents, one coil at a time."""
    own = own_moves(told, moves, coil)
    parent = int(told.parent[coil])
    if parent < 0 or not own or descends_from_itself(told, moves, coil):
        return int(told.location[coil]), own
    origin, inherited = history(told, moves, parent)
    return origin, {at_s: place for at_s, place in inherited.items() if at_s < min(own)} | own


def descends_from_itself(told: Told, moves: Moves, coil: int) -> bool:
    """Whether following parents, as long as they inherit too, goes round in a circle."""
    passed: set[int] = set()
    while coil >= 0 and own_moves(told, moves, coil):
        if coil in passed:
            return True
        passed.add(coil)
        coil = int(told.parent[coil])
    return False


@settings(max_examples=300, deadline=None)
@given(plants(), TIME)
def test_histories_agree_with_a_reckoning_coil_by_coil(plant: tuple[Told, Moves], at_s: float) -> None:
    """Whatever was told, slit over generations or in circles: the arrays say what following each coil says."""
    told, moves = plant
    whole = whole_histories(told, moves, at_s)
    location, since_s = present(whole, told)
    for coil in range(len(told.location)):
        origin, arrivals = history(told, moves, coil)
        rolled_s = float(told.temper_rolled_s[coil])
        if arrivals and min(arrivals) > rolled_s:
            arrivals[rolled_s] = origin
        expected = sorted((time_s, place) for time_s, place in arrivals.items() if time_s <= at_s)
        rows = whole.coil == coil
        assert list(zip(whole.at_s[rows], whole.location[rows], strict=True)) == expected
        stands = expected[-1] if expected else (NONE, told.location[coil])
        np.testing.assert_equal((since_s[coil], location[coil]), stands)
    assert (np.diff(whole.coil) >= 0).all()
