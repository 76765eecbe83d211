"""What becomes of each unit from one condition to the next."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise

from unitclass.records import Label, SessionResult, UnitResult

UnitLabels = Mapping[tuple[str, str], Label]


@dataclass(frozen=True)
class TypeChange:
    """One unit's type in two conditions that follow each other.

    A type is what a person decided or, where nobody did, the suggestion.
    """

    file: str
    session: str
    animal: str
    unit: str
    condition_before: str
    condition_after: str
    type_before: str
    type_after: str
    probability_before: float
    probability_after: float


@dataclass(frozen=True)
class ChangeCount:
    """How many units of one animal went from one type to another; an empty animal is all of them."""

    animal: str
    condition_before: str
    condition_after: str
    type_before: str
    type_after: str
    n_units: int


def type_of(unit: UnitResult, labels: UnitLabels) -> str:
    """Return what a person decided, else the suggestion."""
    label = labels.get(unit.key)
    return label.type if label is not None and label.type else unit.suggestion.type


def type_changes(result: SessionResult, labels: UnitLabels) -> tuple[TypeChange, ...]:
    """Return every unit's step from each condition to the next, in the order of the recording."""
    order = [c.condition.name for c in sorted(result.conditions, key=lambda c: c.condition.start_s)]
    by_unit: dict[str, dict[str, tuple[str, float]]] = {}
    for _, unit in result.units():
        named = type_of(unit, labels)
        by_unit.setdefault(unit.unit, {})[unit.condition] = (named, unit.suggestion.probabilities.get(named, float("nan")))
    return tuple(
        TypeChange(result.path, result.session, result.animal, unit, before, after, *_pair(types[before], types[after]))
        for unit, types in by_unit.items() for before, after in pairwise(order) if before in types and after in types)


def _pair(before: tuple[str, float], after: tuple[str, float]) -> tuple[str, str, float, float]:
    return before[0], after[0], before[1], after[1]


def change_counts(changes: Iterable[TypeChange]) -> tuple[ChangeCount, ...]:
    """Count the steps per animal, the commonest first within each."""
    found = Counter((c.animal, c.condition_before, c.condition_after, c.type_before, c.type_after) for c in changes)
    ordered: Sequence[tuple[tuple[str, str, str, str, str], int]] = sorted(
        found.items(), key=lambda item: (item[0][:3], -item[1], item[0][3:]))
    return tuple(ChangeCount(*key, n) for key, n in ordered)
