"""Shape groups over all units of many sessions."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.classify.clustering import ShapeGroups, shape_groups
from unitclass.records import FloatArray, SessionResult


@dataclass(frozen=True)
class ShapedRow:
    """The shape of one unit in one condition, and the row of a table that it belongs to."""

    row: int
    counts: FloatArray
    exposure_s: FloatArray
    type: str


def shaped_rows(result: SessionResult, *, first: int = 0) -> Iterator[ShapedRow]:
    """Yield the units of a session that have a shape: silent and undetermined ones have none.

    `first` is the row of the session's first unit.
    """
    for i, (_, unit) in enumerate(result.units()):
        if unit.suggestion.probabilities:
            yield ShapedRow(first + i, unit.histogram.counts, unit.histogram.exposure_s, unit.suggestion.type)


def groups_of(shapes: Sequence[ShapedRow]) -> ShapeGroups:
    """Return the shape groups; their names are in the order of `shapes`."""
    if not shapes:
        return shape_groups(np.zeros((0, 1)), np.zeros((0, 1)), ())
    return shape_groups(np.stack([s.counts for s in shapes]), np.stack([s.exposure_s for s in shapes]),
                        [s.type for s in shapes])
