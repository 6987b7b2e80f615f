"""Who asks for something, as the kernel says."""

from __future__ import annotations

import os
import pwd
import socket
import struct

_UCRED = struct.Struct("3i")


def actor_of(connection: socket.socket) -> str:
    """`user:NAME` of the peer's user; `user:#UID` where the system knows no name."""
    raw = connection.getsockopt(socket.SOL_SOCKET, socket.SO_PEERCRED, _UCRED.size)
    _, uid, _ = _UCRED.unpack(raw)
    return _actor(uid)


def own_actor() -> str:
    """The user of this very process."""
    return _actor(os.getuid())


def _actor(uid: int) -> str:
    try:
        return f"user:{pwd.getpwuid(uid).pw_name}"
    except KeyError:
        return f"user:#{uid}"
