"""Numbers, names, choices and flags as plants write them."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.intake import cells as intake_cells
from agewatch.intake.cells import Fault, flag, text
from agewatch.intake.numbers import number
from agewatch.plant.tables import COILS, Column, ColumnKind
from tests.intake.samples import COILS_HEAD, parse

FREE = Column("value", ColumnKind.NUMBER)
POINT, COMMA = number(FREE, "."), number(FREE, ",")
ROW = "A,DC04,2026-06-01T06:00:00Z,BAY"


@pytest.mark.parametrize(
    ("cell", "value"),
    [
        ("12.5", 12.5), ("-12.5", -12.5), ("+12.5", 12.5), (".5", 0.5), ("5.", 5.0), ("007", 7.0),
        ("1e-3", 0.001), ("1.5E+2", 150.0), ("0.227-", -0.227), ("\u221212.5", -12.5),
        ("69 557", 69557.0), ("69\u00a0557.5", 69557.5), ("1'234'567", 1234567.0), ("1,234,567", 1234567.0),
        ("1,234.5", 1234.5),
    ],
)  # fmt: skip
def test_a_number_with_a_decimal_point(cell: str, value: float) -> None:
    """Signs before or behind, thousands in groups; the same with a decimal comma when all marks change places."""
    assert POINT(cell) == value
    assert COMMA(cell.translate(str.maketrans(".,", ",."))) == value


@pytest.mark.parametrize(
    "cell",
    [
        "x", "12,5", "1.2.3", "--1", "-1-", "1_000", "nan", "inf", "Infinity", "0x10", "1 2", "12 kg", "٣", "1e",
        "1e999", "1,23,456", "5 %", "1\x00", "+", ".", "1,5.0",
    ],
)  # fmt: skip
def test_what_is_no_number_is_told_with_what_is_allowed(cell: str) -> None:
    """Never guessed at: a comma where a point is declared is a fault."""
    fault = POINT(cell)
    assert isinstance(fault, Fault)
    assert "allowed is a number" in fault.reason


@pytest.mark.parametrize(("read", "cell"), [(POINT, "1,234"), (COMMA, "1.234"), (POINT, "-12,500")])
def test_thousands_that_may_be_a_fraction_are_refused(read: object, cell: str) -> None:
    """1,234 is a thousand or one and a bit, as one knows or does not."""
    fault = read(cell)  # type: ignore[operator]
    assert isinstance(fault, Fault)
    assert "may mean thousands or a fraction" in fault.reason


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_finite_number_is_read_as_written(value: float) -> None:
    """To the last bit, with either mark."""
    assert POINT(repr(value)) == value
    assert COMMA(repr(value).replace(".", ",")) == value


@given(st.text(max_size=20))
def test_no_text_breaks_the_reading_of_a_number(cell: str) -> None:
    """It is a finite number or a fault."""
    for read in (POINT, COMMA):
        found = read(cell)
        assert isinstance(found, Fault) or (isinstance(found, float) and abs(found) < float("inf"))


@pytest.mark.parametrize("column", [column for column in COILS.columns if column.kind is ColumnKind.NUMBER])
def test_every_bound_is_kept(column: Column) -> None:
    """A value on a closed bound goes in, one beyond any bound does not, and the reason names the bound."""
    read = number(column, ".")
    assert column.high is not None
    assert read(repr(column.high)) == column.high
    lowest = column.low if column.low is not None else column.above
    assert lowest is not None
    assert isinstance(read(repr(lowest)), Fault) == (column.low is None)
    for beyond in (repr(column.high * 1.001), repr(lowest - 0.001)):
        fault = read(beyond)
        assert isinstance(fault, Fault)
        assert (
            f"out of bounds; allowed is a number {'from' if column.above is None else 'above'}"
            in fault.reason
        )


@pytest.mark.parametrize(
    ("head", "cells", "words"),
    [
        ("mass_kg", "-12000", "-12000' is out of bounds; allowed is a number above 0 to 100000"),
        ("mass_kg", "0", "out of bounds"),
        ("mass_kg", "12t", "is no number"),
        ("status", "lost", "'lost' is not known; allowed are stored, pressed, shipped, scrapped"),
        ("wrapped", "perhaps", "is no flag; allowed are true"),
        ("located_since", "yesterday", "is no time"),
        ("part", "x" * 201, "has 201 characters; allowed are 200"),
        ("part", "hood\u202eouter", "control character U+202E"),
        ("part", "hood\x00outer", "control character U+0000"),
        ("rp02_mpa,rm_mpa", "300,300", "300 is not above rp02_mpa, 300"),
    ],
)
def test_a_bad_cell_keeps_the_row_out(head: str, cells: str, words: str) -> None:
    """The reject names the column, says what is wrong and what is allowed, and holds the row as it stood."""
    found = parse(f"{COILS_HEAD},{head}\n{ROW},{cells}\n", "coils")
    (reject,) = found.rejects
    assert found.rows == []
    assert reject.column == head.rpartition(",")[2]
    assert words in reject.reason
    assert (reject.line, reject.raw, reject.header) == (2, f"{ROW},{cells}", f"{COILS_HEAD},{head}")


def test_a_reject_names_every_fault_of_its_row() -> None:
    """So that it is mended once; the column is the source's own name of the first."""
    keys = {"columns": {"mass_kg": "WEIGHT", "grade": "STEEL"}}
    found = parse("coil_id,STEEL,temper_rolled_at,location,WEIGHT\nA,,never,BAY,-1\n", "coils", **keys)
    (reject,) = found.rejects
    assert reject.column == "STEEL"
    assert reject.reason.startswith("is empty; needed is a text; also temper_rolled_at: 'never' is no time")
    assert "; also WEIGHT: '-1' is out of bounds" in reject.reason


@pytest.mark.parametrize(
    ("cell", "value"),
    [
        ("true", True), ("TRUE", True), ("Yes", True), ("y", True), ("1", True), ("on", True),
        ("false", False), ("False", False), ("NO", False), ("n", False), ("0", False), ("off", False),
    ],
)  # fmt: skip
def test_a_flag_in_any_words(cell: str, value: bool) -> None:
    """As exports write it."""
    assert flag(cell) is value


def test_a_choice_in_any_case_of_letters() -> None:
    """It is kept as the table spells it."""
    assert text(Column("status", ColumnKind.TEXT, choices=("stored", "pressed")))("Stored") == "stored"


def test_white_space_around_names_is_nothing() -> None:
    """Blanks, tabs, line ends and hard blanks; inside a name a blank stays."""
    found = parse('coil_id,at,location\n" A 1\t","2026-06-01T06:00:00Z ","\u00a0BAY\n"\n')
    assert found.rows[0][::2] == ("A 1", "BAY")


def test_an_empty_cell_is_not_given() -> None:
    """None, whatever stands for empty in the feed; a column that is not there is None as well."""
    found = parse(f"{COILS_HEAD},mass_kg,part,wrapped\n{ROW},NULL, ,\n", "coils", empty=["NULL"])
    assert found.rows[0][4:] == (None,) * 22


def test_a_long_column_of_names_that_are_all_different(monkeypatch: pytest.MonkeyPatch) -> None:
    """What is remembered of it stays bounded, and forgetting changes nothing."""
    monkeypatch.setattr(intake_cells, "_REMEMBERED", 10)
    names = [f"C{number}" for number in range(100)]
    found = parse("coil_id,at,location\n" + "".join(f"{name},2026-06-01T06:00:00Z,BAY\n" for name in names))
    assert [row[0] for row in found.rows] == names
