"""Rejected rows that somebody has mended: read once more by the rules of their feed, and taken in."""

from __future__ import annotations

from collections.abc import Mapping

from agewatch.daemon.control import Reply, Request
from agewatch.daemon.desk import Desk
from agewatch.daemon.feeds import past_until_s
from agewatch.errors import FeedError
from agewatch.intake import parse_rows
from agewatch.messages.inert import inert
from agewatch.plant.records import JournalRow, StoredReject
from agewatch.plant.settings import Feed
from agewatch.plant.tables import Row
from agewatch.store import Transaction, queries, writes

TOLD_FAULTS = 20
"""Of one request; the others are told of the next time."""


def resubmit(desk: Desk, request: Request, actor: str) -> Reply:
    """`mended`: the text of each mended row, by the number of its reject. What is good now goes in.

    The reply is ok when all of them went in; else it says of each other one why not.
    """
    mended = _mended(request)
    if not mended:
        return Reply(False, 'resubmit needs "mended": the text of each row by the number of its reject')
    feeds = {feed.name: feed for feed in desk.settings.feed}
    faults = []
    with desk.store.write() as tx:
        waiting = {stored.reject_id: stored for stored in queries.open_rejects(tx)}
        for reject_id, text in mended.items():
            stored = waiting.get(reject_id)
            fault = (
                "no such row waits"
                if stored is None
                else _take_in(desk, tx, stored, text, feeds.get(stored.feed), actor)
            )
            if fault:
                faults.append(f"{reject_id}: {inert(fault, 300)}")
    taken = len(mended) - len(faults)
    if faults:
        more = f"; and {len(faults) - TOLD_FAULTS} more" if len(faults) > TOLD_FAULTS else ""
        told = "; ".join(faults[:TOLD_FAULTS])
        return Reply(False, f"{taken} taken in, {len(faults)} still rejected: {told}{more}")
    return Reply(True, f"{taken} taken in")


def _mended(request: Request) -> Mapping[int, str]:
    """Empty where the request is not as it has to be."""
    told = request.get("mended")
    if not isinstance(told, dict):
        return {}
    if not all(number.isdecimal() and isinstance(text, str) for number, text in told.items()):
        return {}
    return {int(number): text for number, text in told.items()}


def _take_in(
    desk: Desk, tx: Transaction, stored: StoredReject, text: str, feed: Feed | None, actor: str
) -> str:
    """Why the row cannot be used even now; "" when it is taken in."""
    if feed is None:
        return f"feed {stored.feed} is not in the settings any more"
    rows = _rows(desk, stored, text, feed)
    if isinstance(rows, str):
        return rows
    now_s = desk.clock.now_s()
    put = writes.put_rows(tx, feed.table, rows, feed=feed.name, now_s=now_s)
    writes.mark_resubmitted(tx, [stored.reject_id], now_s)
    where = {
        "source": stored.reject.source,
        "line": stored.reject.line,
        "new": put.new,
        "changed": put.changed,
    }
    row = JournalRow(
        now_s, "feed", "resubmitted", feed.name, actor, stored.reject.raw, text, stored.reject.reason, where
    )
    writes.append_journal(tx, [row])
    return ""


def _rows(desk: Desk, stored: StoredReject, text: str, feed: Feed) -> list[Row] | str:
    """The rows that the mended text makes, or what is still wrong with it."""
    row = text.rstrip("\r\n")  # tabs at its end are empty cells
    sheet = f"{stored.reject.header}\n{row}\n"
    try:
        parsed = parse_rows(feed, sheet, stored.reject.source, now_s=past_until_s(desk.clock))
    except FeedError as error:
        return error.reason
    if parsed.rejects:
        first = parsed.rejects[0]
        return f"{first.column}: {first.reason}" if first.column else first.reason
    return parsed.rows or "it is blank"
