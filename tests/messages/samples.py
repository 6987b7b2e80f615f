"""One message, its endpoint and its secret, for the tests of delivery."""

from __future__ import annotations

from datetime import timedelta
from typing import Any

from agewatch.messages.body import MessageType, News, bodies
from agewatch.messages.signing import secret_of
from agewatch.plant.records import MessageState, OutboxMessage
from agewatch.plant.settings import Endpoint

SECRET = secret_of(b"a key of thirty-two bytes, no more"[:32])
NOW = 1_800_000_000.0


def message(coil: str = "C-1", *, attempts: int = 0, created_s: float = NOW) -> OutboxMessage:
    news = News(MessageType.PULL_REQUESTED, "Works Lhota", "BAY-1", created_s, ({"coil_id": coil},))
    (body,) = bodies(news, "logistics", "7")
    return OutboxMessage(
        message_id=body.message_id,
        endpoint="logistics",
        location="BAY-1",
        type=news.type,
        body=body.text,
        created_s=created_s,
        state=MessageState.WAITING,
        attempts=attempts,
        next_attempt_s=created_s,
        delivered_s=None,
        last_error="",
        seq=1,
    )


def endpoint(url: str, *, connect_s: float = 2.0, read_s: float = 5.0, **more: Any) -> Endpoint:
    return Endpoint(
        name="logistics",
        url=url,
        secret_env="SECRET",
        connect_timeout=timedelta(seconds=connect_s),
        read_timeout=timedelta(seconds=read_s),
        **more,
    )
