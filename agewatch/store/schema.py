"""Every table of the store. Times are whole milliseconds since 1970 in UTC (`_ms`).

Whoever changes a table adds a revision to agewatch/store/migrations: a test holds the two together.
"""

from __future__ import annotations

from sqlalchemy import (
    BigInteger,
    Boolean,
    Column,
    Connection,
    Double,
    ForeignKey,
    Index,
    Integer,
    LargeBinary,
    MetaData,
    String,
    Table,
    Text,
    UniqueConstraint,
    event,
)

metadata = MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "pk": "pk_%(table_name)s",
        "fk": "fk_%(table_name)s_%(column_0_N_name)s",
    }
)

coil = Table(
    "coil",
    metadata,
    Column("coil_id", String, primary_key=True),
    Column("grade", String, nullable=False),
    Column("temper_rolled_ms", BigInteger, nullable=False),
    Column("location", String, nullable=False),
    Column("located_since_ms", BigInteger),
    Column("heat_id", String),
    Column("parent_id", String),
    Column("part", String),
    Column("status", String, nullable=False),
    Column("press_ms", BigInteger),  # as the coils feed has it; press_plan, where it names the coil, rules
    Column("temper_elongation_pct", Double),
    Column("thickness_mm", Double),
    Column("width_mm", Double),
    Column("mass_kg", Double),
    Column("bore_mm", Double),
    Column("coil_temp_c", Double),
    Column("wrapped", Boolean),
    Column("rp02_mpa", Double),
    Column("rm_mpa", Double),
    Column("n_value", Double),
    Column("c_pct", Double),
    Column("n_pct", Double),
    Column("s_pct", Double),
    Column("ti_pct", Double),
    Column("nb_pct", Double),
    Column("al_pct", Double),
    Column("first_seen_ms", BigInteger, nullable=False),
    Column("last_seen_ms", BigInteger, nullable=False),  # a coil that leaves its feed stays; to the hour
    Column(
        "told_digest", LargeBinary, nullable=False
    ),  # of the feed's row as last told: an equal one tells nothing
    sqlite_with_rowid=False,  # read in the order of the key, which the clustered key gives for nothing
)

move = Table(
    "move",
    metadata,
    Column("coil_id", String, primary_key=True),  # may name a coil that no feed has shown yet
    Column("at_ms", BigInteger, primary_key=True),
    Column("location", String, nullable=False),
    Column("origin", String, nullable=False),  # "moves" (told) or "coils" (seen elsewhere in a snapshot)
    sqlite_with_rowid=False,
)

press_plan = Table(
    "press_plan",
    metadata,
    Column("coil_id", String, primary_key=True),
    Column("press_ms", BigInteger, nullable=False),
    Column("received_ms", BigInteger, nullable=False),
    sqlite_with_rowid=False,
)

sensor = Table(
    "sensor",
    metadata,
    Column("sensor_id", Integer, primary_key=True),
    Column("name", String, nullable=False, unique=True),
)

reading = Table(
    "reading",
    metadata,
    Column("sensor_id", Integer, ForeignKey("sensor.sensor_id"), primary_key=True),
    Column("at_ms", BigInteger, primary_key=True),
    Column("celsius", Double, nullable=False),
    sqlite_with_rowid=False,
)

outlook = Table(
    "outlook",
    metadata,
    Column("location", String, primary_key=True),
    Column("at_ms", BigInteger, primary_key=True),
    Column("celsius", Double, nullable=False),
    sqlite_with_rowid=False,
)

lab_test = Table(
    "lab_test",
    metadata,
    Column("lab_test_id", Integer, primary_key=True),
    Column("coil_id", String, nullable=False),
    Column("tested_ms", BigInteger, nullable=False),
    Column("ype_pct", Double, nullable=False),
    Column("rp02_mpa", Double),
    Column("aged_c", Double),
    Column("aged_h", Double),
    Column("direction", String),
    Index(None, "coil_id", "tested_ms"),
)

source = Table(
    "source",
    metadata,
    Column("feed", String, primary_key=True),
    Column("path", String, primary_key=True),
    Column("fingerprint", String, nullable=False),  # sha256 of the content last read
    Column("read_ms", BigInteger, nullable=False),
    Column("rows", Integer, nullable=False),
    Column("rejects", Integer, nullable=False),
)

reject = Table(
    "reject",
    metadata,
    Column("reject_id", Integer, primary_key=True),
    Column("digest", String, nullable=False, unique=True),  # of table, source, raw text and reason: told once
    Column("table", String, nullable=False),
    Column("feed", String, nullable=False),
    Column("source", String, nullable=False),
    Column("line", Integer, nullable=False),
    Column("column", String, nullable=False),
    Column("reason", Text, nullable=False),
    Column("raw", Text, nullable=False),
    Column("header", Text, nullable=False),  # the line that names the cells of raw
    Column("received_ms", BigInteger, nullable=False),
    Column("resubmitted_ms", BigInteger),  # set once the row, mended, has been taken in
)

assessment = Table(
    "assessment",
    metadata,
    Column("assessment_id", Integer, primary_key=True),
    Column("at_ms", BigInteger, nullable=False),
    Column("model", String, nullable=False),
    Column("settings_digest", String, nullable=False),
    Column("coils", Integer, nullable=False),
    Column("columns", LargeBinary, nullable=False),  # agewatch/store/columns.py packs and unpacks them
)

alarm = Table(
    "alarm",
    metadata,
    Column("kind", String, primary_key=True),
    Column("subject", String, primary_key=True),  # coil, sensor, location, feed or endpoint
    Column("location", String, nullable=False),  # "" where none applies
    Column("state", String, nullable=False),
    Column("priority", String, nullable=False),
    Column("active", Boolean, nullable=False),
    Column("active_since_ms", BigInteger),
    Column("inactive_since_ms", BigInteger),
    Column("raised_ms", BigInteger),
    Column("acknowledged_ms", BigInteger),
    Column("acknowledged_by", String),
    Column("detail", Text, nullable=False),  # JSON: the values that caused it
)

journal = Table(
    "journal",
    metadata,
    Column("seq", Integer, primary_key=True),
    Column("at_ms", BigInteger, nullable=False),
    Column("topic", String, nullable=False),  # "alarm", "coil", "feed", "message", "daemon"
    Column("kind", String, nullable=False),  # alarm kind, or what happened
    Column("subject", String, nullable=False),
    Column("actor", String, nullable=False),  # "agewatch" or "user:NAME"
    Column("before", String, nullable=False),
    Column("after", String, nullable=False),
    Column("reason", Text, nullable=False),
    Column("detail", Text, nullable=False),  # JSON
    Index(None, "topic", "subject", "seq"),
    sqlite_autoincrement=True,
)
_APPEND_ONLY = (
    "CREATE TRIGGER journal_refuses_{change} BEFORE {change} ON journal "
    "BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); END"
)


@event.listens_for(journal, "after_create")
def _keep_append_only(_table: Table, connection: Connection, **_options: object) -> None:
    if connection.dialect.name == "sqlite":
        for change in ("update", "delete"):
            connection.exec_driver_sql(_APPEND_ONLY.format(change=change))


message = Table(
    "message",
    metadata,
    Column("seq", Integer, primary_key=True),
    Column("message_id", String, nullable=False),  # the same for ever, at every attempt
    Column("endpoint", String, nullable=False),
    Column("location", String, nullable=False),  # order is kept per (endpoint, location)
    Column("type", String, nullable=False),
    Column("body", Text, nullable=False),
    Column("created_ms", BigInteger, nullable=False),
    Column("state", String, nullable=False),  # "waiting", "delivered" or "set-aside"
    Column("attempts", Integer, nullable=False),
    Column("next_attempt_ms", BigInteger, nullable=False),
    Column("delivered_ms", BigInteger),
    Column("last_error", Text, nullable=False),
    UniqueConstraint("message_id"),
    Index(None, "state", "endpoint", "location", "seq"),
    sqlite_autoincrement=True,
)

endpoint = Table(
    "endpoint",
    metadata,
    Column("name", String, primary_key=True),
    Column("disabled_ms", BigInteger),  # the receiver said 410: nothing is sent until the settings change
    Column("disabled_url", String, nullable=False),
    Column("failing_since_ms", BigInteger),
    Column("last_error", Text, nullable=False),
)

status = Table(
    "status",
    metadata,
    Column("key", String, primary_key=True),  # "site", "tick", "feeds", "clock", …
    Column("value", Text, nullable=False),  # JSON
    Column("at_ms", BigInteger, nullable=False),
)
