"""A whole simulated session: nerves, units, perhaps an impaled cell, and the truth."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from unitclass.errors import UsageError
from unitclass.records import Condition, Exclusion, FloatArray
from unitclass.simulate.breathing import Breaths, breathe, join
from unitclass.simulate.firing import cell_of, missorted, train_of
from unitclass.simulate.membrane import CELLS, MembraneTrace, impale
from unitclass.simulate.nerves import NerveTrace, record
from unitclass.simulate.scenario import KINDS, SCENARIOS, Scenario

QUIET_S = 1.5


@dataclass(frozen=True)
class SimulatedUnit:
    """A sorted unit; `types` maps each condition's name to the type that it is there."""

    id: int
    spike_times_s: FloatArray
    types: Mapping[str, str]
    region: str
    depth_um: float
    details: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class SimulatedSession:
    """What `write_session` writes, and what is true of it.

    `breaths` are the true cycles; `conditions` cover them; `is_labelled` says whether the file
    names its conditions (a session with a single one need not).
    """

    kind: str
    seed: int
    scenario: Scenario
    stop_s: float
    breaths: Breaths
    conditions: tuple[Condition, ...]
    exclusions: tuple[Exclusion, ...]
    nerves: tuple[NerveTrace, ...]
    units: tuple[SimulatedUnit, ...] = ()
    membrane: MembraneTrace | None = None

    @property
    def stem(self) -> str:
        """Return the file name without its ending."""
        return self.scenario.stem

    def truth(self) -> list[dict[str, str]]:
        """Return a row per unit and condition: unit, condition, type, detail."""
        rows = [{"unit": str(u.id), "condition": name, "type": type_, "detail": u.details.get(name, "")}
                for u in self.units for name, type_ in u.types.items()]
        if self.membrane is not None:
            cell = self.membrane
            rows += [{"unit": cell.cell_id, "condition": c.name, "type": cell.type, "detail": ""}
                     for c in self.conditions]
        return rows


def simulate_session(kind: str, *, seed: int, seconds: float = 0.0, n_units: int = 0,
                     raw_rate_hz: float = 0.0, cell: str = "", stem: str = "") -> SimulatedSession:
    """Simulate a session of this kind with known answers.

    Parameters
    ----------
    kind : str
        One of `KINDS`.
    seed : int
        The same seed gives the same session.
    seconds : float
        Length of each condition; 0 keeps the scenario's own.
    n_units : int
        Number of units, the scenario's cells over and over; 0 keeps its own number.
    raw_rate_hz : float
        Sampling rate of raw nerves; 0 keeps the scenario's own.
    cell : str
        Type of the impaled cell of an intracellular session, one of `membrane.CELLS`.
    stem : str
        File name without its ending; the scenario's own when empty.

    Raises
    ------
    UsageError
        For a kind or cell that is not known, or numbers that make no session.
    """
    scenario = _adapted(_checked_kind(kind), _checked_number("seconds", seconds),
                        int(_checked_number("n_units", n_units)),
                        _checked_number("raw_rate_hz", raw_rate_hz), _checked_cell(cell), stem)
    rng = np.random.default_rng([seed, KINDS.index(kind)])
    breaths, conditions, exclusions, stop_s = _timeline(scenario, rng)
    nerves = tuple(record(wire, breaths, stop_s, rng) for wire in scenario.wires)
    units = _units(scenario, breaths, conditions, stop_s, rng)
    membrane = impale(scenario.stem, scenario.impaled, breaths, stop_s, rng) if scenario.impaled else None
    return SimulatedSession(kind, seed, scenario, stop_s, breaths, conditions, exclusions, nerves, units,
                            membrane)


def _timeline(scenario: Scenario, rng: np.random.Generator
              ) -> tuple[Breaths, tuple[Condition, ...], tuple[Exclusion, ...], float]:
    parts, conditions, exclusions = [], [], []
    now = 0.0
    for i, stretch in enumerate(scenario.stretches):
        if stretch.gap_s:
            exclusions += [Exclusion(0.3 * now, 0.3 * now + 4.0, "nerve moistened"),
                           Exclusion(now, now + stretch.gap_s, "operation")]
        start = now + stretch.gap_s
        now = start + stretch.seconds
        conditions.append(Condition(stretch.label, start, now, stretch.label))
        parts.append(breathe(stretch.pattern, start + QUIET_S * rng.uniform(0.3, 1), now, rng, condition=i))
    if any(part.n_breaths == 0 for part in parts):
        raise UsageError("no whole breath fits", where="seconds", remedy="make each condition longer")
    return join(parts), tuple(conditions), tuple(exclusions), now


def _units(scenario: Scenario, breaths: Breaths, conditions: tuple[Condition, ...], stop_s: float,
           rng: np.random.Generator) -> tuple[SimulatedUnit, ...]:
    named = [[name.partition("/")[::2] for name in cell] for cell in scenario.cells]
    cells = [cell_of([name for name, _ in cell], [int(n or 1) for _, n in cell], rng, hurry=scenario.hurry)
             for cell in named]
    trains = missorted([train_of(cell, breaths, stop_s, rng) for cell in cells], rng)
    return tuple(
        SimulatedUnit(id=i, spike_times_s=np.unique(np.round(train * 30000)) / 30000,
                      types={c.name: name for c, (name, _) in zip(conditions, cell, strict=True)},
                      region=str(rng.choice(scenario.regions)),
                      depth_um=float(np.round(rng.uniform(250, 1900), -1)),
                      details={c.name: f"{n}:1" for c, (_, n) in zip(conditions, cell, strict=True) if n})
        for i, (train, cell) in enumerate(zip(trains, named, strict=True)))


def _adapted(scenario: Scenario, seconds: float, n_units: int, raw_rate_hz: float, cell: str,
             stem: str) -> Scenario:
    """Return the scenario with what the caller asked to be otherwise."""
    stretches = tuple(replace(s, seconds=seconds or s.seconds) for s in scenario.stretches)
    wires = tuple(w if w.is_integrated else replace(w, rate_hz=raw_rate_hz or w.rate_hz)
                  for w in scenario.wires)
    cells = scenario.cells
    if n_units and cells:
        cells = tuple(cells[i % len(cells)] for i in range(n_units))
    return replace(scenario, stretches=stretches, wires=wires, cells=cells, stem=stem or scenario.stem,
                   impaled=cell if cell and scenario.impaled else scenario.impaled)


def _checked_kind(kind: str) -> Scenario:
    if kind not in SCENARIOS:
        raise UsageError(f"{kind!r} is no kind of session", where="simulate",
                         remedy="use one of " + ", ".join(KINDS))
    return SCENARIOS[kind]


def _checked_cell(cell: str) -> str:
    if cell and cell not in CELLS:
        raise UsageError(f"{cell!r} cannot be impaled", where="cell", remedy="use one of " + ", ".join(CELLS))
    return cell


def _checked_number(name: str, value: float) -> float:
    if not 0 <= value < 1e6:
        raise UsageError(f"{value!r} makes no session", where=name, remedy="give 0 or more")
    return float(value)
