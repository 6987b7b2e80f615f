"""Where every coil stood since temper rolling, and how slowly it follows the air there."""

from __future__ import annotations

import numpy as np

from agewatch.aging.coil_heat import time_constant_s
from agewatch.aging.journey import Legs
from agewatch.aging.kinetics import HOUR_S
from agewatch.aging.settled import Rows
from agewatch.plant.inventory import Floats, Inventory
from agewatch.plant.settings import Settings

BARE_W_M2K = 6.0
WRAPPED_W_M2K = 9.0
"""Still air and radiation on a bright bare coil; draught and a dull surface on a wrapped one."""
SHORTEST_LAG_S = HOUR_S


def coil_legs(inventory: Inventory, settings: Settings, at_s: float) -> Legs:
    """Legs of every coil up to `at_s`; locations are rows of `settings.location`, -1 for one that is not there.

    A coil is at its present location from temper rolling on unless a move says otherwise.
    """
    places = tuple(settings.location)
    move_location = inventory.move_location.recode(places)
    known = inventory.move_s <= at_s
    move_coil, move_s = inventory.move_coil[known].astype(np.intp), inventory.move_s[known]
    move_location = move_location[known]
    before = move_s <= inventory.temper_rolled_s[move_coil]
    first_location = inventory.location.recode(places).astype(np.intp)
    first_location[move_coil[before]] = move_location[before]  # the last of several stands

    coil = np.concatenate([np.arange(len(inventory)), move_coil[~before]])
    start_s = np.concatenate([inventory.temper_rolled_s, move_s[~before]])
    location = np.concatenate([first_location, move_location[~before]])
    order = np.argsort(coil, kind="stable")  # moves come ordered by time
    coil, start_s, location = coil[order], start_s[order], location[order]
    changes = np.append(True, (coil[1:] != coil[:-1]) | (location[1:] != location[:-1]))
    coil, start_s, location = coil[changes], start_s[changes], location[changes]
    return Legs(coil, location, start_s, _lag_s(inventory, settings, coil, location))


def _lag_s(inventory: Inventory, settings: Settings, coil: Rows, location: Rows) -> Floats:
    """Time constant of each coil at each of its locations, s, (n_legs,)."""
    default = settings.default_coil
    places = [*settings.location.values()]
    surface = np.array([np.nan if p.surface_w_m2k is None else p.surface_w_m2k for p in places] + [np.nan])
    factor = np.array([place.lag_factor for place in places] + [1.0])
    stated_s = np.array([np.nan if p.lag_h is None else p.lag_h * HOUR_S for p in places] + [np.nan])
    own_surface = np.where(inventory.wrapped[coil], WRAPPED_W_M2K, BARE_W_M2K)
    from_size_s = time_constant_s(
        _or_default(inventory.mass_kg, default.mass_kg)[coil],
        _or_default(inventory.width_mm, default.width_mm)[coil] / 1000.0,
        _or_default(inventory.bore_mm, default.bore_mm)[coil] / 1000.0,
        np.where(np.isnan(surface[location]), own_surface, surface[location]),
        factor[location],
    )
    lag_s = np.where(np.isnan(stated_s[location]), from_size_s, stated_s[location])
    return np.maximum(lag_s, SHORTEST_LAG_S)


def _or_default(values: Floats, default: float) -> Floats:
    return np.where(np.isnan(values), default, values)
