"""A session's results cut into the pieces that the cache keeps, each read alone."""

from __future__ import annotations

import json
import zlib
from collections.abc import Iterator
from dataclasses import astuple, replace
from typing import Any

from unitclass.io.codec import decoded, encoded
from unitclass.io.session_view import (
    LightUnit,
    SessionHead,
    head_of,
    light_units,
    rates_of,
    without_envelopes,
)
from unitclass.io.store_text import storable
from unitclass.records import SessionResult

Piece = tuple[str, str, str, bytes]
"""(kind, unit, condition, content)."""

HEAD, LIGHT, RATES, SESSION, CONDITION, ENVELOPES, UNIT = (
    "head", "light", "rates", "session", "condition", "envelopes", "unit")


def pieces_of(result: SessionResult) -> Iterator[Piece]:
    """Yield the pieces of a session's results."""
    yield HEAD, "", "", packed_text(astuple(head_of(result)))
    yield LIGHT, "", "", packed_text([_light_row(unit) for unit in light_units(result)])
    yield RATES, "", "", packed(rates_of(result))
    yield SESSION, "", "", packed(replace(result, conditions=()))
    for condition in result.conditions:
        name = storable(condition.condition.name)
        bare = replace(condition, units=())
        yield CONDITION, "", name, packed(without_envelopes(bare))
        yield ENVELOPES, "", name, packed(condition.nerve_cycles.envelopes)
        for unit in condition.units:
            yield UNIT, storable(unit.unit), name, packed(unit)


def packed(value: Any) -> bytes:
    """Return a record, or a tuple of records, as compressed bytes with a checksum."""
    return zlib.compress(encoded(value), 1)


def unpacked(content: bytes) -> Any:
    """Return what was packed; raises ValueError when the bytes are damaged."""
    return decoded(_inflated(content))


def packed_text(value: Any) -> bytes:
    """Return plain lists, text and numbers as compressed bytes."""
    return zlib.compress(json.dumps(value, separators=(",", ":")).encode(), 1)


def head_from(content: bytes, path: str) -> SessionHead:
    """Return the head, under the path that the user gave; raises ValueError."""
    head = SessionHead(*json.loads(_inflated(content)))
    return replace(head, path=path)


def light_from(content: bytes) -> tuple[LightUnit, ...]:
    """Return the light list; raises ValueError."""
    return tuple(LightUnit(unit, condition, digest, kind, tuple(map(tuple, ranked)), n_cycles, n_spikes, regime,
                           group, tuple(flags), columns)
                 for (unit, condition, digest, kind, ranked, n_cycles, n_spikes, regime, group, flags,
                      columns) in json.loads(_inflated(content)))


def _light_row(unit: LightUnit) -> list[Any]:
    return [unit.unit, unit.condition, unit.digest, unit.suggested_type, unit.ranked, unit.n_cycles,
            unit.n_spikes, unit.regime, unit.shape_group, unit.flags, dict(unit.columns)]


def _inflated(content: bytes) -> bytes:
    try:
        return zlib.decompress(content)
    except zlib.error as error:
        raise ValueError(f"damaged: {error}") from error
