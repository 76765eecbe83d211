"""Spike trains from curves: gain that wanders, refractoriness, doublets, sorting errors."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from math import exp

import numpy as np
from numpy.typing import NDArray

from unitclass.records import FloatArray
from unitclass.simulate.breathing import Breaths, phase_at
from unitclass.simulate.curves import TYPES, Curve, hurried, level_at, turned, varied

STEP_S = 0.002
LOCKED_IN_TIME = ("pre-I", "I-E", "post-I", "bi-E", "late-E")
PEAK_HZ: Mapping[str, tuple[float, float]] = {
    "pre-I": (15, 45), "early-I": (20, 80), "ramp-I": (30, 90), "late-I": (25, 70), "con-I": (15, 50),
    "I-E": (25, 70), "post-I": (20, 90), "aug-E": (25, 80), "con-E": (12, 40), "late-E": (25, 60),
    "dec-E": (15, 50), "bi-E": (20, 50), "tonic": (8, 35), "NRM": (3, 20), "silent": (0, 0),
}


@dataclass(frozen=True)
class Cell:
    """One cell: a curve, a peak rate and a skipping per condition, and how it fires.

    `every` is 1 for a cell that takes part in each breath, 2 for every second one; `dead_s` and
    `recovery_s` are absolute and relative refractoriness; `doublets` the share of spikes with a second
    one close behind; `gain_cv` and `drift` how its excitability wanders; `resting_hz` is its rate
    while nothing breathes.
    """

    curves: Sequence[Curve]
    peak_hz: Sequence[float]
    every: Sequence[int]
    gain_cv: float
    drift: float
    dead_s: float
    recovery_s: float
    doublets: float
    resting_hz: float = 0.0


def cell_of(types: Sequence[str], every: Sequence[int], rng: np.random.Generator, *,
            hurry: float = 1.0) -> Cell:
    """Draw a cell that is of `types[c]` in condition c; the same type keeps its curve and rate.

    `hurry` draws firing around the burst closer to it (see `curves.hurried`).
    """
    shapes: dict[str, tuple[Curve, float]] = {}
    for name in types:
        if name not in shapes:
            low, high = PEAK_HZ[name]
            shapes[name] = (_curve(name, hurry, rng), float(rng.uniform(low, high)))
    return Cell(curves=[shapes[n][0] for n in types], peak_hz=[shapes[n][1] for n in types], every=every,
                gain_cv=float(rng.uniform(0.08, 0.3)), drift=float(rng.uniform(-0.3, 0.3)),
                dead_s=float(rng.uniform(0.0015, 0.003)), recovery_s=float(rng.uniform(0.001, 0.006)),
                doublets=float(rng.choice([0.0, 0.0, 0.05])),
                resting_hz=0.6 * shapes[types[0]][1] if types[0] in ("tonic", "NRM") else 0.0)


def train_of(cell: Cell, breaths: Breaths, stop_s: float, rng: np.random.Generator) -> FloatArray:
    """Return the cell's spike times from 0 to `stop_s`, ascending, shape (n_spikes,)."""
    return spikes(rate_of(cell, breaths, stop_s, rng), STEP_S, rng, dead_s=cell.dead_s,
                  recovery_s=cell.recovery_s, doublets=cell.doublets)


def rate_of(cell: Cell, breaths: Breaths, stop_s: float, rng: np.random.Generator) -> FloatArray:
    """Return the cell's firing rate in spikes/s on a grid of `STEP_S`, shape (n_samples,)."""
    times = np.arange(0, stop_s, STEP_S)
    phase, breath = phase_at(breaths, times)
    gain = _gain(cell, breaths, times, rng)
    rate = np.zeros(times.size)
    condition = breaths.condition[breath]
    for c, (curve, peak, every) in enumerate(zip(cell.curves, cell.peak_hz, cell.every, strict=True)):
        here = (breath >= 0) & (condition == c)
        takes_part = breath[here] % every == 0
        rate[here] = peak * level_at(curve, phase[here]) * gain[here] * takes_part
    rate[breath < 0] = cell.resting_hz
    return rate


def spikes(rate_hz: FloatArray, step_s: float, rng: np.random.Generator, *, dead_s: float, recovery_s: float,
           doublets: float) -> FloatArray:
    """Draw spike times by thinning a Poisson process with the cell's recovery from its last spike.

    Nothing fires within `dead_s` of a spike; afterwards the chance recovers exponentially. The rate of
    candidates is raised so that the mean rate stays what was asked for.
    """
    lost = np.minimum(rate_hz * (dead_s + recovery_s), 0.8)
    counts = rng.poisson(rate_hz / (1 - lost) * step_s)
    times = np.repeat(np.arange(rate_hz.size) * step_s, counts)
    times = np.sort(times + rng.uniform(0, step_s, times.size))
    kept: list[float] = []
    last = -np.inf
    for t, u, pair in zip(times.tolist(), rng.uniform(size=times.size).tolist(),
                          (rng.uniform(size=times.size) < doublets).tolist(), strict=True):
        wait = t - last - dead_s
        if wait > 0 and u < 1 - exp(-wait / recovery_s):
            kept.append(t)
            last = t
            if pair:
                last = t + dead_s + float(rng.uniform(0.0005, 0.003))
                kept.append(last)
    return np.array(kept, dtype=float)


def missorted(trains: Sequence[FloatArray], rng: np.random.Generator) -> list[FloatArray]:
    """Return the trains as a sorter would: some spikes missed, some of a neighbour's mixed in."""
    return [_missorted(train, trains[int(rng.integers(len(trains)))], rng) for train in trains]


def _missorted(train: FloatArray, neighbour: FloatArray, rng: np.random.Generator) -> FloatArray:
    kept = train[rng.uniform(size=train.size) >= rng.uniform(0, 0.08)]
    neighbour = neighbour[_is_near(neighbour, kept)]
    n = min(neighbour.size, round(kept.size * rng.uniform(0, 0.03)))
    foreign = rng.choice(neighbour, n, replace=False) if n else np.zeros(0)
    return np.unique(np.concatenate([kept, foreign]))


def _is_near(times_s: FloatArray, train: FloatArray, within_s: float = 3.0) -> NDArray[np.bool_]:
    """Tell which times have a spike of the train close by: a sorter mixes up only cells that fire."""
    first = np.searchsorted(train, times_s - within_s)
    return np.searchsorted(train, times_s + within_s) > first


def _curve(name: str, hurry: float, rng: np.random.Generator) -> Curve:
    if name in ("NRM", "silent"):
        return TYPES[name]
    if name == "tonic":
        return turned(TYPES[name], float(rng.uniform(0, 2)))
    if name in LOCKED_IN_TIME:
        return hurried(varied(TYPES[name], rng), hurry)
    return varied(TYPES[name], rng)


def _gain(cell: Cell, breaths: Breaths, times_s: FloatArray, rng: np.random.Generator) -> FloatArray:
    """Return a factor about one that moves smoothly from breath to breath and drifts."""
    n = breaths.n_breaths
    walk = np.zeros(n)
    for i in range(1, n):
        walk[i] = 0.5 * walk[i - 1] + np.sqrt(0.75) * rng.standard_normal()
    drift = 1 + cell.drift * np.linspace(-0.5, 0.5, n)
    middles = (breaths.onset_s + breaths.end_s) / 2
    return np.interp(times_s, middles, np.exp(cell.gain_cv * walk - cell.gain_cv**2 / 2) * drift)
