"""What Alembic runs to migrate: on the connection that it was handed, inside the transaction begun there."""

from __future__ import annotations

from alembic import context

from agewatch.store.schema import metadata

context.configure(
    connection=context.config.attributes["connection"], target_metadata=metadata, render_as_batch=True
)
context.run_migrations()
