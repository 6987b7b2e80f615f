"""The one HTTP call: sends a message once and says what came of it, within the endpoint's time limits."""

from __future__ import annotations

import http.client
import io
import socket
from http.cookiejar import DefaultCookiePolicy
from pathlib import Path
from time import monotonic
from typing import Any

import requests
import urllib3
from requests.adapters import HTTPAdapter
from urllib3.connection import HTTPConnection, HTTPSConnection

from agewatch import __version__
from agewatch.messages.body import CONTENT_TYPE
from agewatch.messages.inert import inert
from agewatch.messages.retry import Outcome, OutcomeKind, kind_of, retry_after_s
from agewatch.messages.signing import headers
from agewatch.plant.records import OutboxMessage
from agewatch.plant.settings import Endpoint

ANSWER_LIMIT = 65_536
"""Bytes of an answer that are read at most."""


class _UntilDeadline(io.RawIOBase):
    """Reads a socket against one deadline: its own timeout would start anew with every byte that drips in."""

    def __init__(self, raw: io.RawIOBase, connection: socket.socket) -> None:
        self._raw = raw
        self._connection = connection
        self._deadline_s = monotonic() + (connection.gettimeout() or 0.0)

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any) -> int | None:
        left_s = self._deadline_s - monotonic()
        if left_s <= 0:
            raise TimeoutError("the whole answer did not come in time")
        self._connection.settimeout(left_s)
        return self._raw.readinto(buffer)

    def close(self) -> None:
        self._raw.close()
        super().close()


class _TimelyResponse(http.client.HTTPResponse):
    """An answer whose head and body together have the read timeout."""

    def __init__(self, sock: socket.socket, *args: Any, **kwargs: Any) -> None:
        super().__init__(sock, *args, **kwargs)
        self.fp = io.BufferedReader(_UntilDeadline(self.fp.detach(), sock))


class _PlainConnection(HTTPConnection):
    response_class = _TimelyResponse


class _TlsConnection(HTTPSConnection):
    response_class = _TimelyResponse


class _PlainPool(urllib3.HTTPConnectionPool):
    ConnectionCls = _PlainConnection


class _TlsPool(urllib3.HTTPSConnectionPool):
    ConnectionCls = _TlsConnection


class _TimelyAdapter(HTTPAdapter):
    def init_poolmanager(self, *args: Any, **kwargs: Any) -> None:
        super().init_poolmanager(*args, **kwargs)
        self.poolmanager.pool_classes_by_scheme = {"http": _PlainPool, "https": _TlsPool}


def open_session() -> requests.Session:
    """A session for one endpoint: no proxy, certificate or password from the environment, no cookies."""
    session = requests.Session()
    session.trust_env = False
    session.cookies.set_policy(DefaultCookiePolicy(allowed_domains=[]))
    session.headers.update({"User-Agent": f"AgeWatch/{__version__}", "Accept-Encoding": "identity"})
    for scheme in ("http://", "https://"):
        session.mount(scheme, _TimelyAdapter(max_retries=0))
    return session


def attempt(
    endpoint: Endpoint,
    secret: str,
    message: OutboxMessage,
    now_s: float,
    *,
    folder: Path,
    session: requests.Session | None = None,
) -> Outcome:
    """Send `message` once, signed now; redirects are not followed, and every failure is an outcome.

    now_s: the world's time, not that of a replayed plant: receivers hold the signature against their own
    clocks. folder: that of the settings, for a relative `ca_file`. session: one from `open_session`, kept by
    the endpoint's only worker to use connections again; without it the connection serves this attempt only.
    """
    if session is None:
        with open_session() as own:
            return attempt(endpoint, secret, message, now_s, folder=folder, session=own)
    body = message.body.encode("utf-8")
    try:
        with session.post(
            endpoint.url,
            data=body,
            headers={"Content-Type": CONTENT_TYPE, **headers(secret, message.message_id, int(now_s), body)},
            timeout=(endpoint.connect_timeout.total_seconds(), endpoint.read_timeout.total_seconds()),
            verify=True if endpoint.ca_file is None else str(folder / endpoint.ca_file),
            allow_redirects=False,
            stream=True,
        ) as response:
            return _outcome(response, now_s)
    except (OSError, ValueError, urllib3.exceptions.HTTPError) as fault:
        # requests' errors are OSErrors, and so is a lost ca_file; a time limit of 0 s is a ValueError
        return Outcome(OutcomeKind.IN_TROUBLE, _trouble(endpoint, fault))


def _outcome(response: requests.Response, now_s: float) -> Outcome:
    kind = kind_of(response.status_code)
    said = _said(response)
    if kind is OutcomeKind.DELIVERED:
        return Outcome(kind)
    reason = f"it answered {response.status_code}{said and ': '}{said}"
    if "location" in response.headers:
        reason += f" (redirect to {inert(response.headers['location'])} not followed)"
    return Outcome(kind, reason, retry_after_s(response.headers.get("retry-after"), now_s))


def _said(response: requests.Response) -> str:
    """The beginning of the answer's body; "" where it does not come. The status stands either way."""
    try:
        body = response.raw.read(ANSWER_LIMIT, decode_content=False)
    except (urllib3.exceptions.HTTPError, OSError):
        return ""
    return inert(body.decode("utf-8", "replace").strip())


def _trouble(endpoint: Endpoint, fault: Exception) -> str:
    if isinstance(fault, requests.exceptions.SSLError):
        return f"its certificate is not trusted, or no common encryption was found: {_innermost(fault)}"
    if isinstance(fault, requests.exceptions.ConnectTimeout):
        return f"no connection within {endpoint.connect_timeout.total_seconds():g} s"
    if isinstance(fault, requests.exceptions.ReadTimeout):
        return f"no whole answer within {endpoint.read_timeout.total_seconds():g} s"
    if isinstance(fault, requests.exceptions.ConnectionError):
        return f"no connection: {_innermost(fault)}"
    return inert(str(fault))


def _innermost(fault: BaseException) -> str:
    """What went wrong at the bottom, without the names of the layers above it."""
    reason = next((one for one in fault.args if isinstance(one, BaseException)), None)
    reason = getattr(reason, "reason", None) or reason
    cause = reason.__cause__ if isinstance(reason, BaseException) else None
    return inert(str(cause or reason or fault))
