"""Packed assessments: everything comes back bit for bit."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from agewatch.plant.assessment import Assessment
from agewatch.plant.inventory import Coded
from agewatch.store.columns import pack, unpack


def coded(count: int) -> st.SearchStrategy[Coded]:
    labels = st.lists(st.text(max_size=4), max_size=3, unique=True).map(tuple)
    return labels.flatmap(
        lambda names: arrays(np.int32, count, elements=st.integers(-1, len(names) - 1)).map(
            lambda codes: Coded(codes, names)
        )
    )


@st.composite
def assessments(draw: st.DrawFn) -> Assessment:
    count = draw(st.integers(0, 4))
    floats = arrays(np.float64, count, elements=st.floats(allow_nan=True))
    kinds: dict[str, st.SearchStrategy[Any]] = {
        "float": st.floats(allow_nan=False),
        "str": st.text(max_size=4),
        "Coded": coded(count),
        "Floats": floats,
        "NDArray[np.int8]": arrays(np.int8, count),
        "NDArray[np.bool_]": arrays(np.bool_, count),
        "NDArray[np.object_]": st.lists(st.text(max_size=4), min_size=count, max_size=count).map(
            lambda names: np.array([*names, None], dtype=object)[:-1]
        ),
    }
    return Assessment(**{field.name: draw(kinds[str(field.type)]) for field in fields(Assessment)})


def same(left: object, right: object) -> bool:
    if isinstance(left, Coded) and isinstance(right, Coded):
        return left.labels == right.labels and same(left.codes, right.codes)
    if isinstance(left, np.ndarray) and isinstance(right, np.ndarray):
        bits = left.tolist() == right.tolist() if left.dtype == object else left.tobytes() == right.tobytes()
        return left.dtype == right.dtype and bits
    return left == right


@settings(max_examples=60, deadline=None)
@given(assessments())
def test_unpacking_gives_what_was_packed(made: Assessment) -> None:
    """Every field, with its type, NaN and all, for any number of coils and any names."""
    back = unpack(pack(made))
    assert back is not None
    for field in fields(Assessment):
        assert same(getattr(made, field.name), getattr(back, field.name)), field.name


def blank(count: int) -> Assessment:
    floats, no_name = np.zeros(count), Coded(np.full(count, -1, np.int32), ())
    values = {"Floats": floats, "Coded": no_name, "NDArray[np.object_]": np.full(count, "C1", dtype=object)}
    given: dict[str, Any] = {field.name: values.get(str(field.type), floats) for field in fields(Assessment)}
    return Assessment(**given | {"at_s": 0.0, "model": "m", "settings_digest": "d"})


def test_numbers_are_little_endian_whatever_the_machine_has() -> None:
    """A column in the other byte order is stored alike."""
    native = replace(blank(2), ype_pct=np.array([1.0, 2.0], "<f8"))
    swapped = replace(blank(2), ype_pct=np.array([1.0, 2.0], ">f8"))
    assert pack(swapped) == pack(native)


def test_a_column_that_is_not_contiguous_is_packed_whole() -> None:
    """A view into a table is stored as the column that it is."""
    table = np.arange(6.0).reshape(3, 2)
    back = unpack(pack(replace(blank(3), ype_pct=table[:, 1])))
    assert back is not None
    assert back.ype_pct.tolist() == [1.0, 3.0, 5.0]


def test_an_assessment_with_other_fields_is_not_read() -> None:
    """A version of the program that knows other columns takes it for none, instead of guessing."""
    packed = pack(blank(1)).replace(b"ype_limit_pct", b"ype_limit_mpa")
    assert unpack(packed) is None
