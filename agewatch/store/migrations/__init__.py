"""The revisions of the store's layout. Alembic runs them; nothing here imports it unless it has to."""

from __future__ import annotations

REVISIONS = ("0001",)
"""Every revision, oldest first: known without Alembic, whose import takes longer than opening a store."""

HEAD = REVISIONS[-1]
