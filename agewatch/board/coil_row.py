"""One coil of an assessment as plain values: what a line of the list and the side panel are written from."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Self

from agewatch.plant.assessment import Assessment, Verdict


@dataclass(frozen=True, slots=True)
class CoilRow:
    """The values of one coil; NaN and None as in `Assessment`."""

    coil_id: str
    grade: str | None
    part: str | None
    location: str | None
    verdict: Verdict
    reason: str
    age_days: float
    equivalent_age_days: float
    coil_temp_c: float
    yield_rise_mpa: float
    ype_pct: float
    ype_limit_pct: float
    return_p10_s: float
    return_p50_s: float
    return_p90_s: float
    press_s: float
    return_risk: float
    slack_h: float
    estimated_fraction: float
    assumed: str
    starting_point: bool

    @classmethod
    def of(cls, assessment: Assessment, row: int) -> Self:
        return cls(
            coil_id=assessment.coil_id[row],
            grade=assessment.grade.name(row),
            part=assessment.part.name(row),
            location=assessment.location.name(row),
            verdict=Verdict(int(assessment.verdict[row])),
            reason=assessment.reason.name(row) or "",
            age_days=float(assessment.age_days[row]),
            equivalent_age_days=float(assessment.equivalent_age_days[row]),
            coil_temp_c=float(assessment.coil_temp_c[row]),
            yield_rise_mpa=float(assessment.yield_rise_mpa[row]),
            ype_pct=float(assessment.ype_pct[row]),
            ype_limit_pct=float(assessment.ype_limit_pct[row]),
            return_p10_s=float(assessment.return_p10_s[row]),
            return_p50_s=float(assessment.return_p50_s[row]),
            return_p90_s=float(assessment.return_p90_s[row]),
            press_s=float(assessment.press_s[row]),
            return_risk=float(assessment.return_risk[row]),
            slack_h=float(assessment.slack_h[row]),
            estimated_fraction=float(assessment.estimated_fraction[row]),
            assumed=assessment.assumed.name(row) or "",
            starting_point=bool(assessment.starting_point[row]),
        )


def known(value: float) -> bool:
    """Whether a number was given at all."""
    return not math.isnan(value)
