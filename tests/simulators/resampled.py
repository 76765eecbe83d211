"""Simulator (c): real spike intervals, re-timed to follow staircases over the cycle.

The rhythm of firing is real: the intervals of an insect's auditory receptor, as they come with the
nitime package, each divided by its local mean, drawn again in runs so that their order counts. Without
that package they are drawn from an ex-Gaussian instead, and the simulator says so. The shape over the
cycle is a staircase of random steps, put in order where the type's name asks for it (rising, falling),
so that no formula of a template or of another simulator is in it.
"""

from __future__ import annotations

import importlib.util
import warnings
from collections.abc import Callable, Sequence
from functools import cache
from pathlib import Path

import numpy as np

from tests.simulators.common import (
    TYPES,
    Clock,
    SimUnits,
    breathing,
    clock,
    gain_over_time,
    gains,
    log_uniform,
    preparation,
    recorded,
    worn,
)
from tests.simulators.definition import N, agrees
from unitclass.records import NOT_MODULATED, OTHER, Cycles, FloatArray

Rng = np.random.Generator
FLAT_FOREIGN = 1.0
Stairs = tuple[FloatArray, FloatArray]


def simulate(n_per_type: int, *, n_cycles: int = 60, regime: str = "three-phase", rng: Rng,
             types: Sequence[str] | None = None, peak_hz: tuple[float, float] = (3.0, 100.0),
             hardness: float = 1.0, cycles: Cycles | None = None, with_other: bool = True) -> SimUnits:
    """Return `n_per_type` units of each type; see `rates.simulate` for the parameters."""
    cycles = cycles if cycles is not None else breathing(n_cycles, preparation(regime, rng), rng)
    at = clock(cycles)
    wanted = list(types) if types is not None else [*TYPES[regime], *([OTHER] if with_other else [])]
    trains, names, details = [], [], []
    for name in wanted:
        for _ in range(n_per_type):
            stairs, detail = staircase(name, regime, at.te_s, rng)
            trains.append(_unit(stairs, detail, at, cycles, log_uniform(rng, *peak_hz), hardness, rng))
            names.append(name)
            details.append(detail)
    return SimUnits(trains, names, regime, cycles, details)


def _unit(stairs: Stairs, detail: str, at: Clock, cycles: Cycles, peak_hz: float, hardness: float,
          rng: Rng) -> FloatArray:
    wear = worn(rng, hardness=hardness)
    form = level(stairs, at, moving=detail == "drifting")
    if detail[:1].isdigit():
        form = form * ((at.cycle + rng.integers(3)) % int(detail[0]) == 0)
    rate = peak_hz * (wear.background + (1 - wear.background) * form)
    train = retimed(rate * gain_over_time(at, gains(cycles.n_cycles, wear, rng), cycles), at, rng)
    foreign = retimed(np.full(at.time_s.size, 2.0 + 0.3 * peak_hz), at, rng)
    return recorded(train, foreign, cycles, wear, rng)


def form(name: str, at: Clock, regime: str, rng: Rng) -> FloatArray:
    """Return a drawn staircase of the type at every moment of the clock, for the oracle."""
    stairs, detail = staircase(name, regime, at.te_s, rng)
    return level(stairs, at, moving=detail == "drifting")


def retimed(rate_hz: FloatArray, at: Clock, rng: Rng) -> FloatArray:
    """Return spike times with this rate whose intervals, in units of their mean, are the real ones."""
    integral = np.concatenate([[0.0], np.cumsum(rate_hz) * at.dt_s])
    needed = int(1.3 * integral[-1]) + 60
    beats = np.cumsum(_runs(unit_intervals(), needed, rng)) - rng.uniform()
    beats = beats[(beats > 0) & (beats < integral[-1])]
    return np.interp(beats, integral, np.append(at.time_s, at.time_s[-1] + at.dt_s))


def level(stairs: Stairs, at: Clock, *, moving: bool = False) -> FloatArray:
    """Return the staircase's height at each moment; `moving` slides it round the cycle over time."""
    edges, heights = stairs
    phase = at.phase
    if moving:
        phase = (phase + 1.5 * at.cycle / max(at.cycle[-1], 1)) % 2
    return heights[np.clip(np.searchsorted(edges, phase, side="right") - 1, 0, heights.size - 1)]


# ---------------------------------------------------------------------------- intervals

@cache
def unit_intervals() -> FloatArray:
    """Return intervals of mean one: real ones where they can be had, else an ex-Gaussian's."""
    real = _real_spike_times()
    if not real:
        warnings.warn("nitime's spike times are not installed: intervals are ex-Gaussian instead", stacklevel=2)
        made = np.random.default_rng(7)
        drawn = np.maximum(made.normal(0.35, 0.08, 4000), 0.08) + made.exponential(0.65, 4000)
        return drawn / drawn.mean()
    return np.concatenate([_normalised(np.diff(times)) for times in real])


def _real_spike_times() -> list[FloatArray]:
    """Return the spike times in the files of nitime's data folder; found without importing it."""
    spec = importlib.util.find_spec("nitime")
    if spec is None or spec.origin is None:
        return []
    files = sorted((Path(spec.origin).parent / "data").glob("grasshopper_spike_times*.txt"))
    return [np.unique(np.loadtxt(file)) for file in files]


def _normalised(intervals: FloatArray, half: int = 10) -> FloatArray:
    """Divide each interval by the mean of those around it, which takes out the stimulus."""
    padded = np.pad(intervals, half, mode="edge")
    local = np.convolve(padded, np.full(2 * half + 1, 1 / (2 * half + 1)), mode="valid")
    ratio = intervals / local
    return np.clip(ratio / ratio.mean(), 0.02, 6.0)


def _runs(intervals: FloatArray, n: int, rng: Rng) -> FloatArray:
    """Draw n intervals in runs of about ten that follow each other as recorded."""
    length = 10
    starts = rng.integers(0, intervals.size - length, n // length + 1)
    return intervals[(starts[:, None] + np.arange(length)).ravel()[:n]]


# --------------------------------------------------------------------------- staircases

def staircase(name: str, regime: str, te_s: float, rng: Rng) -> tuple[Stairs, str]:
    """Draw the steps of a type until they are what its name promises; with what is particular."""
    if name == OTHER:
        return _odd(rng)
    while True:
        i, e = _STEPS[name](regime, te_s, rng)
        top = max(i.max(), e.max())
        stairs = _edges(i.size, e.size, rng), np.concatenate([i, e]) / top
        if agrees(name, _sampled(stairs)):
            detail = f"{int(rng.choice([1, 1, 2, 3]))}:1" if name == "late-E" else ""
            return stairs, detail


def _edges(n_i: int, n_e: int, rng: Rng) -> FloatArray:
    """Return jittered edges of the steps in canonical phase; one stands at each transition."""
    def split(n: int) -> FloatArray:
        return np.concatenate([[0.0], (np.arange(1, n) + rng.uniform(-0.3, 0.3, n - 1)) / n])
    return np.concatenate([split(n_i), 1 + split(n_e)])


def _sampled(stairs: Stairs) -> FloatArray:
    """Return the mean height in N bins of inspiration and N of expiration."""
    edges, heights = stairs
    x = (np.arange(2 * N * 10) + 0.5) / (10 * N)
    return heights[np.searchsorted(edges, x, side="right") - 1].reshape(2 * N, 10).mean(axis=1)


def _n_steps(regime: str, rng: Rng) -> tuple[int, int]:
    return int(rng.integers(6, 13)), int(rng.integers(24, 41) if regime == "one-phase" else rng.integers(10, 21))


def _up(n: int, rng: Rng) -> FloatArray:
    return np.sort(rng.uniform(0, 1, n))


def _down(n: int, rng: Rng) -> FloatArray:
    return _up(n, rng)[::-1]


def _even(n: int, rng: Rng, low: float = 0.75) -> FloatArray:
    return rng.uniform(low, 1, n)


def _put(n: int, first: int, values: FloatArray) -> FloatArray:
    out = np.zeros(n)
    out[first : first + values.size] = values[: n - first]
    return out


def _pre_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k = max(2, round((rng.uniform(0.3, 0.7) / te_s if regime == "one-phase" else rng.uniform(0.1, 0.3)) * n_e))
    e = _put(n_e, n_e - k, rng.uniform(0.3, 0.9) * _up(k, rng))
    order = [_even(n_i, rng, 0.6), 0.3 + 0.7 * _down(n_i, rng), 0.4 + 0.6 * _up(n_i, rng)]
    return order[int(rng.integers(3))], e


def _early_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return _down(n_i, rng) ** rng.uniform(0.7, 2.0), np.zeros(n_e)


def _ramp_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return _up(n_i, rng) ** rng.uniform(0.6, 1.5), np.zeros(n_e)


def _late_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k = max(2, round(rng.uniform(0.25, 0.48) * n_i))
    return _put(n_i, n_i - k, 0.2 + _up(k, rng)), np.zeros(n_e)


def _con_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return _even(n_i, rng), np.zeros(n_e)


def _i_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k, m = max(2, round(rng.uniform(0.15, 0.45) * n_i)), max(2, round(rng.uniform(0.1, 0.4) * n_e))
    return _put(n_i, n_i - k, 0.3 + 0.7 * _up(k, rng)), _put(n_e, 0, _down(m, rng))


def _post_i(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k = max(2, round(rng.uniform(0.2, 0.6) * n_e))
    return np.zeros(n_i), _put(n_e, 0, _down(k, rng))


def _aug_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k = round(rng.uniform(0.5, 0.9) * n_e)
    return np.zeros(n_i), _put(n_e, n_e - k, _up(k, rng))


def _con_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return np.zeros(n_i), _even(n_e, rng)


def _late_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    k = max(1, round(rng.uniform(0.1, 0.25) * n_e))
    return np.zeros(n_i), _put(n_e, n_e - k, 0.3 + _up(k, rng))


def _dec_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return np.zeros(n_i), 0.05 + _down(n_e, rng)


def _bi_e(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    before, after = rng.uniform(0.15, 0.4, 2) * min(te_s, 2.5) / te_s
    k, m = max(2, round(before * n_e)), max(2, round(after * n_e))
    tops = rng.uniform(0.5, 1, 2)
    return np.zeros(n_i), _put(n_e, 0, tops[0] * _down(m, rng)) + _put(n_e, n_e - k, tops[1] * _up(k, rng))


def _tonic(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    order: list[Callable[[int, Rng], FloatArray]] = [_up, _down, _even, _even]
    i = order[int(rng.integers(4))](n_i, rng) * rng.uniform(0.3, 1)
    e = order[int(rng.integers(4))](n_e, rng) * rng.uniform(0.3, 1)
    low = rng.uniform(0.33, 0.6) / (1 - rng.uniform(0.33, 0.6))
    return i + low, e + low


def _nrm(regime: str, te_s: float, rng: Rng) -> tuple[FloatArray, FloatArray]:
    n_i, n_e = _n_steps(regime, rng)
    return np.ones(n_i), np.ones(n_e)


def _odd(rng: Rng) -> tuple[Stairs, str]:
    kind = str(rng.choice(["three humps", "both middles", "narrow peak", "drifting"]))
    n = 20
    x = (np.arange(2 * n) + 0.5) / n
    near = {"three humps": [0.25, 0.95, 1.6], "both middles": [0.5, 1.5], "drifting": [rng.uniform(0, 2)],
            "narrow peak": [rng.choice([rng.uniform(0.35, 0.5), rng.uniform(1.4, 1.65)])]}[kind]
    reach = {"three humps": 0.13, "both middles": 0.2, "narrow peak": 0.075, "drifting": 0.25}[kind]
    turn = rng.uniform(-0.2, 0.2) if kind == "three humps" else 0.0
    apart = np.min([np.abs((x - c - turn + 1) % 2 - 1) for c in near], axis=0)
    heights = np.where(apart < reach, rng.uniform(0.6, 1.0, x.size), 0.0)
    return (np.arange(2 * n) / n, heights), kind


_STEPS = {
    "pre-I": _pre_i, "early-I": _early_i, "ramp-I": _ramp_i, "late-I": _late_i, "con-I": _con_i, "I-E": _i_e,
    "post-I": _post_i, "aug-E": _aug_e, "con-E": _con_e, "late-E": _late_e, "dec-E": _dec_e, "bi-E": _bi_e,
    "tonic": _tonic, NOT_MODULATED: _nrm,
}
