"""Shape groups over all units of many sessions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from unitclass.classify.clustering import ShapeGroups, shape_groups
from unitclass.records import SessionResult, UnitResult


def grouped(results: Sequence[SessionResult]) -> tuple[tuple[SessionResult, ...], ShapeGroups]:
    """Return the sessions with the shape group of each unit and condition, and the groups.

    Units that are silent or undetermined belong to no group.
    """
    chosen = [(i, unit) for i, result in enumerate(results) for _, unit in result.units()
              if unit.suggestion.probabilities]
    groups = _groups([unit for _, unit in chosen])
    names = {(i, unit.key): name for (i, unit), name in zip(chosen, groups.names, strict=True)}
    return tuple(_named(i, result, names) for i, result in enumerate(results)), groups


def _groups(units: Sequence[UnitResult]) -> ShapeGroups:
    if not units:
        return shape_groups(np.zeros((0, 1)), np.zeros((0, 1)), ())
    return shape_groups(np.stack([unit.histogram.counts for unit in units]),
                        np.stack([unit.histogram.exposure_s for unit in units]),
                        [unit.suggestion.type for unit in units])


def _named(i: int, result: SessionResult, names: dict[tuple[int, tuple[str, str]], str]) -> SessionResult:
    conditions = tuple(
        replace(c, units=tuple(replace(u, shape_group=names.get((i, u.key), "")) for u in c.units))
        for c in result.conditions)
    return replace(result, conditions=conditions)
