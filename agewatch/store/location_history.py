"""Where coils stood and when: from what was told of each to whole histories, slit coils' parents included.

Plain arrays, no SQL. Locations are codes into one list of labels; times are s, NaN where none was given.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.plant.inventory import Codes, Floats

Places = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Told:
    """What the coils' feed tells of each coil, (n_coils,)."""

    temper_rolled_s: Floats
    located_since_s: Floats
    location: Codes
    parent: Places
    """Row of the coil that it was slit from; -1: none, or an unknown one."""


@dataclass(frozen=True, slots=True)
class Moves:
    """One row for each arrival of a coil at a location, ordered by (coil, time), one at a time."""

    coil: Places
    at_s: Floats
    location: Codes

    @classmethod
    def ordered(cls, *groups: Moves) -> Moves:
        """All moves in order; of two of one coil at one time, that of the later group counts."""
        coil = np.concatenate([group.coil for group in groups])
        at_s = np.concatenate([group.at_s for group in groups])
        location = np.concatenate([group.location for group in groups])
        order = np.lexsort((at_s, coil))  # stable: later groups stay behind earlier ones
        coil, at_s, location = coil[order], at_s[order], location[order]
        last = np.append((coil[1:] != coil[:-1]) | (at_s[1:] != at_s[:-1]), True)[: len(coil)]
        return cls(coil[last], at_s[last], location[last])

    def where(self, rows: NDArray[np.bool_]) -> Moves:
        return Moves(self.coil[rows], self.at_s[rows], self.location[rows])

    def starts(self, count: int) -> Places:
        """The first row of each of `count` coils, and the end of the last, (count + 1,)."""
        return np.searchsorted(self.coil, np.arange(count + 1))


def whole_histories(told: Told, moves: Moves, at_s: float) -> Moves:
    """Every coil's arrivals up to `at_s` (s), so that nothing is left to where it stands today.

    A coil arrives at its present location at `located_since_s` unless a move says otherwise for that time. A
    slit coil has its parent's history up to its own first move. A coil whose first move came after temper rolling
    also gets a row for where temper rolling found it.
    """
    count = len(told.location)
    known = np.flatnonzero(~np.isnan(told.located_since_s))
    implied = Moves(known, told.located_since_s[known], told.location[known])
    moves = Moves.ordered(implied, moves)
    origin = told.location.copy()
    for children in _generations(told.parent, np.diff(moves.starts(count)) > 0):
        moves = Moves.ordered(_inherited(moves, children, told.parent[children], count), moves)
        origin[children] = origin[told.parent[children]]
    starts = moves.starts(count)
    moved = np.flatnonzero(np.diff(starts) > 0)
    late = moved[moves.at_s[starts[moved]] > told.temper_rolled_s[moved]]
    moves = Moves.ordered(Moves(late, told.temper_rolled_s[late], origin[late]), moves)
    return moves.where(moves.at_s <= at_s)


def present(moves: Moves, told: Told) -> tuple[Codes, Floats]:
    """Where each coil stands after `moves`, and since when (NaN: from before anything was told)."""
    starts = moves.starts(len(told.location))
    moved = np.flatnonzero(np.diff(starts) > 0)
    location, since_s = told.location.copy(), np.full(len(told.location), np.nan)
    location[moved] = moves.location[starts[moved + 1] - 1]
    since_s[moved] = moves.at_s[starts[moved + 1] - 1]
    return location, since_s


def _generations(parent: Places, slit: NDArray[np.bool_]) -> list[Places]:
    """Coils that inherit, parents before children. Those that would be their own ancestors do not."""
    waiting = slit & (parent >= 0)
    generations = []
    while len(ready := np.flatnonzero(waiting & ~waiting[parent])):
        generations.append(ready)
        waiting[ready] = False
    return generations


def _inherited(moves: Moves, children: Places, parents: Places, count: int) -> Moves:
    """The parents' moves from before the children's own first."""
    starts = moves.starts(count)
    lengths = starts[parents + 1] - starts[parents]
    child = np.repeat(children, lengths)
    ends = np.cumsum(lengths)
    rows = np.arange(lengths.sum()) + np.repeat(starts[parents] - (ends - lengths), lengths)
    inherited = Moves(child, moves.at_s[rows], moves.location[rows])
    return inherited.where(inherited.at_s < moves.at_s[starts[child]])
