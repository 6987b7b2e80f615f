"""CSV text in the dialects that plants write, into rows and rejects."""

from __future__ import annotations

import csv
import io
from datetime import UTC, datetime

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from agewatch.errors import FeedError
from agewatch.intake import Parsed, parse_rows
from agewatch.plant.settings import Feed

NOW_S = datetime(2026, 7, 1, tzinfo=UTC).timestamp()


def seconds(text: str) -> float:
    return datetime.fromisoformat(text).timestamp()


def parse(text: str, table: str = "moves", **keys: object) -> Parsed:
    return parse_rows(
        Feed.model_validate({"table": table, "path": "x.csv"} | keys), text, "x.csv", now_s=NOW_S
    )


def test_plain_rows_go_in() -> None:
    """A row is a tuple in the table's order, times in seconds UTC."""
    found = parse("coil_id,at,location\nA1,2026-06-01T06:00:00Z,BAY\n")
    assert found.rows == [("A1", seconds("2026-06-01T06:00:00+00:00"), "BAY")]
    assert not found.rejects


@pytest.mark.parametrize(
    ("text", "keys"),
    [
        ("at;sensor;celsius\n2026-06-01T06:00:00Z;T1;21,5\n", {"decimal": ","}),
        ("\ufeffat,sensor,celsius\r\n2026-06-01T06:00:00Z,T1,21.5\r\n", {}),
        ("at\tsensor\tcelsius\n2026-06-01T06:00:00Z\tT1\t21.5\n", {}),
        ('"at","sensor","celsius"\n"2026-06-01T06:00:00Z"," T1 ","21.5"\n', {}),
        ("WHEN,WHO,WHAT\n2026-06-01T08:00:00+02:00,T1,21.5\n",
         {"columns": {"at": "WHEN", "sensor": "WHO", "celsius": "WHAT"}}),
        ("at,sensor,celsius\n2026-06-01 08:00:00,T1,21.5\n", {"timezone": "Europe/Prague"}),
        ("at,sensor,celsius\n01.06.2026 08:00,T1,21.5\n",
         {"timezone": "Europe/Prague", "time_format": "%d.%m.%Y %H:%M"}),
        ("at,T1\n2026-06-01T06:00:00Z,21.5\n", {}),
        ("celsius,at,sensor,remark\n21.5,2026-06-01T06:00:00Z,T1,fine\n", {}),
    ],
)  # fmt: skip
def test_every_dialect_reads_alike(text: str, keys: dict) -> None:
    """Separator, decimal comma, byte order mark, quotes, own names, zones, formats, wide tables: the same reading."""
    found = parse(text, "temperatures", **keys)
    assert found.rows == [(seconds("2026-06-01T06:00:00+00:00"), "T1", 21.5)]
    assert not found.rejects


def test_a_wide_table_gives_a_reading_a_cell() -> None:
    """An empty cell is no reading, a bad one is kept without its neighbours."""
    found = parse("at,T1,T2,T3\n2026-06-01T06:00:00Z,20,,x\n", "temperatures")
    assert found.rows == [(seconds("2026-06-01T06:00:00+00:00"), "T1", 20.0)]
    assert [(one.line, one.column) for one in found.rejects] == [(2, "T3")]


def test_hours_of_the_clock_change_are_refused_unless_declared() -> None:
    """02:30 on 25 October 2026 occurs twice in Prague, on 29 March it does not occur; the source may say which.

    The oracle is the time zone database.
    """
    text = "coil_id,press_at\nA,2026-10-25 02:30:00\nB,2026-03-29 02:30:00\n"
    refused = parse(text, "presses", timezone="Europe/Prague")
    assert not refused.rows
    assert [one.line for one in refused.rejects] == [2, 3]
    twice = {
        which: parse(text, "presses", timezone="Europe/Prague", local_times=which).rows[0][1]
        for which in ("earlier", "later")
    }
    assert twice == {
        "earlier": seconds("2026-10-25T02:30:00+02:00"),
        "later": seconds("2026-10-25T02:30:00+01:00"),
    }


@pytest.mark.parametrize(
    ("row", "column"),
    [
        (",2026-06-01T06:00:00Z,BAY", "coil_id"),
        ("A,no time,BAY", "at"),
        ("A,2027-06-01T06:00:00Z,BAY", "at"),
        ("A,2026-06-01T06:00:00Z,", "location"),
        ("A\x1b[31m,2026-06-01T06:00:00Z,BAY", "coil_id"),
    ],
)
def test_a_bad_row_is_kept_with_its_line_and_its_text(row: str, column: str) -> None:
    """Its neighbours go in; the reject names column and reason, and holds the text as it stood."""
    found = parse(f"coil_id,at,location\nG1,2026-06-01T06:00:00Z,BAY\n{row}\nG2,2026-06-01T06:00:00Z,BAY\n")
    assert [one[0] for one in found.rows] == ["G1", "G2"]
    (reject,) = found.rejects
    assert (reject.line, reject.column, reject.raw) == (3, column, row)
    assert any(word in reject.reason for word in ("allowed", "needed", "take it out"))


def test_a_coil_that_stands_twice() -> None:
    """Alike it is a repetition; otherwise the first stands and the other is kept."""
    head = "coil_id,grade,temper_rolled_at,location\n"
    row = "A,DC04,2026-06-01T06:00:00Z,BAY\n"
    alike = parse(head + row + row, "coils")
    assert (len(alike.rows), alike.repeats, len(alike.rejects)) == (1, 1, 0)
    other = parse(head + row + row.replace("BAY", "YARD"), "coils")
    assert (len(other.rows), len(other.rejects)) == (1, 1)


@pytest.mark.parametrize("text", ["", "coil_id,at\nA,2026-06-01T06:00:00Z\n", "at,at,coil_id,location\n"])
def test_a_source_without_its_columns_is_not_read(text: str) -> None:
    """No header, a missing column or one that stands twice is trouble of the whole source."""
    with pytest.raises(FeedError):
        parse(text)


def test_a_header_alone_is_an_empty_table() -> None:
    """Nothing to take in, nothing wrong."""
    found = parse("coil_id,at,location\n")
    assert (found.rows, found.rejects) == ([], [])


@given(st.lists(st.lists(st.text(max_size=12), min_size=1, max_size=5), max_size=8))
@settings(max_examples=200)
def test_whatever_stands_in_the_cells_is_accounted_for(cells: list[list[str]]) -> None:
    """Any text is read without an error, and each record is a row, a reject, blank or a repetition."""
    text = io.StringIO(newline="")
    csv.writer(text, lineterminator="\n").writerows([["coil_id", "at", "location"], *cells])
    try:
        found = parse(text.getvalue())
    except FeedError:
        return
    assert len(found.rows) + len(found.rejects) + found.blank + found.repeats == found.records
