"""What a program writes in any dialect is what is read; what nobody can read is kept, and nothing is lost."""

from __future__ import annotations

import csv
import io
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

from hypothesis import given
from hypothesis import strategies as st

from agewatch.errors import FeedError
from agewatch.intake import Parsed
from agewatch.plant.tables import TABLES, Column, ColumnKind, Row, Table, Value
from tests.intake.samples import NOW_S, parse

PRAGUE = ZoneInfo("Europe/Prague")
NAMES = st.text(st.characters(exclude_categories=["C", "Z"]), min_size=1, max_size=12)
WINTER = st.integers(0, 80 * 86_400).map(
    lambda after_s: datetime(2026, 1, 1, tzinfo=UTC).timestamp() + after_s
)
"""Past times at which the clocks of Prague do not change."""


def values(column: Column) -> st.SearchStrategy[Value]:
    """What a column may hold."""
    given: st.SearchStrategy[Value]
    if column.choices:
        given = st.sampled_from(column.choices)
    elif column.kind is ColumnKind.TEXT:
        given = NAMES
    elif column.kind is ColumnKind.TIME:
        given = WINTER.map(float)
    elif column.kind is ColumnKind.FLAG:
        given = st.booleans()
    else:
        lowest = column.low if column.low is not None else column.above
        given = st.floats(lowest, column.high, exclude_min=column.low is None)
    return given if column.required else given | st.none()


def written(value: Value, column: Column, decimal: str, time_format: str) -> str:
    if value is None:
        return ""
    if column.kind is ColumnKind.TIME:
        assert isinstance(value, float)
        at = datetime.fromtimestamp(value, PRAGUE)
        return at.strftime(time_format) if time_format else at.isoformat()
    if isinstance(value, bool):
        return "yes" if value else "no"
    return repr(value).replace(".", decimal) if isinstance(value, float) else value


def makes_sense(table: Table, row: Row) -> bool:
    if table.name != "coils":
        return True
    rp02_mpa, rm_mpa = row[17:19]
    return rp02_mpa is None or rm_mpa is None or rm_mpa > rp02_mpa  # type: ignore[operator]


@st.composite
def tables(draw: st.DrawFn) -> tuple[Table, list[Row]]:
    table = draw(st.sampled_from(list(TABLES.values())))
    rows = st.tuples(*map(values, table.columns)).filter(lambda row: makes_sense(table, row))
    return table, draw(st.lists(rows, max_size=6, unique_by=lambda row: row[0]))


@given(
    tables(),
    st.sampled_from([",", ";", "\t"]),
    st.sampled_from([".", ","]),
    st.sampled_from(["\n", "\r\n"]),
    st.sampled_from([csv.QUOTE_MINIMAL, csv.QUOTE_ALL]),
    st.sampled_from(["", "%Y-%m-%d %H:%M:%S", "%d.%m.%Y %H:%M:%S"]),
    st.booleans(),
    st.randoms(use_true_random=False),
)
def test_what_is_written_is_read(
    told: tuple[Table, list[Row]], separator: str, decimal: str, end: str, quoting: int, time_format: str,
    mark: bool, random: object,
) -> None:  # fmt: skip
    """In every separator, decimal mark, line end, quoting and time format, whatever the order of the columns."""
    table, rows = told
    order = list(range(len(table.columns)))
    random.shuffle(order)  # type: ignore[attr-defined]
    sheet = io.StringIO(newline="")
    writer = csv.writer(sheet, delimiter=separator, lineterminator=end, quoting=quoting)  # type: ignore[arg-type]
    writer.writerow([table.columns[place].name for place in order])
    for row in rows:
        cells = [
            written(value, column, decimal, time_format)
            for value, column in zip(row, table.columns, strict=True)
        ]
        writer.writerow([cells[place] for place in order])
    found = parse(
        "\ufeff" * mark + sheet.getvalue(), table.name, decimal=decimal, timezone="Europe/Prague",
        time_format=time_format if "." in time_format else "",
    )  # fmt: skip
    assert found.rejects == []
    assert found.rows == rows


def accounted_for(found: Parsed, table: str) -> bool:
    if table == "temperatures":
        return found.records >= len(found.rejects) + found.blank
    return found.records == len(found.rows) + len(found.rejects) + found.blank + found.repeats


@given(st.sampled_from(list(TABLES)), st.data())
def test_any_text_in_any_cell_is_accounted_for(table: str, data: st.DataObject) -> None:
    """Every record is a row, a reject, blank or a repetition, and every reject holds its lines as they stood."""
    names = list(TABLES[table].column_names)
    cells = st.text(max_size=8) | st.sampled_from(
        ["A", "1", "2026-06-01T06:00:00Z", '"', "\n", "\r", "\0", ""]
    )
    records = data.draw(st.lists(st.lists(cells, min_size=len(names) - 1, max_size=len(names)), max_size=5))
    sheet = io.StringIO(newline="")
    csv.writer(sheet, lineterminator="\n").writerows([names, *records])
    text = sheet.getvalue()
    found = parse(text, table)
    assert accounted_for(found, table)
    for reject in found.rejects:
        assert reject.raw in text
        assert reject.reason


@given(st.text(), st.booleans())
def test_any_text_at_all_is_read_or_refused(text: str, below_a_header: bool) -> None:
    """No content of a file raises anything but FeedError; each of its lines is in some record."""
    try:
        found = parse("coil_id,at,location\n" * below_a_header + text)
    except FeedError:
        return
    assert accounted_for(found, "moves")


def test_the_same_text_gives_the_same_rows() -> None:
    """Reading has no memory."""
    day = datetime.fromtimestamp(NOW_S, UTC) - timedelta(days=1)
    text = f"coil_id,at,location\nA,{day.isoformat()},BAY\nB,x,BAY\n"
    assert parse(text) == parse(text)
