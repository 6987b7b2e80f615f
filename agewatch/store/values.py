"""How values stand in the store: times as whole milliseconds, mappings as JSON text."""

from __future__ import annotations

import json
from typing import overload

import numpy as np


@overload
def to_ms(at_s: float) -> int: ...
@overload
def to_ms(at_s: float | None) -> int | None: ...
def to_ms(at_s: float | None) -> int | None:
    """Seconds as whole milliseconds, rounded."""
    return None if at_s is None else round(at_s * 1000)


@overload
def to_s(at_ms: int) -> float: ...
@overload
def to_s(at_ms: int | None) -> float | None: ...
def to_s(at_ms: int | None) -> float | None:
    return None if at_ms is None else at_ms / 1000


def to_json(value: object) -> str:
    """JSON text of `value`; numpy's numbers and flags count as Python's."""
    return json.dumps(value, ensure_ascii=False, separators=(",", ":"), default=_plain)


def _plain(value: object) -> object:
    if isinstance(value, np.generic):
        return value.item()
    raise TypeError(f"{type(value).__name__} has no JSON form")
