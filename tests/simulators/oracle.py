"""An observer who knows the families that a simulator draws from: the mark to be measured against.

It draws many units of each type from the simulator itself, reduces each to the profile that a
recording would show, and weighs a new unit's counts against all of them:

    p(type | counts) ∝ mean over the type's draws of exp( Σ_b n_b log p_b / (φ + N / κ) )

n_b are counts in phase bins of the first and of the second half of the session (so that a cell
that wanders is told from one that does not), φ is the unit's own over-dispersion and κ says after how
many spikes a profile stops adding evidence; κ is chosen on units of the simulator that are used for
nothing else.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from types import ModuleType

import numpy as np

from tests.simulators import integrate_fire, rates, resampled
from tests.simulators.common import TYPES, Clock, SimUnits, clock, worn
from unitclass.records import OTHER, Cycles, FloatArray, IntArray

N_BINS = 40
N_SHAPE = 10
KAPPAS = (30.0, 100.0, 300.0, 1000.0, 3000.0, 10000.0)
SIMULATORS: dict[str, ModuleType] = {"rates": rates, "integrate-fire": integrate_fire, "resampled": resampled}


@dataclass(frozen=True)
class Oracle:
    """Profiles of many draws; `log_p` has shape (n_draws, 2 N_BINS), `owner` the index of their type."""

    types: tuple[str, ...]
    log_p: FloatArray
    owner: IntArray
    kappa: float

    def posterior(self, trains: Sequence[FloatArray], cycles: Cycles) -> FloatArray:
        """Return the probability of each type, shape (n_units, n_types); rows sum to one."""
        counts = np.stack([halves(train, cycles) for train in trains])
        scale = np.array([dispersion(train, cycles) for train in trains]) + counts.sum(axis=1) / self.kappa
        log_like = (counts / scale[:, None]) @ self.log_p.T
        top = log_like.max(axis=1, keepdims=True)
        like = np.exp(log_like - top)
        evidence = np.stack([like[:, self.owner == k].mean(axis=1) for k in range(len(self.types))], axis=1)
        return evidence / evidence.sum(axis=1, keepdims=True)

    def names(self, trains: Sequence[FloatArray], cycles: Cycles) -> list[str]:
        """Return the most probable type of each train."""
        return [self.types[k] for k in self.posterior(trains, cycles).argmax(axis=1)]


def oracle(simulator: str, cycles: Cycles, regime: str, rng: np.random.Generator, *, n_draws: int = 600,
           hardness: float = 1.0, peak_hz: tuple[float, float] = (3.0, 100.0)) -> Oracle:
    """Return the oracle of one of SIMULATORS for units on these cycles.

    `n_draws` is per type; integrate-and-fire cells, which cost more, get a third.
    """
    types = (*TYPES[regime], OTHER)
    module = SIMULATORS[simulator]
    made = (_from_cells(types, cycles, regime, hardness, rng, n_draws // 3) if module is integrate_fire
            else _from_forms(module, types, cycles, regime, hardness, rng, n_draws))
    log_p = np.log(np.concatenate([made[name] for name in types]))
    owner = np.repeat(np.arange(len(types)), [len(made[name]) for name in types])
    blank = Oracle(types, log_p, owner, KAPPAS[0])
    asked = {} if module is integrate_fire else {"peak_hz": peak_hz}
    units = module.simulate(12, regime=regime, rng=rng, cycles=cycles, hardness=hardness, **asked)
    return _with_best_kappa(blank, units)


def _with_best_kappa(blank: Oracle, units: SimUnits) -> Oracle:
    truth = np.array([blank.types.index(name) for name in units.types])

    def score(kappa: float) -> float:
        p = replace(blank, kappa=kappa).posterior(units.trains, units.cycles)
        return float(np.log(np.maximum(p[np.arange(truth.size), truth], 1e-9)).mean())
    return replace(blank, kappa=max(KAPPAS, key=score))


# ------------------------------------------------------------------------------ counting

def halves(train: FloatArray, cycles: Cycles, n_bins: int = N_BINS) -> FloatArray:
    """Return counts by phase bin in the first and the second half of the cycles, (2 n_bins,)."""
    cycle, phase = placed(train, cycles)
    half = (cycle >= cycles.n_cycles / 2).astype(int)
    where = half * n_bins + np.minimum((phase * n_bins / 2).astype(int), n_bins - 1)
    return np.bincount(where, minlength=2 * n_bins).astype(float)


def placed(train: FloatArray, cycles: Cycles) -> tuple[IntArray, FloatArray]:
    """Return the cycle and the canonical phase of the spikes that lie in a cycle."""
    k = np.searchsorted(cycles.onset_s, train, side="right") - 1
    inside = (k >= 0) & (train < cycles.end_s[k])
    t, k = train[inside], k[inside]
    offset = cycles.offset_s[k]
    phase = np.where(t < offset, (t - cycles.onset_s[k]) / cycles.ti_s[k], 1 + (t - offset) / cycles.te_s[k])
    return k, phase


def dispersion(train: FloatArray, cycles: Cycles) -> float:
    """Return how much wilder than Poisson the sharing out of a cycle's spikes over phase is, at least 1."""
    cycle, phase = placed(train, cycles)
    where = cycle * N_SHAPE + np.minimum((phase * N_SHAPE / 2).astype(int), N_SHAPE - 1)
    n = np.bincount(where, minlength=cycles.n_cycles * N_SHAPE).reshape(-1, N_SHAPE)
    share = n.sum(axis=0) / max(n.sum(), 1)
    expected = n.sum(axis=1, keepdims=True) * share
    used = expected > 0
    freedom = max((np.count_nonzero(n.sum(axis=1)) - 1) * (np.count_nonzero(share) - 1), 1)
    return max(1.0, float((((n - expected) ** 2)[used] / expected[used]).sum() / freedom))


# ----------------------------------------------------------------------------- profiles

def _from_forms(module: ModuleType, types: Sequence[str], cycles: Cycles, regime: str, hardness: float,
                rng: np.random.Generator, n_draws: int) -> dict[str, FloatArray]:
    at = clock(_fewer(cycles), 0.005)
    short = _fewer(cycles)
    return {name: np.stack([_expected(module, name, types, at, short, regime, hardness, rng)
                            for _ in range(n_draws)]) for name in types}


def _expected(module: ModuleType, name: str, types: Sequence[str], at: Clock, cycles: Cycles, regime: str,
              hardness: float, rng: np.random.Generator) -> FloatArray:
    """Return the share of spikes in each bin that a recording of a drawn unit would have."""
    wear = worn(rng, hardness=hardness)
    own = wear.background + (1 - wear.background) * module.form(name, at, regime, rng)
    foreign = np.ones(own.size)
    if rng.uniform() >= module.FLAT_FOREIGN:
        foreign = module.form(str(rng.choice(types[:-1])), at, regime, rng) + 1e-9
    rate = (1 - wear.foreign) * own / own.sum() + wear.foreign * foreign / foreign.sum()
    cycle, phase = placed(at.time_s + wear.shift_s + wear.jitter_s * rng.standard_normal(own.size), cycles)
    rate = rate[: cycle.size] if cycle.size < rate.size else rate
    where = (cycle >= cycles.n_cycles / 2) * N_BINS + np.minimum((phase * N_BINS / 2).astype(int), N_BINS - 1)
    return _shares(np.bincount(where.astype(int), weights=rate, minlength=2 * N_BINS), 1e-4)


def _from_cells(types: Sequence[str], cycles: Cycles, regime: str, hardness: float, rng: np.random.Generator,
                n_draws: int) -> dict[str, FloatArray]:
    units = integrate_fire.simulate(n_draws, regime=regime, rng=rng, cycles=cycles, hardness=hardness)
    made: dict[str, list[FloatArray]] = {name: [] for name in types}
    for name, train in zip(units.types, units.trains, strict=True):
        counts = _smoothed(halves(train, cycles))
        made[name].append(_shares(counts, 0.3 / max(counts.sum(), 1.0)))
    return {name: np.stack(rows) for name, rows in made.items()}


def _smoothed(counts: FloatArray) -> FloatArray:
    """Average neighbouring bins, never across a transition."""
    half = N_BINS // 2
    parts = [np.convolve(np.pad(counts[i : i + half], 1, mode="edge"), [0.25, 0.5, 0.25], "valid")
             for i in range(0, counts.size, half)]
    return np.concatenate(parts)


def _shares(weights: FloatArray, floor: float) -> FloatArray:
    p = weights / weights.sum() + floor
    return p / p.sum()


def _fewer(cycles: Cycles, n: int = 12) -> Cycles:
    """Return n cycles of the same durations, laid end to end."""
    rows = np.unique(np.linspace(0, cycles.n_cycles - 1, n).astype(int))
    ti, ttot = cycles.ti_s[rows], cycles.ttot_s[rows]
    marks = np.concatenate([[0.0], np.cumsum(ttot)])
    return Cycles.plain(marks[:-1], marks[:-1] + ti, marks[1:])
