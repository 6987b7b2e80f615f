"""The first layout: plant, temperatures, assessments, alarms, journal, messages."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None


def upgrade() -> None:
    op.create_table(
        "coil",
        sa.Column("coil_id", sa.String(), nullable=False),
        sa.Column("grade", sa.String(), nullable=False),
        sa.Column("temper_rolled_ms", sa.BigInteger(), nullable=False),
        sa.Column("location", sa.String(), nullable=False),
        sa.Column("located_since_ms", sa.BigInteger()),
        sa.Column("heat_id", sa.String()),
        sa.Column("parent_id", sa.String()),
        sa.Column("part", sa.String()),
        sa.Column("status", sa.String(), nullable=False),
        sa.Column("press_ms", sa.BigInteger()),
        sa.Column("temper_elongation_pct", sa.Double()),
        sa.Column("thickness_mm", sa.Double()),
        sa.Column("width_mm", sa.Double()),
        sa.Column("mass_kg", sa.Double()),
        sa.Column("bore_mm", sa.Double()),
        sa.Column("coil_temp_c", sa.Double()),
        sa.Column("wrapped", sa.Boolean()),
        sa.Column("rp02_mpa", sa.Double()),
        sa.Column("rm_mpa", sa.Double()),
        sa.Column("n_value", sa.Double()),
        sa.Column("c_pct", sa.Double()),
        sa.Column("n_pct", sa.Double()),
        sa.Column("s_pct", sa.Double()),
        sa.Column("ti_pct", sa.Double()),
        sa.Column("nb_pct", sa.Double()),
        sa.Column("al_pct", sa.Double()),
        sa.Column("first_seen_ms", sa.BigInteger(), nullable=False),
        sa.Column("last_seen_ms", sa.BigInteger(), nullable=False),
        sa.Column("told_digest", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("coil_id", name=op.f("pk_coil")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "move",
        sa.Column("coil_id", sa.String(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.Column("location", sa.String(), nullable=False),
        sa.Column("origin", sa.String(), nullable=False),
        sa.PrimaryKeyConstraint("coil_id", "at_ms", name=op.f("pk_move")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "press_plan",
        sa.Column("coil_id", sa.String(), nullable=False),
        sa.Column("press_ms", sa.BigInteger(), nullable=False),
        sa.Column("received_ms", sa.BigInteger(), nullable=False),
        sa.PrimaryKeyConstraint("coil_id", name=op.f("pk_press_plan")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "sensor",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.PrimaryKeyConstraint("sensor_id", name=op.f("pk_sensor")),
        sa.UniqueConstraint("name", name=op.f("uq_sensor_name")),
    )
    op.create_table(
        "reading",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.Column("celsius", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.sensor_id"], name=op.f("fk_reading_sensor_id")),
        sa.PrimaryKeyConstraint("sensor_id", "at_ms", name=op.f("pk_reading")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "outlook",
        sa.Column("location", sa.String(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.Column("celsius", sa.Double(), nullable=False),
        sa.PrimaryKeyConstraint("location", "at_ms", name=op.f("pk_outlook")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "lab_test",
        sa.Column("lab_test_id", sa.Integer(), nullable=False),
        sa.Column("coil_id", sa.String(), nullable=False),
        sa.Column("tested_ms", sa.BigInteger(), nullable=False),
        sa.Column("ype_pct", sa.Double(), nullable=False),
        sa.Column("rp02_mpa", sa.Double()),
        sa.Column("aged_c", sa.Double()),
        sa.Column("aged_h", sa.Double()),
        sa.Column("direction", sa.String()),
        sa.PrimaryKeyConstraint("lab_test_id", name=op.f("pk_lab_test")),
    )
    op.create_index(op.f("ix_lab_test_coil_id_tested_ms"), "lab_test", ["coil_id", "tested_ms"], unique=False)
    op.create_table(
        "source",
        sa.Column("feed", sa.String(), nullable=False),
        sa.Column("path", sa.String(), nullable=False),
        sa.Column("fingerprint", sa.String(), nullable=False),
        sa.Column("read_ms", sa.BigInteger(), nullable=False),
        sa.Column("rows", sa.Integer(), nullable=False),
        sa.Column("rejects", sa.Integer(), nullable=False),
        sa.PrimaryKeyConstraint("feed", "path", name=op.f("pk_source")),
    )
    op.create_table(
        "reject",
        sa.Column("reject_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.String(), nullable=False),
        sa.Column("table", sa.String(), nullable=False),
        sa.Column("feed", sa.String(), nullable=False),
        sa.Column("source", sa.String(), nullable=False),
        sa.Column("line", sa.Integer(), nullable=False),
        sa.Column("column", sa.String(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("raw", sa.Text(), nullable=False),
        sa.Column("header", sa.Text(), nullable=False),
        sa.Column("received_ms", sa.BigInteger(), nullable=False),
        sa.Column("resubmitted_ms", sa.BigInteger()),
        sa.PrimaryKeyConstraint("reject_id", name=op.f("pk_reject")),
        sa.UniqueConstraint("digest", name=op.f("uq_reject_digest")),
    )
    op.create_table(
        "assessment",
        sa.Column("assessment_id", sa.Integer(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.Column("model", sa.String(), nullable=False),
        sa.Column("settings_digest", sa.String(), nullable=False),
        sa.Column("coils", sa.Integer(), nullable=False),
        sa.Column("columns", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("assessment_id", name=op.f("pk_assessment")),
    )
    op.create_table(
        "alarm",
        sa.Column("kind", sa.String(), nullable=False),
        sa.Column("subject", sa.String(), nullable=False),
        sa.Column("location", sa.String(), nullable=False),
        sa.Column("state", sa.String(), nullable=False),
        sa.Column("priority", sa.String(), nullable=False),
        sa.Column("active", sa.Boolean(), nullable=False),
        sa.Column("active_since_ms", sa.BigInteger()),
        sa.Column("inactive_since_ms", sa.BigInteger()),
        sa.Column("raised_ms", sa.BigInteger()),
        sa.Column("acknowledged_ms", sa.BigInteger()),
        sa.Column("acknowledged_by", sa.String()),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("kind", "subject", name=op.f("pk_alarm")),
    )
    op.create_table(
        "journal",
        sa.Column("seq", sa.Integer(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.Column("topic", sa.String(), nullable=False),
        sa.Column("kind", sa.String(), nullable=False),
        sa.Column("subject", sa.String(), nullable=False),
        sa.Column("actor", sa.String(), nullable=False),
        sa.Column("before", sa.String(), nullable=False),
        sa.Column("after", sa.String(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("seq", name=op.f("pk_journal")),
        sqlite_autoincrement=True,
    )
    op.create_index(
        op.f("ix_journal_topic_subject_seq"), "journal", ["topic", "subject", "seq"], unique=False
    )
    op.create_table(
        "message",
        sa.Column("seq", sa.Integer(), nullable=False),
        sa.Column("message_id", sa.String(), nullable=False),
        sa.Column("endpoint", sa.String(), nullable=False),
        sa.Column("location", sa.String(), nullable=False),
        sa.Column("type", sa.String(), nullable=False),
        sa.Column("body", sa.Text(), nullable=False),
        sa.Column("created_ms", sa.BigInteger(), nullable=False),
        sa.Column("state", sa.String(), nullable=False),
        sa.Column("attempts", sa.Integer(), nullable=False),
        sa.Column("next_attempt_ms", sa.BigInteger(), nullable=False),
        sa.Column("delivered_ms", sa.BigInteger()),
        sa.Column("last_error", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("seq", name=op.f("pk_message")),
        sa.UniqueConstraint("message_id", name=op.f("uq_message_message_id")),
        sqlite_autoincrement=True,
    )
    op.create_index(
        op.f("ix_message_state_endpoint_location_seq"),
        "message",
        ["state", "endpoint", "location", "seq"],
        unique=False,
    )
    op.create_table(
        "endpoint",
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("disabled_ms", sa.BigInteger()),
        sa.Column("disabled_url", sa.String(), nullable=False),
        sa.Column("failing_since_ms", sa.BigInteger()),
        sa.Column("last_error", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("name", name=op.f("pk_endpoint")),
    )
    op.create_table(
        "status",
        sa.Column("key", sa.String(), nullable=False),
        sa.Column("value", sa.Text(), nullable=False),
        sa.Column("at_ms", sa.BigInteger(), nullable=False),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_status")),
    )
    if op.get_bind().dialect.name == "sqlite":
        for change in ("update", "delete"):
            op.execute(
                f"CREATE TRIGGER journal_refuses_{change} BEFORE {change} ON journal "
                "BEGIN SELECT RAISE(ABORT, 'the journal is append-only'); END"
            )
