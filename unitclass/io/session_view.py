"""A session's results as the review reads them: a light list at once, each unit when asked for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from unitclass.records import ConditionResult, SessionResult, UnitResult

N_RANKED = 9
"""Alternatives that the queue keeps: as many as there are digits to take one with."""


@dataclass(frozen=True)
class LightUnit:
    """What the queue shows of one unit in one condition.

    `ranked` is (type, probability) of the N_RANKED most probable types; `UnitResult` has them all.
    """

    unit: str
    condition: str
    digest: str
    suggested_type: str
    ranked: tuple[tuple[str, float], ...]
    n_cycles: int
    n_spikes: int
    regime: str
    shape_group: str
    flags: tuple[str, ...]
    columns: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class SessionHead:
    """Whose results these are, and under what they were made."""

    path: str
    session: str
    identifier: str
    object_id: str
    animal: str
    settings_digest: str
    template_digest: str


class SessionView(Protocol):
    """Results of one session, in memory or in the cache."""

    @property
    def head(self) -> SessionHead:
        """Return whose results these are."""
        ...

    @property
    def units(self) -> tuple[LightUnit, ...]:
        """Return the light list, in the order of the results."""
        ...

    def unit_result(self, unit: str, condition: str) -> UnitResult:
        """Return all about a unit; raises KeyError for an unknown one."""
        ...

    def condition_result(self, condition: str, *, with_envelopes: bool = True) -> ConditionResult:
        """Return a condition without its units; raises KeyError for an unknown one."""
        ...

    def session_result(self) -> SessionResult:
        """Return everything."""
        ...

    def rates_hz(self) -> NDArray[np.float32]:
        """Return the rates by phase of all units, shape (n_units, n_bins), in the order of `units`."""
        ...


class MemorySession:
    """A session view over results in memory."""

    def __init__(self, result: SessionResult) -> None:
        self._result = result
        self._units = {unit.key: unit for _, unit in result.units()}
        self._conditions = {c.condition.name: c for c in result.conditions}
        self.head = head_of(result)
        self.units = light_units(result)

    def unit_result(self, unit: str, condition: str) -> UnitResult:
        """Return all about a unit."""
        return self._units[unit, condition]

    def condition_result(self, condition: str, *, with_envelopes: bool = True) -> ConditionResult:
        """Return a condition without its units."""
        found = replace(self._conditions[condition], units=())
        return found if with_envelopes else without_envelopes(found)

    def session_result(self) -> SessionResult:
        """Return everything."""
        return self._result

    def rates_hz(self) -> NDArray[np.float32]:
        """Return the rates by phase of all units, shape (n_units, n_bins)."""
        return rates_of(self._result)


def without_envelopes(condition: ConditionResult) -> ConditionResult:
    """Return the condition without its nerves' traces, which are most of its size."""
    return replace(condition, nerve_cycles=replace(condition.nerve_cycles, envelopes=()))


def head_of(result: SessionResult) -> SessionHead:
    """Return the head of a session's results."""
    return SessionHead(result.path, result.session, result.identifier, result.object_id, result.animal,
                       result.settings_digest, result.template_digest)


def light_units(result: SessionResult) -> tuple[LightUnit, ...]:
    """Return the light list of a session's results."""
    return tuple(LightUnit(u.unit, u.condition, u.digest, u.suggestion.type, u.suggestion.ranked[:N_RANKED],
                           u.n_cycles, u.n_spikes, c.regime, u.shape_group, u.flags, dict(u.columns))
                 for c, u in result.units())


def rates_of(result: SessionResult) -> NDArray[np.float32]:
    """Return rates by phase, shape (n_units, n_bins), spikes/s; NaN where nothing was observed."""
    rows = [unit.histogram.rate_hz for _, unit in result.units()]
    n_bins = max((row.size for row in rows), default=0)
    rates = np.full((len(rows), n_bins), np.nan, dtype=np.float32)
    for i, row in enumerate(rows):
        rates[i, : row.size] = row
    return rates
