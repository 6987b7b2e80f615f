"""A coil's verdict put into words for the person on shift: what it is, why, what to do, and on which values."""

from __future__ import annotations

from dataclasses import dataclass
from zoneinfo import ZoneInfo

from agewatch.board.coil_row import CoilRow, known
from agewatch.board.look import STARTING_POINT
from agewatch.board.times import relative, slack, weekday_time
from agewatch.plant.assessment import Verdict

CAUTION = "An estimate, never a test of this coil. Lifting and moving follow site rules."
_STARTING_POINT_CAUTION = (
    f"{STARTING_POINT} Starting point: no test of this plant supports the grade yet; "
    "its dates may be far out."
)


@dataclass(frozen=True, slots=True)
class Guidance:
    """`headline` is one line; `facts` are pairs of name and value."""

    headline: str
    why: str
    to_do: str
    cautions: tuple[str, ...]
    facts: tuple[tuple[str, str], ...]


def guidance(coil: CoilRow, now_s: float, zone: ZoneInfo) -> Guidance:
    """What the side panel says about `coil`, with times in `zone` and relative to `now_s`."""
    cautions = (CAUTION, _STARTING_POINT_CAUTION) if coil.starting_point else (CAUTION,)
    return Guidance(
        headline=_headline(coil, now_s, zone),
        why=_sentence(coil.reason),
        to_do=_to_do(coil),
        cautions=cautions,
        facts=tuple((name, value) for name, value in _facts(coil, now_s, zone) if value),
    )


def _headline(coil: CoilRow, now_s: float, zone: ZoneInfo) -> str:
    match coil.verdict:
        case Verdict.HOLD:
            return "Hold: do not press"
        case Verdict.PULL if known(coil.return_p10_s) and coil.return_p10_s > now_s:
            return f"Pull forward: press before {_when(coil.return_p10_s, now_s, zone)}"
        case Verdict.PULL:
            return "Pull forward now: the early (P10) date of return has passed"
        case Verdict.WATCH:
            return "Watch: nothing to move yet"
        case Verdict.UNASSESSED:
            return "Not assessed: how long it keeps is not known"
        case _:
            return "Clear: nothing to do"


def _to_do(coil: CoilRow) -> str:
    place = coil.location or "its place"
    match coil.verdict:
        case Verdict.HOLD:
            return (
                "Keep it from the press. Have it tested (tensile test, ISO 6892-1). If the plateau is there: roller "
                "level just before pressing, temper roll again, or use it for an unexposed part."
            )
        case Verdict.PULL:
            return (
                f"Have it brought from {place} to the press ahead of its turn. No slot before that time: "
                "a colder place gains time; else have it tested (tensile test, ISO 6892-1) before pressing."
            )
        case Verdict.WATCH:
            return "Keep to its planned pressing, and give it no hotter place. Look again when plan or weather change."
        case Verdict.UNASSESSED:
            return "Go by the order's shelf life until the cause above is mended; tell whoever keeps the plant's files."
        case _:
            return "Nothing."


def _facts(coil: CoilRow, now_s: float, zone: ZoneInfo) -> list[tuple[str, str]]:
    mark = f"{STARTING_POINT} " if coil.starting_point else ""
    pressing = _when(coil.press_s, now_s, zone) if known(coil.press_s) else "not planned"
    return [
        ("Pressing", pressing),
        ("Slack", _slack(coil)),
        ("Risk", _number(100 * coil.return_risk, "{:.0f} %")),
        ("P10 return", _return(coil.return_p10_s, coil, mark, now_s, zone)),
        ("P50 return", _return(coil.return_p50_s, coil, mark, now_s, zone)),
        ("P90 return", _return(coil.return_p90_s, coil, mark, now_s, zone)),
        ("YPE now", _number(coil.ype_pct, "{:.2f} %")),
        ("YPE limit", _number(coil.ype_limit_pct, "{:.2f} %") or "none: the part bears any plateau"),
        ("Equiv. age", _number(coil.equivalent_age_days, "{:.1f} d at 20 °C")),
        ("Age", _number(coil.age_days, "{:.1f} d since temper rolling")),
        ("Coil now", _number(coil.coil_temp_c, "{:.1f} °C")),
        ("Yield rise", _number(coil.yield_rise_mpa, "{:.1f} MPa")),
        ("Estimated", _number(100 * coil.estimated_fraction, "{:.0f} % of the aging")),
        ("Assumed", coil.assumed),
        ("Grade", coil.grade or "not given"),
        ("Part", coil.part or "not given: judged as an exposed one"),
        ("Location", coil.location or "not given"),
    ]


def _return(at_s: float, coil: CoilRow, mark: str, now_s: float, zone: ZoneInfo) -> str:
    if known(at_s):
        return mark + _when(at_s, now_s, zone)
    return "" if coil.verdict is Verdict.UNASSESSED else "not inside the outlook"


def _slack(coil: CoilRow) -> str:
    if not known(coil.slack_h):
        return ""
    return f"{slack(coil.slack_h)}{'' if coil.slack_h < 0 else ' from the pressing to the P10 return'}"


def _number(value: float, form: str) -> str:
    return form.format(value) if known(value) else ""


def _when(at_s: float, now_s: float, zone: ZoneInfo) -> str:
    return f"{weekday_time(at_s, zone)} ({relative(at_s, now_s)})"


def _sentence(reason: str) -> str:
    return f"{reason[0].upper()}{reason[1:]}." if reason else "No reason is stored."
