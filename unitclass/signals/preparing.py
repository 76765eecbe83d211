"""What is put right in an activity before bursts are looked for: dead stretches, heart beats, polarity."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from unitclass.errors import SignalError
from unitclass.records import FloatArray, Signal
from unitclass.signals.despike import without_heart_beats
from unitclass.signals.neurogram import Activity
from unitclass.signals.smoothing import filled, runs, smooth, widened

DEAD_SHARE = 0.2
DEAD_S = 0.1
CONSTANT_S = 0.25


def prepared(fine: Activity, signal: Signal) -> Activity:
    """Return the activity with dead stretches as NaN, heart beats cut out, and bursts pointing up.

    Raises
    ------
    SignalError
        When nothing is left.
    """
    clean = _without_dead(fine)
    if not np.isfinite(clean.values).any():
        raise SignalError(f"nerve {fine.name} is dead in this stretch", remedy="name another nerve with --nerve")
    # Once its integrator is undone, a rectified trace shows heart beats as narrow as a raw nerve does.
    return _without_heart(clean) if clean.is_power else clean


def _without_dead(fine: Activity) -> Activity:
    dead = _silent(fine) if fine.is_power else _stuck(fine.values, fine.rate_hz)
    if not dead.any():
        return fine
    seconds = dead.sum() / fine.rate_hz
    return replace(fine, values=np.where(dead, np.nan, fine.values),
                   words=(*fine.words, f"{seconds:.1f} s of dead or saturated recording left out"))


def _silent(fine: Activity) -> np.ndarray:
    """Return where a rectified trace falls far below its own floor: disconnected or at the rail."""
    trace = filled(smooth(fine.values, 0.02 * fine.rate_hz))
    alive = trace[trace > 0.02 * np.percentile(trace, 90)]
    if not alive.size:
        return np.zeros(trace.size, bool)
    low = trace < DEAD_SHARE * np.percentile(alive, 20)
    return _long_enough(low, DEAD_S * fine.rate_hz, round(0.02 * fine.rate_hz))


def _stuck(values: FloatArray, rate_hz: float) -> np.ndarray:
    """Return where an integrated trace stands still for long, unless standing still is its habit."""
    same = np.concatenate([[False], np.diff(values) == 0])
    stuck = _long_enough(same, max(CONSTANT_S * rate_hz, 5), 0)
    n_runs = len(runs(stuck))
    return stuck if n_runs <= 3 and stuck.mean() < 0.5 else np.zeros(values.size, bool)


def _long_enough(flags: np.ndarray, shortest: float, grow: int) -> np.ndarray:
    keep = np.zeros(flags.size, bool)
    for first, last in runs(flags):
        if last - first >= shortest:
            keep[first:last] = True
    return widened(keep, grow)


def _without_heart(fine: Activity) -> Activity:
    clean = without_heart_beats(fine.values, fine.rate_hz, noise=_sample_noise(fine.values))
    if not clean.words:
        return fine
    return replace(fine, values=clean.values, words=(*fine.words, clean.words))


def _sample_noise(values: FloatArray) -> float:
    """Return the standard deviation of one sample relative to its level, from neighbours' differences."""
    finite = values[np.isfinite(values)]
    if finite.size < 10:
        return 0.0
    step = np.abs(np.diff(finite)) / np.maximum((finite[1:] + finite[:-1]) / 2, 1e-300)
    return float(np.median(step) * 1.4826 / np.sqrt(2))
