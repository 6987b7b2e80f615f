"""The rationalisation record of every kind of alarm: its cause, what ignoring it costs, what to do, how soon.

A kind without an action for a person is no alarm. Words for the shift supervisor.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from agewatch.alarms.kinds import AlarmKind, Priority

ESTIMATE_CAUTION = (
    "The date is an estimate: it replaces neither a tensile test of the coil (ISO 6892-1) "
    "nor the order's quality terms."
)
LIFTING_CAUTION = "Move coils only by the site's rules for lifting and moving them."


@dataclass(frozen=True, slots=True)
class Rationalisation:
    """What a person needs to know about one kind of alarm."""

    title: str
    cause: str
    consequence: str
    action: str
    time_to_respond: str
    priority: Priority
    """Of every alarm of the kind; for coils only where no date sets it."""
    latching: bool = False
    """True: it stands until it is reset, even when its condition has gone."""
    cautions: tuple[str, ...] = ()


RATIONALISATION: Mapping[AlarmKind, Rationalisation] = {
    AlarmKind.RETURN_BEFORE_PRESS: Rationalisation(
        title="Yield point returns before pressing",
        cause="The coil ages faster than its pressing comes: the store is warm, or the coil waits long.",
        consequence="Panels pressed from it may show stretcher strains and be scrapped.",
        action="Bring the coil forward and press it before the time shown, move it to a cooler place, or "
        "give it to a part that bears the plateau; if none can be done in time, have it tested.",
        time_to_respond="Before the latest time to act: the return or the pressing, less the lead time.",
        priority=Priority.LOW,
        cautions=(ESTIMATE_CAUTION, LIFTING_CAUTION),
    ),
    AlarmKind.RETURNED_IN_STORE: Rationalisation(
        title="Yield point has returned in store",
        cause="By the middle of the estimate, or by a test, the plateau exceeds what the part bears.",
        consequence="Pressed as it is, the coil will probably show stretcher strains on visible panels.",
        action="Hold the coil and have it tested. If the test agrees: temper roll it again, level it "
        "just before pressing, or use it for a part that is not seen.",
        time_to_respond="Before its pressing; take it off the plan first.",
        priority=Priority.LOW,
        cautions=(ESTIMATE_CAUTION, LIFTING_CAUTION),
    ),
    AlarmKind.UNASSESSABLE_COIL: Rationalisation(
        title="Coil cannot be assessed",
        cause="Its grade or location is not in the settings, or no temperature is known where it lies.",
        consequence="Nobody is warned when this coil ages.",
        action="Mend what the reason names: the coil's row in its feed, the settings, or the sensor. Until "
        "then judge the coil by its shelf life.",
        time_to_respond="Before its pressing; without a planned one, within a day.",
        priority=Priority.LOW,
        cautions=(ESTIMATE_CAUTION,),
    ),
    AlarmKind.SENSOR_SILENT: Rationalisation(
        title="Sensor is silent",
        cause="No reading has come from this sensor: battery, cable, gateway or its feed.",
        consequence="Its location rests on the other sensors there, or on estimated temperatures.",
        action="Look at the sensor and the feed that carries it; replace it or take it out of the settings.",
        time_to_respond="Within a day.",
        priority=Priority.LOW,
    ),
    AlarmKind.SENSOR_SUSPECT: Rationalisation(
        title="Sensor is not believed",
        cause="Its readings jump, stand still, lie outside what air can be, or disagree with its neighbours.",
        consequence="The marked readings are left out, and the location rests on the others.",
        action="Compare it with a hand thermometer at the same place; move, replace or recalibrate it.",
        time_to_respond="Within a day.",
        priority=Priority.LOW,
    ),
    AlarmKind.LOCATION_UNCOVERED: Rationalisation(
        title="No temperature at a location with coils",
        cause="Every sensor of the location is silent, or it has none.",
        consequence="All coils there age on estimated temperatures; a hot spell would be missed.",
        action="Bring one sensor back, or put a spare one there and name it in the settings.",
        time_to_respond="Within the shift.",
        priority=Priority.MEDIUM,
    ),
    AlarmKind.FEED_STALE: Rationalisation(
        title="Feed brings nothing new or cannot be read",
        cause="The program that writes it has stopped, the share is not mounted, or the file is damaged.",
        consequence="Coils, moves, pressings or temperatures are those of the last good reading.",
        action="Ask the owner of the feed; check path and rights. The file is left alone and tried again.",
        time_to_respond="Within the shift.",
        priority=Priority.MEDIUM,
    ),
    AlarmKind.REJECTS_HIGH: Rationalisation(
        title="Many rows of a feed are rejected",
        cause="The source changed its columns, units or times, or holds wrong values.",
        consequence="The coils or readings in those rows are missing from every assessment.",
        action="List them with `agewatch rejects`, mend the source or the column map, and submit them again.",
        time_to_respond="Within a day.",
        priority=Priority.LOW,
    ),
    AlarmKind.DELIVERY_FAILING: Rationalisation(
        title="Messages do not reach a receiver",
        cause="The receiver is down, refuses the messages, or its certificate or address has changed.",
        consequence="Logistics does not learn which coils to pull; messages wait here, none is lost.",
        action="Hand the pull list over by telephone or on paper, and ask plant IT to mend the connection.",
        time_to_respond="At once while pulls are waiting.",
        priority=Priority.HIGH,
    ),
    AlarmKind.CLOCK_STEP: Rationalisation(
        title="The computer's clock was moved",
        cause="The clock was set by hand, or time service came back after a long break.",
        consequence="Times since the step may be wrong; no coil is made younger by it.",
        action="Have plant IT check the time service, then compare the board's clock with a watch.",
        time_to_respond="Within the shift.",
        priority=Priority.MEDIUM,
    ),
    AlarmKind.STORE_TROUBLE: Rationalisation(
        title="The store cannot be written or is damaged",
        cause="The disk is full or failing, or another program holds the file.",
        consequence="Nothing new is kept and no new alarm can be raised: what the board shows grows old.",
        action="Call plant IT: free space, check the disk, restore the last backup if need be. Until then go "
        "by shelf life.",
        time_to_respond="At once.",
        priority=Priority.HIGH,
    ),
}
