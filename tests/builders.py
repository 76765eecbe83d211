"""Small objects with answers known by construction, shared by all tests."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from unitclass.records import Cycles, FloatArray


def steady_cycles(n_cycles: int = 100, *, ti_s: float = 0.8, te_s: float = 1.6, start_s: float = 0.0) -> Cycles:
    """Return equal cycles that follow on one another."""
    onset = start_s + np.arange(n_cycles) * (ti_s + te_s)
    end = np.append(onset[1:], start_s + n_cycles * (ti_s + te_s))
    return Cycles.plain(onset, onset + ti_s, end)


def varied_cycles(n_cycles: int, rng: np.random.Generator, *, ti_s: float = 0.8, te_s: float = 1.6,
                  cv: float = 0.15) -> Cycles:
    """Return cycles whose TI and TE vary apart from each other, gamma distributed."""
    ti = rng.gamma(cv**-2, ti_s * cv**2, n_cycles)
    te = rng.gamma(cv**-2, te_s * cv**2, n_cycles)
    end = np.cumsum(ti + te)
    onset = np.append(0.0, end[:-1])
    return Cycles.plain(onset, onset + ti, end)


def steady_spikes(cycles: Cycles, rate_hz: float, rng: np.random.Generator) -> FloatArray:
    """Return a Poisson train of constant rate over the span of the cycles."""
    start, stop = cycles.onset_s[0], cycles.end_s[-1]
    return np.sort(rng.uniform(start, stop, rng.poisson(rate_hz * (stop - start))))


def phasic_spikes(cycles: Cycles, rate_hz: Callable[[FloatArray], FloatArray], rng: np.random.Generator,
                  *, highest_hz: float = 200.0) -> FloatArray:
    """Return a Poisson train whose rate is a function of canonical phase (thinning)."""
    times = steady_spikes(cycles, highest_hz, rng)
    row = np.searchsorted(cycles.onset_s, times, side="right") - 1
    in_i = times < cycles.offset_s[row]
    phase = np.where(in_i, (times - cycles.onset_s[row]) / cycles.ti_s[row],
                     1 + (times - cycles.offset_s[row]) / cycles.te_s[row])
    return times[rng.uniform(0, highest_hz, times.size) < rate_hz(phase)]
