"""A stretch of recording for a figure: a few ordinary cycles, read at the resolution of the page."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import Cycles, FloatArray, Signal

N_CYCLES = 4
POINTS = 4000  # more cannot be seen on a page


@dataclass(frozen=True)
class Trace:
    """The lowest and highest sample of each of many short bins, so that no spike of it is lost."""

    name: str
    unit: str
    times_s: FloatArray
    low: FloatArray
    high: FloatArray


def usual_stretch(cycles: Cycles, n_cycles: int = N_CYCLES) -> tuple[float, float]:
    """Return start and end, s, of consecutive cycles in use near the middle; NaN when there are none.

    A quarter of a cycle is added before and after.
    """
    used = np.flatnonzero(cycles.accepted)
    if not used.size:
        return float("nan"), float("nan")
    n = min(n_cycles, used.size)
    runs = [i for i in range(used.size - n + 1) if used[i + n - 1] - used[i] == n - 1] or [0]
    first = used[runs[len(runs) // 2]]
    last = min(first + n - 1, cycles.n_cycles - 1)
    margin = 0.25 * float(np.median(cycles.end_s - cycles.onset_s))
    return float(cycles.onset_s[first]) - margin, float(cycles.end_s[last]) + margin


def trace_of(signal: Signal, start_s: float, stop_s: float, points: int = POINTS) -> Trace:
    """Read a stretch of a signal; NaN where there is none."""
    times, values = [], []
    for chunk in signal.reader.chunks(start_s, stop_s):
        sample_times = chunk.start_s + np.arange(chunk.values.size) / signal.rate_hz
        inside = (sample_times >= start_s) & (sample_times < stop_s)
        times.append(sample_times[inside])
        values.append(np.asarray(chunk.values, dtype=float)[inside])
    t, v = (np.concatenate(parts) if parts else np.zeros(0) for parts in (times, values))
    block = max(1, t.size // points)
    n = t.size // block
    if not n:
        return Trace(signal.name, signal.unit, np.zeros(0), np.zeros(0), np.zeros(0))
    cut = v[: n * block].reshape(n, block)
    return Trace(signal.name, signal.unit, t[: n * block : block], cut.min(axis=1), cut.max(axis=1))
