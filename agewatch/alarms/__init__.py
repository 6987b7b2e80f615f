"""Alarms: kinds, life cycle, rules and grouping. Pure: no clock, no file, no screen."""

from agewatch.alarms.grouping import Group, group
from agewatch.alarms.kinds import COIL_KINDS, AlarmKind, Priority, highest
from agewatch.alarms.lifecycle import (
    AGEWATCH,
    Acknowledged,
    Alarm,
    AlarmKey,
    AlarmState,
    Changed,
    Cleared,
    Effect,
    Event,
    Observed,
    Raised,
    Timing,
    Transition,
    advance,
    replay,
)
from agewatch.alarms.rationalisation import RATIONALISATION, Rationalisation
from agewatch.alarms.turn import Condition, advance_all, unmentioned

__all__ = [
    "AGEWATCH",
    "COIL_KINDS",
    "RATIONALISATION",
    "Acknowledged",
    "Alarm",
    "AlarmKey",
    "AlarmKind",
    "AlarmState",
    "Changed",
    "Cleared",
    "Condition",
    "Effect",
    "Event",
    "Group",
    "Observed",
    "Priority",
    "Raised",
    "Rationalisation",
    "Timing",
    "Transition",
    "advance",
    "advance_all",
    "group",
    "highest",
    "replay",
    "unmentioned",
]
