"""Times as plants write them, against the time zone database of the standard library."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.intake import times
from agewatch.intake.cells import Fault
from agewatch.intake.times import Moments
from tests.intake.samples import NOW_S, parse, seconds

UTC_TIMES = Moments("UTC", "refuse", "")
SIX_S = seconds("2026-06-01T06:00:00+00:00")

ZONES = [
    "Europe/Prague",
    "America/St_Johns",
    "Australia/Lord_Howe",
    "America/Santiago",
    "Africa/Cairo",
    "UTC",
]
"""Among them changes by half an hour, changes at midnight, and changes one minute after it."""


@pytest.mark.parametrize(
    "text",
    [
        "2026-06-01T06:00:00Z",
        "2026-06-01t06:00:00z",
        "2026-06-01 06:00Z",
        "2026-06-01T06:00:00.000Z",
        "2026-06-01T06:00:00,0Z",
        "2026-06-01T08:00:00+02:00",
        "2026-06-01 08:00:00 +0200",
        "2026-06-01T08:00+02",
        "2026-05-31T22:30:00-07:30",
        "2026-06-01T06:00:00-00:00",
        "2026-06-01T06:00:00",
        "2026-06-01 06:00",
        "2026-05-31T24:00-06:00",
        "2026-06-01T05:59:60Z",
    ],
)
def test_every_way_to_write_a_time_is_the_same_time(text: str) -> None:
    """RFC 3339 and its relatives in ISO 8601; the end of a day and a leap second run into what follows."""
    assert UTC_TIMES.moment(text) == SIX_S


@pytest.mark.parametrize(
    "text",
    [
        "2026-06-01",
        "06:00:00",
        "2026-02-30T06:00:00Z",
        "2026-06-01T25:00:00Z",
        "2026-06-01T24:01:00Z",
        "2026-06-01T06:60:00Z",
        "2026-06-01T06:00:61Z",
        "2026-06-01T06:00:00+24:00",
        "2026-06-01T06:00:00+02:60",
        "2026-06-01X06:00:00Z",
        "01.06.2026 06:00",
        "20260601T060000Z",
        "٢026-06-01T06:00:00Z",
        "2026-06-01T06:00:00Z extra",
        "1780293600",
        "now",
    ],
)
def test_what_is_no_time_is_told_with_what_is_allowed(text: str) -> None:
    """A date alone is none: it would be read as the first moment of the day."""
    fault = UTC_TIMES.moment(text)
    assert isinstance(fault, Fault)
    assert "allowed is RFC 3339, for example" in fault.reason


@given(
    zone=st.sampled_from(ZONES),
    at=st.datetimes(datetime(1985, 1, 1), datetime(2035, 1, 1)),
    local_times=st.sampled_from(["refuse", "earlier", "later"]),
)
def test_a_local_time_is_found_again_in_its_zone(zone: str, at: datetime, local_times: str) -> None:
    """Written by the zone's clocks and read back, a moment is itself; one that the clocks show twice is refused, or
    is the earlier or the later as declared."""
    place = ZoneInfo(zone)
    wall = at.replace(tzinfo=UTC, microsecond=0).astimezone(place).replace(tzinfo=None)
    moments = sorted(wall.replace(tzinfo=place, fold=fold).timestamp() for fold in (0, 1))
    found = Moments(zone, local_times, "").moment(wall.isoformat())  # type: ignore[arg-type]
    if moments[0] == moments[1]:
        assert found == moments[0]
    elif local_times == "refuse":
        assert isinstance(found, Fault)
        assert f"occurs twice in {zone}" in found.reason
    else:
        assert found == moments[local_times == "later"]


CHANGES = [
    ("Europe/Prague", datetime(2026, 3, 29, 2), datetime(2026, 10, 25, 2)),
    ("America/St_Johns", datetime(2009, 3, 8, 0, 1), datetime(2009, 10, 31, 23, 1)),
    ("Australia/Lord_Howe", datetime(2026, 10, 4, 2), datetime(2026, 4, 5, 1, 30)),
    ("America/Santiago", datetime(2026, 9, 6, 0), datetime(2026, 4, 4, 23)),
]
"""Zone, first local time that never occurs, first that occurs twice: from the time zone database, checked below."""


@pytest.mark.parametrize(("zone", "missing", "double"), CHANGES)
def test_local_times_at_a_change_of_the_clocks(zone: str, missing: datetime, double: datetime) -> None:
    """The minute before is placed, the first minute within is refused, with the way out."""
    place, moments = ZoneInfo(zone), Moments(zone, "refuse", "")
    for first, words in ((missing, "never occurs"), (double, "occurs twice")):
        before = first - timedelta(minutes=1)
        assert moments.moment(before.isoformat()) == before.replace(tzinfo=place).timestamp()
        fault = moments.moment(first.isoformat())
        assert isinstance(fault, Fault)
        assert words in fault.reason
        assert 'local_times = "earlier"' in fault.reason


@pytest.mark.parametrize(("zone", "missing", "double"), CHANGES)
def test_a_declared_choice_settles_a_change_of_the_clocks(
    zone: str, missing: datetime, double: datetime
) -> None:
    """Earlier and later are the readings by the offset after and before the change, in the order of time."""
    for wall in (missing, double):
        both = {wall.replace(tzinfo=ZoneInfo(zone), fold=fold).timestamp() for fold in (0, 1)}
        assert Moments(zone, "earlier", "").moment(wall.isoformat()) == min(both)
        assert Moments(zone, "later", "").moment(wall.isoformat()) == max(both)


@given(
    zone=st.sampled_from(ZONES),
    start=st.datetimes(datetime(1985, 1, 1), datetime(2035, 1, 1)),
    steps=st.lists(st.integers(0, 3000), min_size=1, max_size=40),
    offset=st.sampled_from(["", "Z", "+02:00"]),
)
def test_a_column_reads_as_its_cells_do(zone: str, start: datetime, steps: list[int], offset: str) -> None:
    """The quick way for whole columns gives what the careful way gives for each cell, or leaves it to that."""
    cells = [f"{(start + timedelta(minutes=minutes)):%Y-%m-%dT%H:%M:%S}{offset}" for minutes in steps]
    moments = Moments(zone, "refuse", "")
    quick = moments.ordinary([*cells, ""])
    careful = [moments.moment(cell) for cell in cells]
    if quick is None:
        assert any(isinstance(moment, Fault) or zone != "UTC" for moment in careful)
    else:
        assert quick == [*careful, None]


def test_times_with_and_without_offset_in_one_column() -> None:
    """Each by itself: none borrows the other's zone."""
    text = "coil_id,press_at\nA,2026-06-01T06:00:00Z\nB,2026-06-01T08:00:00\nC,2026-06-01T09:00:00+03:00\n"
    found = parse(text, "presses", timezone="Europe/Prague")
    assert [row[1] for row in found.rows] == [SIX_S, SIX_S, SIX_S]


@pytest.mark.parametrize(
    ("pattern", "cell"),
    [
        ("%d.%m.%Y %H:%M:%S", "01.06.2026 08:00:00"),
        ("%d.%m.%Y %H:%M", "1.6.2026 8:00"),
        ("%m/%d/%Y %H:%M", "06/01/2026 08:00"),
        ("%Y/%m/%d %H:%M", "2026/06/01 08:00"),
        ("%Y%m%d%H%M%S", "20260601080000"),
        ("%d.%m.%y %H:%M", "01.06.26 08:00"),
        ("%m/%d/%Y %I:%M %p", "06/01/2026 08:00 AM"),
        ("%d-%b-%Y %H:%M", "01-Jun-2026 08:00"),
        ("%d.%m.%Y %H:%M %z", "01.06.2026 06:00 +0000"),
        ("%H:%M %d.%m.%Y", "08:00 01.06.2026"),
    ],
)
def test_a_declared_pattern_is_read(pattern: str, cell: str) -> None:
    """As strptime reads it, in the feed's zone."""
    assert Moments("Europe/Prague", "refuse", pattern).moment(cell) == SIX_S


@pytest.mark.parametrize("cell", ["31.02.2026 08:00", "2026-06-01T06:00:00Z", "", "99.99.9999 99:99"])
def test_a_time_off_its_pattern_is_told(cell: str) -> None:
    """With the pattern that the feed declares."""
    fault = Moments("UTC", "refuse", "%d.%m.%Y %H:%M").moment(cell)
    assert isinstance(fault, Fault)
    assert "allowed is the feed's time_format, %d.%m.%Y %H:%M" in fault.reason


def test_the_clocks_of_a_pattern_change_as_well() -> None:
    """A local time that occurs twice is refused whatever its pattern."""
    fault = Moments("Europe/Prague", "refuse", "%d.%m.%Y %H:%M").moment("25.10.2026 02:30")
    assert isinstance(fault, Fault)
    assert "occurs twice" in fault.reason


@pytest.mark.parametrize(
    ("table", "text", "column"),
    [
        ("coils", "coil_id,grade,temper_rolled_at,location\nA,DC04,{},BAY\n", "temper_rolled_at"),
        ("moves", "coil_id,at,location\nA,{},BAY\n", "at"),
        ("temperatures", "at,sensor,celsius\n{},T1,20\n", "at"),
        ("temperatures", "at,T1\n{},20\n", "at"),
        ("lab", "coil_id,tested_at,ype_pct\nA,{},0.1\n", "tested_at"),
    ],
)
def test_what_has_happened_does_not_lie_in_the_future(table: str, text: str, column: str) -> None:
    """Five minutes are left to clocks that are ahead; a row later than that is kept as a reject."""
    soon, late = (
        datetime.fromtimestamp(NOW_S + ahead_s, UTC).isoformat().replace("+00:00", "Z")
        for ahead_s in (300, 301)
    )
    assert len(parse(text.format(soon), table).rows) == 1
    (reject,) = parse(text.format(late), table).rejects
    assert reject.column == column
    assert "lies in the future; allowed is up to now, 2026-07-01T00:00:00.000Z" in reject.reason


@pytest.mark.parametrize(
    ("table", "text"),
    [
        ("presses", "coil_id,press_at\nA,2026-12-01T06:00:00Z\n"),
        ("outlook", "at,location,celsius\n2026-12-01T06:00:00Z,BAY,3\n"),
    ],
)
def test_plans_and_outlooks_lie_in_the_future(table: str, text: str) -> None:
    """They are there for that."""
    assert len(parse(text, table).rows) == 1


@pytest.mark.parametrize("at", ["0001-01-01T00:00:00Z", "1900-01-01T00:00:00Z", "9999-12-31T23:59:59Z"])
def test_times_that_stand_for_none_are_refused(at: str) -> None:
    """Left in, they would age a coil by a thousand years; a feed may declare such a text as empty."""
    (reject,) = parse(f"coil_id,press_at\nA,{at}\n", "presses").rejects
    assert "allowed are the years 1980 to 2099" in reject.reason
    head = "coil_id,grade,temper_rolled_at,location,press_at\n"
    found = parse(f"{head}A,DC04,2026-06-01T06:00:00Z,BAY,{at}\n", "coils", empty=[at])
    assert found.rows[0][9] is None


def test_the_end_of_the_calendar_is_no_trouble() -> None:
    """What no zone can place is out of bounds like any other such time."""
    for at in ("9999-12-31T24:00", "0001-01-01T00:00"):
        (reject,) = parse(f"coil_id,press_at\nA,{at}\n", "presses", timezone="Europe/Prague").rejects
        assert "allowed are the years 1980 to 2099" in reject.reason


def test_a_long_column_of_times_that_are_all_different(monkeypatch: pytest.MonkeyPatch) -> None:
    """What is remembered of it stays bounded, and forgetting changes nothing."""
    monkeypatch.setattr(times, "_REMEMBERED", 10)
    start = datetime(2026, 1, 1, tzinfo=UTC)
    told = [start + timedelta(days=day, seconds=61 * day) for day in range(100)]
    text = "coil_id,press_at\n" + "".join(f"A,{at.isoformat()}\n" for at in told)
    assert [row[1] for row in parse(text, "presses").rows] == [at.timestamp() for at in told]
