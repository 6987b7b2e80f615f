"""From lines to records: separators, quotes, headers, and what becomes of broken lines."""

from __future__ import annotations

import pytest

from agewatch.errors import FeedError
from tests.intake.samples import COILS_HEAD, parse

HEAD = "coil_id,at,location\n"
AT = "2026-06-01T06:00:00Z"


def lines_of(text: str, table: str = "moves", **keys: object) -> tuple[list[object], list[tuple[int, str]]]:
    """First cells of the rows, and line and raw text of the rejects."""
    found = parse(text, table, **keys)
    return [row[0] for row in found.rows], [(reject.line, reject.raw) for reject in found.rejects]


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_separators_and_line_ends_are_found_out(separator: str, end: str) -> None:
    """From the header, whatever stands in the cells."""
    text = f"{HEAD}A,{AT},BAY 1\n".replace(",", separator).replace("\n", end)
    assert lines_of(text) == (["A"], [])


def test_the_separator_is_the_one_that_gives_the_names_needed() -> None:
    """Not the one that occurs most often."""
    text = f"coil_id;at;location;remark, further, and more, all in words\nA;{AT};BAY;a,b,c,d\n"
    assert lines_of(text) == (["A"], [])


def test_a_declared_separator_is_taken() -> None:
    """By the feed, or by the file's own first line as spreadsheets write it."""
    assert lines_of(f"coil_id;at;location;a,b\nA;{AT};BAY;\n", separator=";") == (["A"], [])
    assert lines_of(f"sep=|\ncoil_id|at|location\nA|{AT}|BAY\nB|x|BAY\n") == (["A"], [(4, "B|x|BAY")])
    with pytest.raises(FeedError, match="its header lacks"):
        parse(f"coil_id;at;location\nA;{AT};BAY\n", separator=",")


def test_a_reject_can_be_read_again_by_its_header() -> None:
    """Header and raw text alone give the row, once it is mended."""
    (reject,) = parse("sep=|\nLOC|coil_id|at\nBAY|B|x\n", columns={"location": "LOC"}).rejects
    again = parse(f"{reject.header}\n{reject.raw.replace('x', AT)}\n", columns={"location": "LOC"})
    assert again.rows[0][::2] == ("B", "BAY")


def test_quoted_cells_may_hold_anything() -> None:
    """Separators, quotes and line ends; the line of a record is that of its start."""
    text = (
        f'coil_id,remark,at,location\nA,"two\nlines, and ""quotes""",{AT},BAY\nB,,x,BAY\n"C","a\nb",x,BAY\n'
    )
    rows, rejects = lines_of(text)
    assert rows == ["A"]
    assert rejects == [(4, "B,,x,BAY"), (5, '"C","a\nb",x,BAY')]


def test_a_header_may_break_its_lines() -> None:
    """As spreadsheets do in narrow columns."""
    text = f'"coil\nnumber",at,location\nA,{AT},BAY\n,{AT},BAY\n'
    found = parse(text, columns={"coil_id": "coil\nnumber"})
    assert [row[0] for row in found.rows] == ["A"]
    assert (found.rejects[0].line, found.rejects[0].header) == (4, '"coil\nnumber",at,location')


@pytest.mark.parametrize(
    "stray",
    [f'B,"{AT},BAY', f'"B,{AT},BAY', f'B,{AT},"BAY', f'B,{AT},"BAY"X', f'"B"1,{AT},BAY', f'B,{AT},BAY,"'],
)
def test_a_stray_quote_swallows_no_neighbour(stray: str) -> None:
    """Its own line is kept as a reject; every other row goes in, also where a later quote would close it."""
    others = [f"C{number},{AT},BAY" for number in range(300)]
    for closing in (f'Z,"{AT}",BAY', f'"Z",{AT},BAY', f'Z,{AT},"BAY"', f'Z"",{AT},BAY'):
        rows, rejects = lines_of(HEAD + "\n".join([f"A,{AT},BAY", stray, *others, closing]) + "\n")
        assert rejects == [(3, stray)]
        assert len(rows) == 302


def test_two_stray_quotes_in_one_column_swallow_nothing_between() -> None:
    """Read as one record, the rows between would be gone in a remark that nobody reads."""
    text = f'coil_id,remark,at,location\nA,"one,{AT},BAY\nB,,{AT},BAY\nC,two",{AT},BAY\nD,,{AT},BAY\n'
    rows, rejects = lines_of(text)
    assert rows == ["B", "C", "D"]
    assert rejects == [(2, f'A,"one,{AT},BAY')]


def test_an_open_quote_at_the_end_of_a_file_is_a_reject() -> None:
    """When the last line has its end, nothing more is to come."""
    assert lines_of(f'{HEAD}A,{AT},BAY\nB,{AT},"BAY\n') == (["A"], [(3, f'B,{AT},"BAY')])


@pytest.mark.parametrize(
    ("row", "reason"),
    [
        (f"B,{AT}", "has 2 cells; allowed are 3, as in the header"),
        ("B", "has 1 cells; allowed are 3, as in the header"),
        (f"B,{AT},BAY,more", "has 4 cells; allowed are 3, as in the header"),
        (f"B,{AT},BAY\rC,{AT},BAY", "holds a line end inside a cell; allowed is one in quotes"),
        (f"B,{AT}," + "x" * 140_000, "holds a cell that is too long; allowed are 131072 characters"),
    ],
)
def test_a_broken_line_is_a_reject_as_a_whole(row: str, reason: str) -> None:
    """It names no column."""
    found = parse(f"{HEAD}A,{AT},BAY\n{row}\nZ,{AT},BAY\n")
    assert [one[0] for one in found.rows] == ["A", "Z"]
    (reject,) = found.rejects
    assert (reject.line, reject.column, reject.reason, reject.raw) == (3, "", reason, row)


def test_empty_cells_beyond_the_header_are_nothing() -> None:
    """Spreadsheets leave them behind; a header may end in them as well."""
    assert lines_of(f"{HEAD}A,{AT},BAY,,\n") == (["A"], [])
    assert lines_of(f"coil_id,at,location,,\nA,{AT},BAY,,\n") == (["A"], [])


def test_blank_lines_are_nothing() -> None:
    """Before the header, between rows and at the end, with separators or without."""
    found = parse(f"\n \n{HEAD}\nA,{AT},BAY\n,,\n  \n , ,\t\n,,,,,\nB,x,BAY\n\n")
    assert [row[0] for row in found.rows] == ["A"]
    assert found.rejects[0].line == 10
    assert (found.records, found.blank) == (8, 6)


@pytest.mark.parametrize("row", [f"A\0,{AT},BAY", f"A,{AT}\0,BAY", f"A,{AT},\0", "\0\0\0\0", f"\0A,{AT},BAY"])
def test_nul_bytes_spoil_their_row_alone(row: str) -> None:
    """As a file has them that a crash left behind."""
    rows, rejects = lines_of(f"{HEAD}{row}\nB,{AT},BAY\n")
    assert (rows, rejects) == (["B"], [(2, row)])


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("coil_id,At,location\n", 'its header lacks "at" (did you mean "At"?); it has coil_id, At, location'),
        ("coil_id\n", 'lacks "at", "location"'),
        ("x\n", 'lacks "coil_id", "at", "location"'),
        ('"coil_id,at,location\n', "lacks"),
        ("coil_id,at,location,at\n", "has the column at more than once"),
        ("\0\n", "lacks"),
    ],
)
def test_a_header_that_will_not_do_is_told(text: str, words: str) -> None:
    """The whole file waits: what its columns mean is not known."""
    with pytest.raises(FeedError) as told:
        parse(text)
    assert words in told.value.reason
    assert "\n" not in str(told.value)


def test_columns_that_are_not_read_may_stand_twice() -> None:
    """They are the plant's own."""
    assert lines_of(f"coil_id,at,location,note,note\nA,{AT},BAY,,\n") == (["A"], [])


def test_a_column_that_the_settings_name_must_be_there() -> None:
    """Even where the table could do without: the settings and the file contradict each other."""
    with pytest.raises(FeedError, match='lacks "WEIGHT"'):
        parse(f"{COILS_HEAD},MASS\nA,DC04,{AT},BAY,1\n", "coils", columns={"mass_kg": "WEIGHT"})


def test_a_name_that_the_settings_give_away_is_not_taken_for_its_column() -> None:
    """Canonical names count where the settings are silent, and only there."""
    text = f"coil_id,grade,steel,temper_rolled_at,location\nA,hood,DC04,{AT},BAY\n"
    found = parse(text, "coils", columns={"grade": "steel", "part": "grade"})
    assert (found.rows[0][1], found.rows[0][7]) == ("DC04", "hood")


def test_a_coil_that_stands_twice_names_the_first_line() -> None:
    """The first stands, whatever lies between; one that was rejected does not count as the first."""
    many = "".join(f"C{number},DC04,{AT},BAY\n" for number in range(200))
    text = f"{COILS_HEAD}\nA,DC04,never,BAY\nA,DC04,{AT},BAY\n{many}A,DC04,{AT},BAY\nA,DC05,{AT},BAY\n"
    found = parse(text, "coils")
    assert found.repeats == 1
    assert [(reject.line, reject.column) for reject in found.rejects] == [
        (2, "temper_rolled_at"),
        (205, "coil_id"),
    ]
    assert found.rejects[1].reason == "A stands in line 3 with other values; allowed is one row for each coil"


def test_a_wide_file_has_a_column_for_each_sensor() -> None:
    """Under its own name, or under the one that the settings give it; others may be left out."""
    text = f"Zeit;Halle 1;T2;Batterie;\n{AT};20,5;21,5;3,1;\n{AT.replace('T06', 'T07')};;22,5;3,0;\n"
    keys = {"columns": {"at": "Zeit", "T1": "Halle 1"}, "ignore": ["Batterie"], "decimal": ","}
    found = parse(text, "temperatures", **keys)
    assert sorted(row[1:] for row in found.rows) == [("T1", 20.5), ("T2", 21.5), ("T2", 22.5)]
    assert found.rejects == []


def test_a_wide_row_at_fault_keeps_its_good_readings() -> None:
    """One reject for the row, naming each bad cell; without a time nothing of it is known."""
    text = f"at,T1,T2,T3\n{AT},20,x,y\nnever,1,2,3\n"
    found = parse(text, "temperatures")
    assert [row[1:] for row in found.rows] == [("T1", 20.0)]
    assert [(reject.line, reject.column) for reject in found.rejects] == [(2, "T2"), (3, "at")]
    assert "; also T3: 'y' is no number" in found.rejects[0].reason
    assert found.rejects[0].raw == f"{AT},20,x,y"


@pytest.mark.parametrize(
    ("text", "keys", "words"),
    [
        ("at,sensor\n", {}, 'lacks "celsius"'),
        ("at,T1,celsius\n", {}, 'lacks "sensor"'),
        ("at\n", {}, "neither the columns sensor and celsius nor a column for each sensor"),
        ("at,T1,T1\n", {}, "has the column T1 more than once"),
        ("at,T1,H1\n", {"columns": {"T1": "H1"}}, "has the column T1 more than once"),
        ("at,T1\n", {"columns": {"T2": "H2"}}, 'lacks "H2"'),
    ],
)
def test_a_temperature_header_that_will_not_do_is_told(
    text: str, keys: dict[str, object], words: str
) -> None:
    """Neither long nor wide, or not for sure."""
    with pytest.raises(FeedError) as told:
        parse(text, "temperatures", **keys)
    assert words in told.value.reason
