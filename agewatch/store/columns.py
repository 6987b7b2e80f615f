"""An assessment as one value: a header of JSON, then every column as raw little-endian numbers.

    length of the header   8 bytes
    header                 JSON: scalars, columns (name, kind, type, count), labels of coded columns
    columns                in the header's order, each begun at a multiple of 8 bytes

Names are text joined together, after the lengths of its pieces in characters.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from agewatch.plant.assessment import Assessment
from agewatch.plant.inventory import Coded

_ALIGNED = 8


def pack(assessment: Assessment) -> bytes:
    """Every field of `assessment`, so that `unpack` gives the same again, bit for bit."""
    scalars: dict[str, Any] = {}
    labels: dict[str, tuple[str, ...]] = {}
    columns: list[tuple[str, str, str, int]] = []
    blocks: list[bytes] = []
    for field in fields(assessment):
        value = getattr(assessment, field.name)
        if isinstance(value, Coded):
            labels[field.name] = value.labels
            parts = [("codes", value.codes)]
        elif not isinstance(value, np.ndarray):
            scalars[field.name] = value
            continue
        elif value.dtype == object:
            parts = _text_parts(value)
        else:
            parts = [("numbers", value)]
        for kind, numbers in parts:
            little = np.ascontiguousarray(numbers, numbers.dtype.newbyteorder("<"))
            columns.append((field.name, kind, little.dtype.str, len(little)))
            blocks += _padded(little.tobytes())
    header = json.dumps({"scalars": scalars, "columns": columns, "labels": labels}).encode()
    return b"".join([len(header).to_bytes(_ALIGNED, "little"), *_padded(header), *blocks])


def unpack(packed: bytes) -> Assessment | None:
    """What was packed; its arrays cannot be written to. None: an assessment with other fields."""
    end = _ALIGNED + int.from_bytes(packed[:_ALIGNED], "little")
    header = json.loads(packed[_ALIGNED:end])
    values: dict[str, Any] = dict(header["scalars"])
    for name, kind, numbers in _blocks(packed, end, header["columns"]):
        if kind == "codes":
            values[name] = Coded(numbers, tuple(header["labels"][name]))
        elif kind == "text":
            values[name] = _texts(numbers, lengths=values[name])
        else:
            values[name] = numbers
    if values.keys() != {field.name for field in fields(Assessment)}:
        return None
    return Assessment(**values)


def _text_parts(names: NDArray[np.object_]) -> list[tuple[str, NDArray[Any]]]:
    lengths = np.fromiter(map(len, names), np.int32, len(names))
    return [("lengths", lengths), ("text", np.frombuffer("".join(names).encode(), np.uint8))]


def _texts(text: NDArray[np.uint8], *, lengths: NDArray[np.int32]) -> NDArray[np.object_]:
    joined = text.tobytes().decode()
    ends = np.cumsum(lengths).tolist()
    names = np.empty(len(ends), dtype=object)
    names[:] = [joined[begin:end] for begin, end in zip([0, *ends[:-1]], ends, strict=True)] if ends else []
    return names


def _padded(block: bytes) -> tuple[bytes, bytes]:
    return block, bytes(-len(block) % _ALIGNED)


def _blocks(
    packed: bytes, start: int, columns: list[tuple[str, str, str, int]]
) -> Iterator[tuple[str, str, NDArray[Any]]]:
    for name, kind, dtype, count in columns:
        start += -start % _ALIGNED
        numbers = np.frombuffer(packed, np.dtype(dtype), count, start)
        start += numbers.nbytes
        yield name, kind, numbers
