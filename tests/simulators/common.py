"""What the simulators share: cycles, a clock over them, and what recording does to a train."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from unitclass.records import Cycles, FloatArray, IntArray

THREE_PHASE = ("pre-I", "early-I", "ramp-I", "late-I", "con-I", "I-E", "post-I", "aug-E", "con-E", "late-E",
               "dec-E", "bi-E", "tonic", "NRM")
TWO_PHASE = ("pre-I", "early-I", "con-I", "dec-E", "con-E", "tonic", "NRM")
ONE_PHASE = ("pre-I", "early-I", "con-I", "con-E", "bi-E", "tonic", "NRM")
TYPES = {"three-phase": THREE_PHASE, "two-phase": TWO_PHASE, "one-phase": ONE_PHASE}


@dataclass(frozen=True)
class SimUnits:
    """Units whose types are known, on given cycles.

    `trains` are ascending spike times in seconds; `types` and `details` (e.g. "2:1", "three humps")
    have one entry per train.
    """

    trains: list[FloatArray]
    types: list[str]
    regime: str
    cycles: Cycles
    details: list[str] = field(default_factory=list)


@dataclass(frozen=True)
class Preparation:
    """Median TI and TE in s and their coefficients of variation."""

    ti_s: float
    te_s: float
    ti_cv: float
    te_cv: float


# domain.md, table of numbers: (TI low, high, TE low, high) in s.
_RANGES = {
    "three-phase": ((0.6, 1.2, 1.5, 4.0), (0.4, 0.7, 0.7, 1.5), (1.0, 2.0, 1.5, 4.0)),
    "two-phase": ((0.6, 2.0, 1.5, 4.0),),
    "one-phase": ((0.3, 0.8, 2.7, 11.0),),
}


def preparation(regime: str, rng: np.random.Generator) -> Preparation:
    """Draw the durations of a preparation of this regime."""
    ranges = _RANGES[regime]
    ti_low, ti_high, te_low, te_high = ranges[rng.integers(len(ranges))]
    ti_cv, te_cv = rng.uniform(0.03, 0.10, 2)
    if regime == "one-phase":
        ti_cv, te_cv = rng.uniform(0.05, 0.15), rng.uniform(0.10, 0.40)
    return Preparation(rng.uniform(ti_low, ti_high), rng.uniform(te_low, te_high), ti_cv, te_cv)


def breathing(n_cycles: int, prep: Preparation, rng: np.random.Generator, start_s: float = 1.0) -> Cycles:
    """Lay out `n_cycles` cycles whose durations wander a little from breath to breath."""
    ti = prep.ti_s * wandering(n_cycles, prep.ti_cv, 0.3, rng)
    te = prep.te_s * wandering(n_cycles, prep.te_cv, 0.3, rng)
    marks = start_s + np.concatenate([[0.0], np.cumsum(ti + te)])
    return Cycles.plain(marks[:-1], marks[:-1] + ti, marks[1:])


def wandering(n: int, cv: float, memory: float, rng: np.random.Generator) -> FloatArray:
    """Return n positive factors of mean one: log-normal, first-order autoregressive."""
    sigma = np.sqrt(np.log1p(cv**2))
    z = np.empty(n)
    z[0] = rng.standard_normal()
    for i in range(1, n):
        z[i] = memory * z[i - 1] + np.sqrt(1 - memory**2) * rng.standard_normal()
    return np.exp(sigma * z - sigma**2 / 2)


@dataclass(frozen=True)
class Clock:
    """Every moment of the cycles, on an even grid; all arrays have shape (n_samples,).

    `i` and `e` run 0 to 1 through inspiration and expiration and are NaN outside them.
    `from_onset_s`, `from_offset_s`, `to_onset_s` are seconds since the last onset and offset of
    inspiration and until the next onset; `cycle` is the index of the cycle.
    """

    time_s: FloatArray
    dt_s: float
    i: FloatArray
    e: FloatArray
    from_onset_s: FloatArray
    from_offset_s: FloatArray
    to_onset_s: FloatArray
    cycle: IntArray
    ti_s: float
    te_s: float

    @property
    def phase(self) -> FloatArray:
        """Return canonical phase, [0, 2)."""
        return np.where(np.isnan(self.i), 1.0 + self.e, self.i)


def clock(cycles: Cycles, dt_s: float = 0.002) -> Clock:
    """Return the clock of contiguous cycles."""
    t = np.arange(cycles.onset_s[0], cycles.end_s[-1], dt_s)
    k = np.clip(np.searchsorted(cycles.onset_s, t, side="right") - 1, 0, cycles.n_cycles - 1)
    on, off, end = cycles.onset_s[k], cycles.offset_s[k], cycles.end_s[k]
    inside = t < off
    i = np.where(inside, (t - on) / (off - on), np.nan)
    e = np.where(inside, np.nan, np.minimum((t - off) / (end - off), 1 - 1e-9))
    since_off = np.where(inside, t - np.concatenate([[-np.inf], cycles.offset_s[:-1]])[k], t - off)
    return Clock(t, dt_s, i, e, t - on, since_off, end - t, k, float(np.median(cycles.ti_s)),
                 float(np.median(cycles.te_s)))


Shape = Callable[[Clock], FloatArray]


@dataclass(frozen=True)
class Wear:
    """What a recording does to a cell's firing.

    `gain_cv` from cycle to cycle, `drift` the change of gain from first to last cycle (±0.5),
    `missed` and `foreign` shares of spikes, `background` rate as a share of the peak, `order` of
    the gamma renewal (below one bursts, above one is regular), `refractory_s`, `shift_s` and
    `jitter_s` of the whole burst against the nerve, `doublets` the share of spikes that is
    followed by another within 2 ms of its refractory time.
    """

    gain_cv: float
    drift: float
    missed: float
    foreign: float
    background: float
    order: float
    refractory_s: float
    shift_s: float
    jitter_s: float
    doublets: float


CLEAN = Wear(0.0, 0.0, 0.0, 0.0, 0.0, 4.0, 0.001, 0.0, 0.0, 0.0)


def worn(rng: np.random.Generator, *, hardness: float = 1.0) -> Wear:
    """Draw what recording does; `hardness` scales it from none (0) to the stated limits (1)."""
    u = rng.uniform(size=8) * hardness
    return Wear(gain_cv=0.4 * u[0], drift=0.5 * u[1] * rng.choice([-1, 1]), missed=0.15 * u[2],
                foreign=0.12 * u[3] ** 1.5, background=0.25 * u[4] ** 2, order=log_uniform(rng, 0.75, 6.5),
                refractory_s=rng.uniform(0.001, 0.004), shift_s=rng.uniform(-0.010, 0.020) * hardness,
                jitter_s=0.020 * u[5], doublets=0.06 * u[6] * (u[7] > 0.7))


def gains(n_cycles: int, wear: Wear, rng: np.random.Generator) -> FloatArray:
    """Return the gain of each cycle, mean about one, shape (n_cycles,)."""
    drift = 1 + wear.drift * np.linspace(-0.5, 0.5, n_cycles)
    return wandering(n_cycles, wear.gain_cv, rng.uniform(0, 0.7), rng) * drift


def gain_over_time(at: Clock, gain: FloatArray, cycles: Cycles) -> FloatArray:
    """Return the gain at each sample, moving smoothly from the middle of one cycle to the next."""
    return np.interp(at.time_s, (cycles.onset_s + cycles.end_s) / 2, gain)


def renewal(rate_hz: FloatArray, at: Clock, order: float, rng: np.random.Generator) -> FloatArray:
    """Draw a train with this rate by time-rescaling of a gamma renewal process of mean one."""
    integral = np.concatenate([[0.0], np.cumsum(rate_hz) * at.dt_s])
    n = int(integral[-1] + 8 * np.sqrt(integral[-1] + 1) / min(order, 1.0) + 20)
    beats = np.cumsum(rng.gamma(order, 1 / order, n)) - rng.uniform()
    beats = beats[(beats > 0) & (beats < integral[-1])]
    edges = np.append(at.time_s, at.time_s[-1] + at.dt_s)
    return np.interp(beats, integral, edges)


def recorded(train: FloatArray, foreign: FloatArray, cycles: Cycles, wear: Wear,
             rng: np.random.Generator) -> FloatArray:
    """Shift, jitter, double, lose and mix in spikes; the result is ascending and refractory but for
    the foreign spikes."""
    k = np.clip(np.searchsorted(cycles.onset_s, train, side="right") - 1, 0, cycles.n_cycles - 1)
    train = np.sort(train + wear.shift_s + wear.jitter_s * rng.standard_normal(cycles.n_cycles)[k])
    extra = train[rng.uniform(size=train.size) < wear.doublets]
    seconds = extra + wear.refractory_s + rng.uniform(0.0, 0.002, extra.size)
    train = np.sort(np.concatenate([train, seconds]))
    train = refractory(train, wear.refractory_s)
    train = train[rng.uniform(size=train.size) >= wear.missed]
    n_foreign = min(foreign.size, round(train.size * wear.foreign / (1 - wear.foreign)))
    mixed = np.concatenate([train, rng.choice(foreign, n_foreign, replace=False)])
    return np.sort(mixed[mixed > 0])


def refractory(train: FloatArray, dead_s: float) -> FloatArray:
    """Return the spikes that follow the one kept before by at least `dead_s`."""
    kept = []
    last = -np.inf
    for t in train:
        if t - last >= dead_s:
            kept.append(t)
            last = t
    return np.array(kept)


def log_uniform(rng: np.random.Generator, low: float, high: float) -> float:
    """Draw one number whose logarithm is uniform."""
    return float(np.exp(rng.uniform(np.log(low), np.log(high))))
