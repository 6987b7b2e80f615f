"""How an assessment is printed: one JSON document, one CSV table, or a table to read."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Iterator
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

from agewatch.cli.tables import csv_line, text_table
from agewatch.clock import rfc3339
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Floats

QUANTILES = ("p10", "p50", "p90")

Fields = dict[str, object]
Rows = NDArray[np.intp]


def json_lines(assessment: Assessment) -> Iterator[str]:
    """One JSON document, a coil to a line, in the order of coil ids. What is not known is null."""
    head = {
        "assessed_at": rfc3339(assessment.at_s),
        "model": assessment.model,
        "settings_digest": assessment.settings_digest,
    }
    yield json.dumps(head)[:-1] + ', "coils": ['
    last = len(assessment) - 1
    for row, fields in enumerate(coil_fields(assessment)):
        yield json.dumps(fields, allow_nan=False) + ("," if row < last else "")
    yield "]}"


def csv_lines(assessment: Assessment) -> Iterator[str]:
    """A heading and a line for each coil; `return_at` becomes three columns."""
    yield csv_line(_flat_names(_columns(assessment)))
    for fields in coil_fields(assessment):
        yield csv_line(_flat_values(fields))


def text_lines(assessment: Assessment, timezone: str) -> Iterator[str]:
    """A table, the most urgent coil first, and one line that sums it up."""
    zone = ZoneInfo(timezone)
    heading = (
        "coil",
        "verdict",
        "slack h",
        "return P50",
        "press",
        "risk",
        "YPE %",
        "eq. age d",
        "°C",
        "location",
        "why",
    )
    rows = most_urgent_first(assessment)
    if len(rows):
        yield from text_table(heading, _texts(assessment, rows, zone), right=(2, 5, 6, 7, 8))
    yield summary(assessment, timezone)


def most_urgent_first(assessment: Assessment) -> Rows:
    """Rows by verdict, then slack, then P10 return, then coil."""
    keys = (assessment.return_p10_s, assessment.slack_h, -assessment.verdict)
    return np.lexsort(keys)


def summary(assessment: Assessment, timezone: str) -> str:
    """How many coils have each verdict, and when."""
    counts = np.bincount(assessment.verdict, minlength=len(Verdict))
    told = ", ".join(f"{int(counts[verdict])} {verdict.word}" for verdict in reversed(Verdict))
    at = _minute(assessment.at_s, ZoneInfo(timezone))
    return f"{len(assessment)} coils at {at} ({timezone}): {told}"


def coil_fields(assessment: Assessment) -> Iterator[Fields]:
    """Every coil by the names and units of the machine output."""
    columns = _columns(assessment)
    names = tuple(columns)
    for values in zip(*columns.values(), strict=True):
        yield dict(zip(names, values, strict=True))


def _columns(assessment: Assessment) -> dict[str, list[object]]:
    return {
        "coil_id": assessment.coil_id.tolist(),
        "grade": assessment.grade.names().tolist(),
        "part": assessment.part.names().tolist(),
        "location": assessment.location.names().tolist(),
        "age_days": _numbers(assessment.age_days),
        "equivalent_age_days": _numbers(assessment.equivalent_age_days),
        "coil_temp_c": _numbers(assessment.coil_temp_c),
        "yield_rise_mpa": _numbers(assessment.yield_rise_mpa),
        "ype_pct": _numbers(assessment.ype_pct),
        "ype_limit_pct": _numbers(assessment.ype_limit_pct),
        "return_at": _returns(assessment),
        "press_at": _times(assessment.press_s),
        "return_risk": _numbers(assessment.return_risk),
        "slack_h": _numbers(assessment.slack_h),
        "verdict": [Verdict(code).word for code in assessment.verdict.tolist()],
        "reason": assessment.reason.names().tolist(),
        "estimated_fraction": _numbers(assessment.estimated_fraction),
        "assumed": assessment.assumed.names().tolist(),
        "starting_point": assessment.starting_point.tolist(),
    }


def _flat_names(names: Iterable[str]) -> Iterator[str]:
    for name in names:
        if name == "return_at":
            yield from (f"{name}_{quantile}" for quantile in QUANTILES)
        else:
            yield name


def _flat_values(fields: Fields) -> Iterator[object]:
    for value in fields.values():
        if isinstance(value, dict):
            yield from value.values()
        else:
            yield value


def _numbers(column: Floats) -> list[object]:
    return [value if math.isfinite(value) else None for value in column.tolist()]


def _times(column: Floats) -> list[object]:
    return [rfc3339(value) if math.isfinite(value) else None for value in column.tolist()]


def _returns(assessment: Assessment) -> list[object]:
    columns = (assessment.return_p10_s, assessment.return_p50_s, assessment.return_p90_s)
    return [
        dict(zip(QUANTILES, times, strict=True))
        for times in zip(*(_times(column) for column in columns), strict=True)
    ]


def _texts(assessment: Assessment, rows: Rows, zone: ZoneInfo) -> Iterator[tuple[str, ...]]:
    for row in rows.tolist():
        dated = math.isfinite(assessment.return_p50_s[row])
        mark = " (starting point)" if dated and assessment.starting_point[row] else ""
        yield (
            str(assessment.coil_id[row]),
            Verdict(assessment.verdict[row]).word,
            _number(assessment.slack_h[row], 1),
            _minute(assessment.return_p50_s[row], zone),
            _minute(assessment.press_s[row], zone),
            _number(assessment.return_risk[row], 2),
            _number(assessment.ype_pct[row], 3),
            _number(assessment.equivalent_age_days[row], 1),
            _number(assessment.coil_temp_c[row], 1),
            assessment.location.name(row) or "–",
            f"{assessment.reason.name(row) or ''}{mark}",
        )


def _number(value: float, places: int) -> str:
    return f"{value:.{places}f}" if math.isfinite(value) else "–"


def _minute(at_s: float, zone: ZoneInfo) -> str:
    return f"{datetime.fromtimestamp(at_s, zone):%Y-%m-%d %H:%M}" if math.isfinite(at_s) else "–"
