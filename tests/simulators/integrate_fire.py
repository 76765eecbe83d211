"""Simulator (b): types emerge from leaky integrate-and-fire cells under synaptic drive.

No rate is written down. A cell has a leak, excitatory and inhibitory conductances that follow the
activity of a few presynaptic populations, spike-triggered adaptation and noise:

    tau dV/dt = (E_L - V) + g_e (E_e - V) + g_i (E_i - V) + w (E_K - V) + noise

Which populations excite and inhibit a type follows the trade's words (early-I: inhibited in both parts
of expiration, released at onset, adapting; post-I: inhibited in inspiration, adapting; and so on). What
comes out varies a great deal, so a cell is kept only when its own clean histogram is what the words say
(`definition.agrees`); the cells' numbers are redrawn until it is.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tests.simulators.common import (
    TYPES,
    Clock,
    SimUnits,
    Wear,
    breathing,
    clock,
    gains,
    preparation,
    recorded,
    worn,
)
from tests.simulators.definition import agrees, clean_profile
from unitclass.records import NOT_MODULATED, OTHER, Cycles, FloatArray

Rng = np.random.Generator
DT_S = 0.001
BLOCK = 4000
E_LEAK, E_EXC, E_INH, E_K, THRESHOLD = -60.0, 0.0, -75.0, -85.0, -50.0
PEAK_HZ = (2.5, 130.0)
N_VARIANTS = 4


def simulate(n_per_type: int, *, n_cycles: int = 60, regime: str = "three-phase", rng: Rng,
             types: Sequence[str] | None = None, hardness: float = 1.0, cycles: Cycles | None = None,
             with_other: bool = True) -> SimUnits:
    """Return up to `n_per_type` units of each type; see `rates.simulate` for the parameters.

    Peak rates are not asked for: they are what the cells do.
    """
    cycles = cycles if cycles is not None else breathing(n_cycles, preparation(regime, rng), rng)
    at = clock(cycles, DT_S)
    wanted = list(types) if types is not None else [*TYPES[regime], *([OTHER] if with_other else [])]
    found: dict[str, list[FloatArray]] = {name: [] for name in wanted}
    wears: dict[str, list[Wear]] = {name: [] for name in wanted}
    for _ in range(4):
        short = [name for name in wanted for _ in range(_ask(n_per_type - len(found[name])))]
        if not short:
            break
        wear = [worn(rng, hardness=hardness) for _ in short]
        for name, w, train in zip(short, wear, population(short, wear, at, cycles, regime, rng), strict=True):
            profile = clean_profile(train, cycles)
            is_usual = PEAK_HZ[0] < profile.max() < PEAK_HZ[1]
            if len(found[name]) < n_per_type and is_usual and agrees(name, profile):
                found[name].append(train)
                wears[name].append(w)
    return _recorded(wanted, found, wears, regime, cycles, rng)


def _ask(missing: int) -> int:
    # Each round costs about the same whatever the number of cells, so rounds are kept few.
    return 3 * missing + 4 if missing > 0 else 0


def _recorded(wanted: list[str], found: Mapping[str, list[FloatArray]], wears: Mapping[str, list[Wear]],
              regime: str, cycles: Cycles, rng: Rng) -> SimUnits:
    everyone = [train for trains in found.values() for train in trains if train.size > 10]
    trains, types = [], []
    for name in wanted:
        for train, wear in zip(found[name], wears[name], strict=True):
            neighbour = everyone[int(rng.integers(len(everyone)))]
            flat = rng.uniform(cycles.onset_s[0], cycles.end_s[-1], max(train.size, 10))
            trains.append(recorded(train, flat if rng.uniform() < 0.5 else neighbour, cycles, wear, rng))
            types.append(name)
    return SimUnits(trains, types, regime, cycles, [""] * len(trains))


# ------------------------------------------------------------------ presynaptic activity

Source = Callable[[Clock], FloatArray]


def sources(regime: str, te_s: float, rng: Rng) -> dict[str, list[Source]]:
    """Draw variants of each presynaptic population; each gives activity 0 to about 1 by time."""
    variants = [_one_of_each(regime, te_s, rng) for _ in range(N_VARIANTS)]
    return {name: [v[name] for v in variants] for name in variants[0]}


def _one_of_each(regime: str, te_s: float, rng: Rng) -> dict[str, Source]:
    lead_s = rng.uniform(0.3, 0.7) if regime == "one-phase" else rng.uniform(0.15, 0.35) * te_s
    post_s, rise = rng.uniform(0.15, 0.4) * min(te_s, 2.5), rng.uniform(0.7, 1.4)
    start, late_s = rng.uniform(0.05, 0.35), rng.uniform(0.12, 0.22) * te_s
    at, width = rng.uniform(0.3, 0.6), rng.uniform(0.08, 0.14)
    third = rng.uniform(0, 2 / 3)
    return {
        "tonic": lambda c: np.ones(c.time_s.size),
        "ramp": lambda c: np.nan_to_num(c.i) ** rise,
        "square-I": lambda c: np.where(np.isnan(c.i), 0.0, 1.0),
        "dec-I": lambda c: np.where(np.isnan(c.i), 0.0, np.exp(-2.5 * np.nan_to_num(c.i))),
        "pre": lambda c: np.where(np.isnan(c.i), np.clip(1 - c.to_onset_s / lead_s, 0, 1), 1.0),
        "square-E": lambda c: np.where(np.isnan(c.e), 0.0, 1.0),
        "post": lambda c: np.where(np.isnan(c.e), 0.0, np.exp(-c.from_offset_s / post_s)),
        "aug": lambda c: np.clip((np.nan_to_num(c.e) - start) / (1 - start), 0, 1),
        "late": lambda c: np.where(np.isnan(c.e), 0.0, np.clip(1.3 - c.to_onset_s / late_s, 0, 1)),
        "hump-I": lambda c: np.exp(-0.5 * ((np.nan_to_num(c.i, nan=9.0) - 0.5) / width) ** 2),
        "hump-E": lambda c: np.exp(-0.5 * ((np.nan_to_num(c.e, nan=9.0) - at) / (0.6 * width)) ** 2),
        "burst-3": lambda c: np.maximum(np.cos(3 * np.pi * (c.phase - third)), 0) ** 2,
        "wander": lambda c: np.exp(4 * (np.cos(np.pi * (c.phase - third - 1.6 * c.cycle / c.cycle[-1])) - 1)),
    }


# ------------------------------------------------------------------------------- wiring

Span = tuple[float, float]


@dataclass(frozen=True)
class Wiring:
    """Ranges of conductance by population, relative to the leak, and of adaptation."""

    excitation: Mapping[str, Span]
    inhibition: Mapping[str, Span]
    adaptation: Span = (0.0, 0.05)
    adaptation_s: Span = (0.08, 0.4)
    noise_mv: Span = (1.0, 2.6)


SLOW = (0.4, 1.5)
WIRING: Mapping[str, tuple[Wiring, ...]] = {
    "pre-I": (Wiring({"pre": (0.24, 0.5), "tonic": (0.0, 0.06)}, {"post": (0.8, 2.0)}, (0.0, 0.06)),
              Wiring({"tonic": (0.2, 0.26), "square-I": (0.05, 0.25)},
                     {"post": (1.5, 4.0), "square-E": (0.0, 0.06)}, (0.0, 0.05))),
    "early-I": (Wiring({"tonic": (0.26, 0.4), "dec-I": (0.05, 0.3)},
                       {"post": (0.5, 1.5), "square-E": (0.6, 1.4), "ramp": (0.3, 0.9)}, (0.005, 0.05)),
                Wiring({"square-I": (0.27, 0.5)}, {"square-E": (0.1, 0.6)}, (0.02, 0.07), SLOW),
                Wiring({"dec-I": (0.3, 0.8), "tonic": (0.1, 0.2)}, {"square-E": (0.5, 1.0)}, (0.0, 0.03))),
    "ramp-I": (Wiring({"ramp": (0.22, 0.5), "tonic": (0.06, 0.18)}, {"square-E": (0.5, 1.2), "dec-I": (0.1, 0.5)}),
               Wiring({"tonic": (0.27, 0.42)}, {"dec-I": (0.6, 1.4), "square-E": (0.8, 1.6)})),
    "late-I": (Wiring({"ramp": (0.3, 0.6)}, {"dec-I": (1.0, 2.5), "square-I": (0.05, 0.2), "square-E": (0.5, 1.2)}),
               Wiring({"tonic": (0.1, 0.2), "ramp": (0.25, 0.5)}, {"dec-I": (3.0, 6.0), "square-E": (1.0, 2.0)})),
    "con-I": (Wiring({"square-I": (0.25, 0.5)}, {"square-E": (0.1, 0.6)}, (0.0, 0.02)),
              Wiring({"tonic": (0.25, 0.45)}, {"square-E": (1.0, 2.5)}, (0.0, 0.02))),
    "I-E": (Wiring({"ramp": (0.26, 0.45), "post": (0.25, 0.5), "tonic": (0.0, 0.05)},
                   {"dec-I": (0.8, 2.5), "aug": (0.4, 1.0)}),),
    "post-I": (Wiring({"tonic": (0.22, 0.32), "post": (0.05, 0.4)}, {"square-I": (0.8, 2.0), "aug": (0.6, 1.8)},
                      (0.01, 0.08)),
               Wiring({"post": (0.3, 0.8)}, {"square-I": (0.5, 1.5)}, (0.0, 0.1))),
    "aug-E": (Wiring({"tonic": (0.24, 0.4)}, {"square-I": (0.8, 2.0), "post": (1.2, 3.0), "ramp": (0.0, 0.1)},
                     (0.0, 0.02)),
              Wiring({"aug": (0.25, 0.5), "tonic": (0.05, 0.17)}, {"square-I": (0.8, 2.0), "post": (0.3, 1.2)},
                     (0.0, 0.03))),
    "con-E": (Wiring({"tonic": (0.24, 0.42)}, {"square-I": (0.9, 2.2)}, (0.0, 0.02)),
              Wiring({"square-E": (0.25, 0.5)}, {"square-I": (0.2, 1.0)}, (0.0, 0.02))),
    "late-E": (Wiring({"late": (0.26, 0.6)}, {"square-I": (0.6, 1.6), "post": (0.5, 1.5)}, (0.0, 0.08)),),
    "dec-E": (Wiring({"square-E": (0.27, 0.5)}, {"square-I": (0.6, 1.5)}, (0.01, 0.05), SLOW),
              Wiring({"tonic": (0.27, 0.45)}, {"square-I": (1.0, 2.0), "aug": (0.2, 0.6)}, (0.01, 0.05)),
              Wiring({"tonic": (0.16, 0.24), "post": (0.1, 0.3)}, {"square-I": (1.0, 2.0)}, (0.0, 0.04))),
    "bi-E": (Wiring({"late": (0.28, 0.5), "post": (0.28, 0.6)}, {"square-I": (1.2, 2.5)}, (0.0, 0.05)),),
    "tonic": (Wiring({"tonic": (0.24, 0.4), "square-I": (0.05, 0.25)}, {}),
              Wiring({"tonic": (0.24, 0.4), "square-E": (0.05, 0.25)}, {}),
              Wiring({"tonic": (0.3, 0.5)}, {"post": (0.15, 0.6)}),
              Wiring({"tonic": (0.24, 0.4), "ramp": (0.1, 0.35)}, {}),
              Wiring({"tonic": (0.24, 0.4), "aug": (0.1, 0.35)}, {})),
    NOT_MODULATED: (Wiring({"tonic": (0.18, 0.5)}, {}, (0.0, 0.06)),),
    OTHER: (Wiring({"hump-I": (0.35, 0.7), "hump-E": (0.35, 0.7)}, {"tonic": (0.05, 0.2)}),
            Wiring({"hump-E": (0.4, 0.8)}, {"tonic": (0.05, 0.2)}),
            Wiring({"burst-3": (0.35, 0.7)}, {"tonic": (0.05, 0.2)}),
            Wiring({"wander": (0.3, 0.6)}, {"tonic": (0.05, 0.2)})),
}


@dataclass(frozen=True)
class Cells:
    """The numbers of a population; arrays of shape (n_units,) or (n_units, n_sources)."""

    excitation: FloatArray
    inhibition: FloatArray
    adaptation: FloatArray
    adaptation_s: FloatArray
    noise_mv: FloatArray
    tau_ms: FloatArray
    reset_mv: FloatArray


def wired(types: Sequence[str], names: Sequence[str], rng: Rng) -> Cells:
    """Draw the numbers of one cell per entry of `types`; `names` lists the sources in order."""
    n = len(types)
    exc, inh = np.zeros((n, len(names))), np.zeros((n, len(names)))
    spans = []
    for k, type_ in enumerate(types):
        wiring = WIRING[type_][int(rng.integers(len(WIRING[type_])))]
        for weights, given in ((exc, wiring.excitation), (inh, wiring.inhibition)):
            for population_, (low, high) in given.items():
                variants = [j for j, name in enumerate(names) if name == population_]
                weights[k, int(rng.choice(variants))] = rng.uniform(low, high)
        spans.append([rng.uniform(*wiring.adaptation), rng.uniform(*wiring.adaptation_s),
                      rng.uniform(*wiring.noise_mv), rng.uniform(12.0, 35.0), rng.uniform(-72.0, -58.0)])
    return Cells(exc, inh, *np.array(spans).T)


# --------------------------------------------------------------------------- integration

def population(types: Sequence[str], wear: Sequence[Wear], at: Clock, cycles: Cycles, regime: str,
               rng: Rng) -> list[FloatArray]:
    """Integrate one cell per entry of `types` over all cycles; return their clean spike times."""
    made = sources(regime, at.te_s, rng)
    flat = [(name, source) for name, variants in made.items() for source in variants]
    cells = wired(types, [name for name, _ in flat], rng)
    # A change of excitation is amplified by the threshold: about half the asked CV of the rate.
    gain = np.stack([1 + 0.5 * (gains(cycles.n_cycles, w, rng) - 1) for w in wear])
    activity = np.stack([source(at) for _, source in flat])
    return integrate(cells, activity, gain, at, rng)


def integrate(cells: Cells, activity: FloatArray, gain: FloatArray, at: Clock, rng: Rng) -> list[FloatArray]:
    """Return spike times per cell.

    Parameters
    ----------
    activity : ndarray, shape (n_sources, n_samples)
    gain : ndarray, shape (n_units, n_cycles)
        Multiplies excitation, cycle by cycle.
    """
    n = cells.tau_ms.size
    v, w = np.full(n, E_LEAK), np.zeros(n)
    decay = np.exp(-DT_S / cells.adaptation_s)
    step = DT_S * 1000 / cells.tau_ms
    kick = cells.noise_mv * np.sqrt(2 * step)
    rows, cols = [], []
    for first in range(0, at.time_s.size, BLOCK):
        part = slice(first, min(first + BLOCK, at.time_s.size))
        g_e = ((cells.excitation @ activity[:, part]) * gain[:, at.cycle[part]]).T.copy()
        g_i = (cells.inhibition @ activity[:, part]).T.copy()
        noise = kick * rng.standard_normal(g_e.shape)
        drive = E_LEAK + g_e * E_EXC + g_i * E_INH
        load = 1 + g_e + g_i
        for k in range(g_e.shape[0]):
            v += step * (drive[k] + w * E_K - (load[k] + w) * v) + noise[k]
            w *= decay
            fired = np.flatnonzero(v >= THRESHOLD)
            if fired.size:
                v[fired] = cells.reset_mv[fired]
                w[fired] += cells.adaptation[fired]
                rows.append(np.full(fired.size, first + k))
                cols.append(fired)
    return _by_unit(rows, cols, n, at, rng)


def _by_unit(rows: list[FloatArray], cols: list[FloatArray], n: int, at: Clock, rng: Rng) -> list[FloatArray]:
    if not rows:
        return [np.zeros(0)] * n
    row, col = np.concatenate(rows), np.concatenate(cols)
    times = at.time_s[row] + rng.uniform(0, DT_S, row.size)
    return [times[col == k] for k in range(n)]
