"""Where people's requests are worked on: what an action needs, and what becomes of a refusal."""

from __future__ import annotations

from dataclasses import dataclass

from agewatch.clock import Clock
from agewatch.daemon.control import Reply, Request
from agewatch.messages.inert import inert
from agewatch.plant.records import JournalRow
from agewatch.plant.settings import Settings
from agewatch.store import Store, writes


@dataclass(frozen=True, slots=True)
class Desk:
    """What actions work on."""

    store: Store
    settings: Settings
    clock: Clock

    def refuse(self, request: Request, actor: str, reason: str) -> Reply:
        """Journal that something was asked for and not done. Raises StoreError."""
        asked = {name: inert(str(request.get(name, ""))) for name in ("action", "kind", "subject")}
        row = JournalRow(
            at_s=self.clock.now_s(),
            topic="daemon",
            kind="request-refused",
            subject=asked["action"],
            actor=actor,
            before="",
            after="",
            reason=reason,
            detail=asked,
        )
        with self.store.write() as tx:
            writes.append_journal(tx, [row])
        return Reply(False, reason)
