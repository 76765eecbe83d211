"""How far reviewers agree, condition by condition, and which units they should discuss."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from unitclass.io.decisions import DecisionStore
from unitclass.io.standing import latest_digests, opinions, standing_labels
from unitclass.io.store_records import BATCH, BLIND
from unitclass.records import Decision, IntArray, Label
from unitclass.review.kappa import Kappa, cohen_kappa, fleiss_kappa


@dataclass(frozen=True)
class RatedUnit:
    """A unit in a condition with each reviewer's newest opinion and the label that stands."""

    path: str
    unit: str
    condition: str
    opinions: tuple[Decision, ...]
    label: Label | None = None

    @property
    def is_disputed(self) -> bool:
        """Return whether the reviewers gave different types."""
        return len({opinion.type for opinion in self.opinions}) > 1

    @property
    def is_settled(self) -> bool:
        """Return whether one label stands all the same."""
        return self.is_disputed and self.label is not None and bool(self.label.type)


@dataclass(frozen=True)
class Confusion:
    """Units by the first reviewer's type (rows) and the second's (columns).

    `counts` has shape (n_types, n_types).
    """

    first: str
    second: str
    types: tuple[str, ...]
    counts: IntArray


@dataclass(frozen=True)
class PairAgreement:
    """Two reviewers in one condition.

    `n_unseen` of the units were accepted by at least one of them in a batch, `n_blind` judged by
    both without sight of the suggestion: agreement through a common suggestion is none.
    """

    condition: str
    confusion: Confusion
    kappa: Kappa
    n_unseen: int
    n_blind: int


@dataclass(frozen=True)
class GroupAgreement:
    """More than two reviewers in one condition, over the units that all of them judged."""

    condition: str
    reviewers: tuple[str, ...]
    kappa: Kappa


@dataclass(frozen=True)
class AgreementReport:
    """All pairs, all groups, and the units to discuss, those nobody settled first."""

    reviewers: tuple[str, ...]
    pairs: tuple[PairAgreement, ...]
    groups: tuple[GroupAgreement, ...]
    discuss: tuple[RatedUnit, ...]


@dataclass(frozen=True)
class StoredSession:
    """A session to look up; without `digests` each unit's newest labelled spike train counts."""

    path: str
    identifier: str
    object_id: str
    digests: Mapping[str, str] | None = None


def rated_units(store: DecisionStore, sessions: Iterable[StoredSession]) -> tuple[RatedUnit, ...]:
    """Return every unit of the sessions that anybody decided on; raises TargetError, FileError."""
    return tuple(unit for session in sessions for unit in _rated(store, session))


def _rated(store: DecisionStore, session: StoredSession) -> Iterable[RatedUnit]:
    log = store.read(session.identifier, session.object_id)
    digests = latest_digests(log) if session.digests is None else session.digests
    labels = standing_labels(log, session.object_id, digests)
    for (unit, condition), given in opinions(log, digests).items():
        yield RatedUnit(session.path, unit, condition, given, labels.get((unit, condition)))


def agreement(units: Sequence[RatedUnit]) -> AgreementReport:
    """Compare all reviewers, condition by condition; conditions are never pooled."""
    reviewers = tuple(sorted({opinion.reviewer for unit in units for opinion in unit.opinions}))
    conditions = dict.fromkeys(unit.condition for unit in units)
    by_condition = {name: [unit for unit in units if unit.condition == name] for name in conditions}
    pairs = [_pair(name, first, second, listed) for name, listed in by_condition.items()
             for first, second in combinations(reviewers, 2)]
    groups = [_group(name, reviewers, listed) for name, listed in by_condition.items()] if len(reviewers) > 2 else []
    disputed = sorted((unit for unit in units if unit.is_disputed), key=lambda unit: unit.is_settled)
    return AgreementReport(reviewers, tuple(p for p in pairs if p.kappa.n_units),
                           tuple(g for g in groups if g.kappa.n_units), tuple(disputed))


def confusion(first: str, second: str, types: Iterable[tuple[str, str]]) -> Confusion:
    """Count pairs of types, the first reviewer's before the second's."""
    pairs = list(types)
    names = tuple(sorted({name for pair in pairs for name in pair}))
    place = {name: i for i, name in enumerate(names)}
    counts = np.zeros((len(names), len(names)), dtype=np.int64)
    for a, b in pairs:
        counts[place[a], place[b]] += 1
    return Confusion(first, second, names, counts)


def _pair(condition: str, first: str, second: str, units: Sequence[RatedUnit]) -> PairAgreement:
    both = [(given[first], given[second]) for given in map(_by_reviewer, units)
            if first in given and second in given]
    table = confusion(first, second, [(a.type, b.type) for a, b in both])
    return PairAgreement(condition, table, cohen_kappa(table.counts),
                         n_unseen=sum(BATCH in (a.how, b.how) for a, b in both),
                         n_blind=sum(a.how == b.how == BLIND for a, b in both))


def _group(condition: str, reviewers: tuple[str, ...], units: Sequence[RatedUnit]) -> GroupAgreement:
    common = [given for given in map(_by_reviewer, units) if len(given) == len(reviewers)]
    types = sorted({opinion.type for given in common for opinion in given.values()})
    counts = [[sum(opinion.type == name for opinion in given.values()) for name in types] for given in common]
    return GroupAgreement(condition, reviewers, fleiss_kappa(np.reshape(counts, (len(common), len(types)))))


def _by_reviewer(unit: RatedUnit) -> dict[str, Decision]:
    return {opinion.reviewer: opinion for opinion in unit.opinions}
