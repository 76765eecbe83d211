"""Shape groups over all units of many sessions."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.classify.clustering import ShapeGroups, shape_groups
from unitclass.records import FloatArray, SessionResult


@dataclass(frozen=True)
class ShapedRow:
    """The rates by phase of one unit in one condition, and the row of a table that it belongs to."""

    row: int
    rate_hz: FloatArray
    type: str


def shaped_rows(result: SessionResult, *, first: int = 0) -> Iterator[ShapedRow]:
    """Yield the units of a session that have a shape: silent and undetermined ones have none.

    `first` is the row of the session's first unit.
    """
    for i, (_, unit) in enumerate(result.units()):
        if unit.suggestion.probabilities:
            yield ShapedRow(first + i, unit.histogram.rate_hz, unit.suggestion.type)


def groups_of(shapes: Sequence[ShapedRow]) -> ShapeGroups:
    """Return the shape groups; their names are in the order of `shapes`."""
    rate_hz = np.stack([s.rate_hz for s in shapes]) if shapes else np.zeros((0, 1))
    return shape_groups(rate_hz, [s.type for s in shapes])
