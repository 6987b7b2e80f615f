"""Verdicts: what an assessment says to do with each coil, and why in one sentence."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.kinetics import DAY_S
from agewatch.plant.assessment import Verdict
from agewatch.plant.inventory import Coded, Floats, Inventory
from agewatch.plant.settings import Part, Settings

NO_PART = Part(ype_limit_pct=0.2, exposed=True)
"""A coil without a part is judged as if it became an exposed panel."""


@dataclass(frozen=True, slots=True)
class Facts:
    """What verdicts rest on; arrays (n_coils,). NaN as in `Assessment`."""

    at_s: float
    horizon_s: float
    pull_horizon_s: float
    return_p10_s: Floats
    return_p50_s: Floats
    press_s: Floats
    return_risk: Floats
    pull_risk: Floats
    limit_pct: Floats
    lab_ype_pct: Floats
    ages: NDArray[np.bool_]


def judge(facts: Facts) -> tuple[NDArray[np.int8], Coded]:
    """Verdict and reason of coils that could be assessed."""
    at_s, ahead_s = facts.at_s, facts.return_p10_s - facts.at_s
    planned = ~np.isnan(facts.press_s)
    risk = np.nan_to_num(facts.return_risk, nan=0.0)
    days = f"{facts.pull_horizon_s / DAY_S:.0f} days", f"{2 * facts.pull_horizon_s / DAY_S:.0f} days"
    cases = [
        (
            facts.lab_ype_pct > facts.limit_pct,
            Verdict.HOLD,
            "a lab test found a plateau beyond the part's limit",
        ),
        (facts.return_p50_s <= at_s, Verdict.HOLD, "the plateau has returned by the P50 estimate"),
        (
            planned & (risk >= facts.pull_risk),
            Verdict.PULL,
            "the plateau may return before the planned pressing",
        ),
        (
            ~planned & (ahead_s <= facts.pull_horizon_s),
            Verdict.PULL,
            f"no pressing is planned and the plateau may return within {days[0]}",
        ),
        (
            planned & (risk >= facts.pull_risk / 2),
            Verdict.WATCH,
            "the risk of a return before the planned pressing is half of what asks for a pull",
        ),
        (
            ~planned & (ahead_s <= 2 * facts.pull_horizon_s),
            Verdict.WATCH,
            f"no pressing is planned and the plateau may return within {days[1]}",
        ),
        (~facts.ages, Verdict.CLEAR, "the grade does not age"),
        (np.isnan(facts.limit_pct), Verdict.CLEAR, "the part bears any plateau"),
        (
            np.isnan(facts.return_p10_s),
            Verdict.CLEAR,
            f"no return within {(facts.horizon_s - at_s) / DAY_S:.0f} days",
        ),
        (planned, Verdict.CLEAR, "the planned pressing comes before the return"),
        (~planned, Verdict.CLEAR, "the return is far off"),
    ]
    first = np.argmax(np.stack([case[0] for case in cases]), axis=0)
    verdicts = np.array([case[1] for case in cases], dtype=np.int8)[first]
    return verdicts, Coded(first.astype(np.int32), tuple(case[2] for case in cases))


def unassessable(inventory: Inventory, settings: Settings, covered: NDArray[np.bool_], at_s: float) -> Coded:
    """Why coils cannot be assessed; code -1: they can.

    Parameters
    ----------
    covered
        Whether each location of the settings has temperatures, (n_locations,).
    """
    location = inventory.location.recode(tuple(settings.location))
    grade = inventory.grade.recode(tuple(settings.grade))
    part = inventory.part.recode(tuple(settings.part))
    checks = (
        (grade < 0, inventory.grade, "grade {} is not in the settings"),
        (location < 0, inventory.location, "location {} is not in the settings"),
        ((part < 0) & (inventory.part.codes >= 0), inventory.part, "part {} is not in the settings"),
        (~np.append(covered, False)[location], inventory.location, "location {} has no temperature"),
    )
    codes = np.full(len(inventory), -1, dtype=np.int32)
    labels: list[str] = []
    for fails, names, sentence in checks:
        rows = np.flatnonzero(fails & (codes < 0))
        codes[rows] = len(labels) + names.codes[rows]
        labels += [sentence.format(name) for name in names.labels]
    codes[(inventory.temper_rolled_s > at_s) & (codes < 0)] = len(labels)
    return Coded(codes, (*labels, "it is temper rolled later than this assessment"))
