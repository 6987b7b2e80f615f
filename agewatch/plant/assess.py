"""From what the plant has told to an assessment: every stored coil, evaluated at one time."""

from __future__ import annotations

import os
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.assess import Stock, now, return_quantiles_s, return_risk
from agewatch.aging.journey import Journey, Legs
from agewatch.aging.kinetics import DAY_S, HOUR_S, ZERO_C_K
from agewatch.aging.settled import Rows, SettledField
from agewatch.plant.air import PlantAir, plant_air
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Coded, Floats, Inventory, OutlookRows, Readings
from agewatch.plant.journeys import coil_legs
from agewatch.plant.settings import Settings
from agewatch.plant.steels import (
    activations_j_mol,
    assumed_values,
    coil_channels,
    coil_spreads,
    coil_steels,
)
from agewatch.plant.verdicts import NO_PART, Facts, judge, unassessable

_LEAST_BATCH_COILS = 10_000
"""Fewer coils are not worth a thread of their own."""

MODEL = "agewatch-1"
"""Version of the model: changed whenever the same inputs would give other numbers."""


@dataclass(frozen=True, slots=True)
class Prepared:
    """Coils that can be assessed, on their journeys."""

    inventory: Inventory
    stock: Stock
    pull_risk: Floats


def assess(
    inventory: Inventory,
    readings: Readings,
    outlook: OutlookRows,
    settings: Settings,
    settings_digest: str,
    at_s: float,
) -> Assessment:
    """Evaluate every stored coil at `at_s` (s). A pure function: equal inputs give equal columns."""
    air = plant_air(readings, outlook, settings, from_s=first_leg_s(inventory, at_s), at_s=at_s)
    covered = air.covered if air is not None else np.zeros(len(settings.location), dtype=np.bool_)
    why_not = unassessable(inventory, settings, covered, at_s)
    rows = np.flatnonzero(why_not.codes < 0)
    columns = _blank_columns(len(inventory))
    reasons = why_not
    if air is not None and len(rows):
        own, own_reasons = _in_batches(inventory.take(rows), air, settings, at_s)
        for name, values in own.items():
            columns[name][rows] = values
        reasons = _merged(why_not, rows, own_reasons)
    return Assessment(
        at_s=at_s,
        model=MODEL,
        settings_digest=settings_digest,
        coil_id=inventory.coil_id,
        grade=inventory.grade,
        part=inventory.part,
        location=inventory.location,
        age_days=(at_s - inventory.temper_rolled_s) / DAY_S,
        press_s=inventory.press_s,
        reason=reasons,
        assumed=assumed_values(inventory),
        starting_point=_starting_points(inventory, settings),
        **columns,
    )


def first_leg_s(inventory: Inventory, at_s: float) -> float:
    """When the oldest coil was temper rolled; `at_s` if there is none older."""
    return min(at_s, float(np.min(inventory.temper_rolled_s, initial=at_s)))


def prepare(inventory: Inventory, air: PlantAir, settings: Settings, at_s: float) -> Prepared:
    """Join legs, certificates and air of coils none of which is `unassessable`."""
    legs = coil_legs(inventory, settings, at_s)
    return _joined(inventory, legs, _field(legs, air, settings), air, settings, at_s)


def _field(legs: Legs, air: PlantAir, settings: Settings) -> SettledField:
    return SettledField.of(air.curves, activations_j_mol(settings), legs.tau_s, float(legs.start_s.max()))


def _joined(
    inventory: Inventory, legs: Legs, field: SettledField, air: PlantAir, settings: Settings, at_s: float
) -> Prepared:
    grade = inventory.grade.recode(tuple(settings.grade)).astype(np.intp)
    parts = [*settings.part.values(), NO_PART]
    part = inventory.part.recode(tuple(settings.part))
    limit_pct = np.array([np.nan if each.ype_limit_pct is None else each.ype_limit_pct for each in parts])[
        part
    ]

    def journey(channel: Rows) -> Journey:
        return Journey.of(field, channel, legs, inventory.coil_temp_c + ZERO_C_K, air.horizon_s)

    steels = coil_steels(inventory, settings, grade)
    raised = coil_channels(settings, grade, raised=True)
    stock = Stock(
        journey(steels.channel),
        None if np.array_equal(raised, steels.channel) else journey(raised),
        steels,
        coil_spreads(inventory, settings, grade, limit_pct),
        air.ahead,
        limit_pct,
        at_s,
        air.horizon_s,
    )
    return Prepared(inventory, stock, np.array([each.pull_risk for each in parts])[part])


def _in_batches(
    inventory: Inventory, air: PlantAir, settings: Settings, at_s: float
) -> tuple[dict[str, NDArray[Any]], Coded]:
    """Columns and reasons of coils that can be assessed: in as many batches as there are cores."""
    legs = coil_legs(inventory, settings, at_s)
    field = _field(legs, air, settings)

    def evaluate(begin: int, end: int) -> tuple[dict[str, NDArray[Any]], Coded]:
        own = inventory.between(begin, end), legs.of_coils(begin, end)
        return _evaluate(_joined(*own, field, air, settings, at_s), settings)

    count = min(os.cpu_count() or 1, -(-len(inventory) // _LEAST_BATCH_COILS))
    edges = np.linspace(0, len(inventory), count + 1).astype(int).tolist()
    with ThreadPoolExecutor() as threads:
        parts = list(threads.map(evaluate, edges[:-1], edges[1:]))
    columns = {name: np.concatenate([part[0][name] for part in parts]) for name in parts[0][0]}
    return columns, Coded(np.concatenate([part[1].codes for part in parts]), parts[0][1].labels)


def _evaluate(ready: Prepared, settings: Settings) -> tuple[dict[str, NDArray[Any]], Coded]:
    """The columns of coils that can be assessed, and their reasons."""
    stock, press_s = ready.stock, ready.inventory.press_s
    state = now(stock)
    p10_s, p50_s, p90_s = return_quantiles_s(stock, state)
    risk = return_risk(stock, state, np.maximum(press_s, stock.at_s))
    facts = Facts(
        at_s=stock.at_s,
        horizon_s=stock.horizon_s,
        pull_horizon_s=settings.outlook.pull_horizon_days * DAY_S,
        return_p10_s=p10_s,
        return_p50_s=p50_s,
        press_s=press_s,
        return_risk=risk,
        pull_risk=ready.pull_risk,
        limit_pct=stock.limit_pct,
        lab_ype_pct=ready.inventory.lab_ype_pct,
        ages=np.asarray(np.isfinite(stock.steels.tau_s).any(axis=1)),
    )
    verdict, reason = judge(facts)
    return {
        "equivalent_age_days": state.exposure_s[:, 0] / DAY_S,
        "coil_temp_c": state.coil_k - ZERO_C_K,
        "yield_rise_mpa": state.rise_mpa,
        "ype_pct": state.ype_pct,
        "ype_limit_pct": stock.limit_pct,
        "return_p10_s": p10_s,
        "return_p50_s": p50_s,
        "return_p90_s": p90_s,
        "return_risk": risk,
        "slack_h": (p10_s - press_s) / HOUR_S,
        "verdict": verdict,
        "estimated_fraction": state.estimated_fraction,
    }, reason


def _blank_columns(count: int) -> dict[str, NDArray[Any]]:
    """Columns of coils that cannot be assessed."""
    names = (
        "equivalent_age_days",
        "coil_temp_c",
        "yield_rise_mpa",
        "ype_pct",
        "ype_limit_pct",
        "return_p10_s",
        "return_p50_s",
        "return_p90_s",
        "return_risk",
        "slack_h",
        "estimated_fraction",
    )
    columns: dict[str, NDArray[Any]] = {name: np.full(count, np.nan) for name in names}
    columns["verdict"] = np.full(count, Verdict.UNASSESSED, dtype=np.int8)
    return columns


def _merged(why_not: Coded, rows: Rows, own: Coded) -> Coded:
    """Reasons of all coils: `own` at `rows`, `why_not` elsewhere."""
    codes = why_not.codes.copy()
    codes[rows] = own.codes + len(why_not.labels)
    return Coded(codes, (*why_not.labels, *own.labels))


def _starting_points(inventory: Inventory, settings: Settings) -> NDArray[np.bool_]:
    """Coils of aging grades that no fit supports."""
    grades = settings.grade.values()
    unfitted = np.array([*(each.aging and not each.fitted for each in grades), False])
    return np.asarray(unfitted[inventory.grade.recode(tuple(settings.grade))])
