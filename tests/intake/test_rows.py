"""CSV text in the dialects that plants write, into rows and rejects."""

from __future__ import annotations

import pytest

from tests.intake.samples import parse, seconds


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
