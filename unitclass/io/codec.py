"""Records to bytes and back, without running anything that the bytes could name.

The bytes are a JSON tree, and after it the arrays as they lie in memory. Only the frozen
dataclasses of `records`, tuples, mappings with text keys, numbers, text and None are known.
"""

from __future__ import annotations

import hashlib
import json
import struct
from collections.abc import Callable, Mapping
from dataclasses import fields, is_dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from unitclass import records

_ALIGNMENT = 8
_KINDS = "biuf"
_HEAD = struct.Struct("<Q")

_KNOWN: Mapping[str, Any] = {name: kind for name, kind in vars(records).items()
                              if isinstance(kind, type) and is_dataclass(kind)}


def layout_digest() -> str:
    """Return a digest of the records' names and fields: bytes of another layout do not fit."""
    told = [(name, tuple(f.name for f in fields(kind))) for name, kind in sorted(_KNOWN.items())]
    return hashlib.sha256(repr(told).encode()).hexdigest()[:12]


def encoded(value: Any) -> bytes:
    """Return the bytes of a record; raises TypeError for anything that is no record content."""
    arrays: list[bytes] = []
    tree = _Encoder(arrays).node(value)
    text = json.dumps(tree, separators=(",", ":"), ensure_ascii=True).encode()
    text += b" " * (-(_HEAD.size + len(text)) % _ALIGNMENT)
    return b"".join([_HEAD.pack(len(text)), text, *arrays])


def decoded(data: bytes) -> Any:
    """Return the record; its arrays are read-only views into `data`.

    Raises
    ------
    ValueError
        If the bytes are damaged or were written for other records.
    """
    try:
        (length,) = _HEAD.unpack_from(data)
        tree = json.loads(data[_HEAD.size : _HEAD.size + length])
        return _Decoder(data, _HEAD.size + length).value(tree)
    except (struct.error, KeyError, TypeError, IndexError, UnicodeDecodeError, RecursionError) as error:
        raise ValueError(f"not a record of this program: {error!r}") from error


class _Encoder:
    """Builds the tree; arrays go to a list, and the tree keeps where each begins."""

    def __init__(self, arrays: list[bytes]) -> None:
        self._arrays = arrays
        self._offset = 0

    def node(self, value: Any) -> Any:
        if value is None or isinstance(value, bool | str):
            return value
        if isinstance(value, np.bool_ | np.integer | np.floating):
            return value.item()
        if isinstance(value, int | float):
            return value
        return self._compound(value)

    def _compound(self, value: Any) -> Any:
        if isinstance(value, np.ndarray):
            return {"array": self._array(value)}
        if isinstance(value, tuple | list):
            return [self.node(item) for item in value]
        if isinstance(value, Mapping):
            return {"map": [[_checked_key(k), self.node(v)] for k, v in value.items()]}
        name = type(value).__name__
        if _KNOWN.get(name) is type(value):
            content = {f.name: self.node(getattr(value, f.name)) for f in fields(value)}
            return {"record": name, "fields": content}
        raise TypeError(f"{type(value).__name__} cannot be stored in the cache")

    def _array(self, value: NDArray[Any]) -> list[Any]:
        if value.dtype.kind not in _KINDS:
            raise TypeError(f"an array of {value.dtype} cannot be stored in the cache")
        plain = np.ascontiguousarray(value).astype(value.dtype.newbyteorder("<"), copy=False)
        data = plain.tobytes()
        padding = -len(data) % _ALIGNMENT
        self._arrays.append(data + b"\0" * padding)
        place = self._offset
        self._offset += len(data) + padding
        return [plain.dtype.str, list(value.shape), place]


class _Decoder:
    """Walks the tree back to records; `start` is where the arrays begin."""

    def __init__(self, data: bytes, start: int) -> None:
        self._data = data
        self._start = start

    def value(self, node: Any) -> Any:
        if isinstance(node, list):
            return tuple(self.value(item) for item in node)
        if not isinstance(node, dict):
            return node
        make: Callable[[Any], Any] = {"array": self._array, "map": self._map}.get(next(iter(node)), self._record)
        return make(node)

    def _map(self, node: Any) -> dict[str, Any]:
        return {key: self.value(item) for key, item in node["map"]}

    def _record(self, node: Any) -> Any:
        kind = _KNOWN[node["record"]]
        return kind(**{name: self.value(item) for name, item in node["fields"].items()})

    def _array(self, node: Any) -> NDArray[Any]:
        name, shape, place = node["array"]
        dtype = np.dtype(name)
        if dtype.kind not in _KINDS or place < 0 or min(shape, default=0) < 0:
            raise ValueError("not an array of this program")
        count = int(np.prod(shape, dtype=np.int64))
        return np.frombuffer(self._data, dtype, count, self._start + place).reshape(shape)


def _checked_key(key: Any) -> str:
    if not isinstance(key, str):
        raise TypeError(f"a mapping with a {type(key).__name__} as key cannot be stored in the cache")
    return key
