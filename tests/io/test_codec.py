"""Records to bytes and back."""

from __future__ import annotations

import dataclasses
import math
import os
import pickle

import numpy as np
import pytest

from tests.results import session_result
from unitclass import records
from unitclass.io.codec import decoded, encoded, layout_digest


def same(a: object, b: object) -> bool:
    """Compare content, NaN equal to NaN, arrays with their types."""
    if isinstance(a, np.ndarray):
        return isinstance(b, np.ndarray) and a.dtype == b.dtype and a.shape == b.shape and np.array_equal(
            a, b, equal_nan=a.dtype.kind == "f")
    if dataclasses.is_dataclass(a):
        return type(a) is type(b) and all(same(getattr(a, f.name), getattr(b, f.name)) for f in dataclasses.fields(a))
    if isinstance(a, dict):
        return isinstance(b, dict) and list(a) == list(b) and all(same(a[k], b[k]) for k in a)
    if isinstance(a, tuple):
        return isinstance(b, tuple) and len(a) == len(b) and all(map(same, a, b))
    return type(a) is type(b) and (a == b or (a != a and b != b))


def test_a_whole_session_comes_back_the_same():
    result = session_result()
    assert same(result, decoded(encoded(result)))


@pytest.mark.parametrize("value", [
    None, True, 0, -(2**70), 1.5, math.inf, "\x1b[1m\u202e\0\udcff", (), ((), ("a",)), {}, {"$record": 1, "": (1, 2)},
    {"array": "x", "record": {"map": ()}}])
def test_plain_values_come_back_the_same(value):
    assert same(value, decoded(encoded(value)))


@pytest.mark.parametrize("array", [
    np.zeros(0), np.zeros((0, 3)), np.arange(7, dtype=np.int8), np.array(3.5), np.eye(3, dtype=np.float32)[:, ::2],
    np.array([True, False]), np.arange(6).reshape(2, 3).T, np.array([1.0, np.nan, -0.0]),
    np.arange(4, dtype=">f8")])
def test_arrays_come_back_with_shape_and_values(array):
    back = decoded(encoded((array, array)))
    for copy in back:
        assert copy.shape == array.shape
        assert copy.dtype == array.dtype.newbyteorder("<")
        np.testing.assert_array_equal(copy, array)


def test_numpy_numbers_become_plain_ones():
    assert decoded(encoded((np.int64(3), np.float32(0.5), np.bool_(True)))) == (3, 0.5, True)


@pytest.mark.parametrize("value", [np.array([object()]), np.array(["text"]), {1: 2}, object(), {"a": {3}}, os.path])
def test_anything_else_is_refused_on_writing(value):
    with pytest.raises(TypeError, match="cannot be stored"):
        encoded(value)


def test_a_namesake_of_a_record_is_refused():
    namesake = dataclasses.make_dataclass("Condition", ["name"])
    with pytest.raises(TypeError, match="cannot be stored"):
        encoded(namesake("baseline"))


@pytest.mark.parametrize("data", [
    b"", b"short", pickle.dumps(session_result()), encoded(session_result())[:-64],
    encoded((1, 2)).replace(b"[1,2]", b"[1,2}"),
    encoded(records.Exclusion(0.0, 1.0, "")).replace(b"Exclusion", b"os.system"),
    encoded(records.Exclusion(0.0, 1.0, "")).replace(b'"reason"', b'"reaso_"'),
    encoded(np.zeros(3)).replace(b"<f8", b"|O8"), encoded(np.zeros(3)).replace(b"[3]", b"[9]"),
    encoded(np.zeros(3)).replace(b",0]", b",9]"), b"\xff" * 64])
def test_damaged_or_foreign_bytes_are_a_value_error(data):
    with pytest.raises(ValueError):  # noqa: PT011 - many wordings, one kind
        decoded(data)


def test_the_layout_digest_follows_the_fields(monkeypatch):
    from unitclass.io import codec

    before = layout_digest()
    assert layout_digest() == before
    monkeypatch.setattr(codec, "_KNOWN", {**codec._KNOWN, "Chunk": dataclasses.make_dataclass("Chunk", ["other"])})
    assert layout_digest() != before
