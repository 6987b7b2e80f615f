"""From what the plant has told to an assessment: every stored coil, evaluated at one time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.assess import (
    Steels,
    locking_to_return,
    return_s,
    yield_rise_mpa,
    ype_pct,
)
from agewatch.aging.journey import Journey
from agewatch.aging.kinetics import DAY_S, HOUR_S, ZERO_C_K
from agewatch.aging.settled import Rows, SettledField
from agewatch.plant.air import PlantAir, plant_air
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Coded, Floats, Inventory, OutlookRows, Readings
from agewatch.plant.journeys import coil_legs
from agewatch.plant.settings import Settings
from agewatch.plant.steels import activations_j_mol, assumed_values, coil_steels
from agewatch.plant.verdicts import NO_PART, Facts, judge, unassessable

MODEL = "agewatch-1"
"""Version of the model: changed whenever the same inputs would give other numbers."""


@dataclass(frozen=True, slots=True)
class Prepared:
    """Coils that can be assessed, with their steels, on their way through their legs."""

    inventory: Inventory
    journey: Journey
    steels: Steels
    limit_pct: Floats
    """NaN: the part bears any plateau."""
    pull_risk: Floats
    at_s: float
    horizon_s: float

    def now(self) -> tuple[Rows, Floats]:
        """The piece that each coil is in, and the time of the assessment for each coil."""
        at_s = np.full(len(self.inventory), self.at_s)
        return self.journey.piece_at(at_s), at_s


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
        ready = prepare(inventory.take(rows), air, settings, at_s)
        own, own_reasons = _evaluate(ready, settings)
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
    field = SettledField.of(air.curves, activations_j_mol(settings), legs.tau_s)
    grade = inventory.grade.recode(tuple(settings.grade)).astype(np.intp)
    steels = coil_steels(inventory, settings, grade)
    parts = [*settings.part.values(), NO_PART]
    part = inventory.part.recode(tuple(settings.part))
    limits = [np.nan if each.ype_limit_pct is None else each.ype_limit_pct for each in parts]
    return Prepared(
        inventory,
        Journey.of(field, steels.channel, legs, inventory.coil_temp_c + ZERO_C_K, air.horizon_s),
        steels,
        np.array(limits)[part],
        np.array([each.pull_risk for each in parts])[part],
        at_s,
        air.horizon_s,
    )


def _evaluate(ready: Prepared, settings: Settings) -> tuple[dict[str, NDArray[Any]], Coded]:
    """The columns of coils that can be assessed, and their reasons."""
    steels, inventory, (piece, at_s) = ready.steels, ready.inventory, ready.now()
    coil_k, exposure_s = ready.journey.at(piece, at_s)
    rise_mpa = yield_rise_mpa(steels, exposure_s)
    everyone = np.arange(len(inventory))
    locking = locking_to_return(steels, ready.limit_pct)
    returns_s = return_s(ready.journey, steels, everyone, locking)
    risk = np.where(np.isnan(inventory.press_s), np.nan, returns_s < inventory.press_s)
    facts = Facts(
        at_s=ready.at_s,
        horizon_s=ready.horizon_s,
        pull_horizon_s=settings.outlook.pull_horizon_days * DAY_S,
        return_p10_s=returns_s,
        return_p50_s=returns_s,
        press_s=inventory.press_s,
        return_risk=risk,
        pull_risk=ready.pull_risk,
        limit_pct=ready.limit_pct,
        lab_ype_pct=inventory.lab_ype_pct,
        ages=np.isfinite(steels.tau_s).any(axis=1),
    )
    verdict, reason = judge(facts)
    return {
        "equivalent_age_days": exposure_s[:, 0] / DAY_S,
        "coil_temp_c": coil_k - ZERO_C_K,
        "yield_rise_mpa": rise_mpa,
        "ype_pct": ype_pct(steels, rise_mpa),
        "ype_limit_pct": ready.limit_pct,
        "return_p10_s": returns_s,
        "return_p50_s": returns_s,
        "return_p90_s": returns_s,
        "return_risk": risk,
        "slack_h": (returns_s - inventory.press_s) / HOUR_S,
        "verdict": verdict,
        "estimated_fraction": ready.journey.estimated_fraction(at_s),
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
