"""A nerve's mean envelope over the respiratory cycle."""

from __future__ import annotations

import numpy as np

from unitclass.phase.warp import from_phase
from unitclass.records import Cycles, Envelope, FloatArray, NerveProfile

CYCLES_AT_ONCE = 256
READINGS = 4
"""Readings of the envelope per phase bin and cycle; it is smooth, and cycles are many."""


def nerve_profile(envelope: Envelope, cycles: Cycles, *, n_bins: int = 40) -> NerveProfile:
    """Return the mean of an envelope over canonical phase, shape (n_bins,).

    Every cycle weighs the same; gaps (NaN) are left out; a bin never seen is NaN.

    Parameters
    ----------
    envelope : Envelope
    cycles : Cycles
        The cycles in use, shape (n_cycles,).
    n_bins : int
        Even; the first half is inspiration.

    Raises
    ------
    ValueError
        If `n_bins` is not a positive even number or the cycles do not ascend.
    """
    if n_bins <= 0 or n_bins % 2:
        raise ValueError(f"n_bins must be a positive even number, not {n_bins}")
    total, seen = np.zeros(n_bins), np.zeros(n_bins)
    phases = (np.arange(n_bins * READINGS) + 0.5) * (2.0 / (n_bins * READINGS))
    rows = np.flatnonzero(np.isfinite(cycles.offset_s))
    for first in range(0, rows.size, CYCLES_AT_ONCE):
        block = rows[first : first + CYCLES_AT_ONCE]
        times = from_phase(np.tile(phases, block.size), np.repeat(block, phases.size), cycles)
        values = _values_at(envelope, times).reshape(block.size, n_bins, READINGS)
        known = np.isfinite(values)
        total += np.where(known, values, 0.0).sum(axis=(0, 2))
        seen += known.sum(axis=(0, 2))
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(seen > 0, total / seen, np.nan)
    return NerveProfile(envelope.name, envelope.role, envelope.unit, mean)


def _values_at(envelope: Envelope, times_s: FloatArray) -> FloatArray:
    """Return the envelope between its samples, NaN beyond its ends and in gaps."""
    place = (times_s - envelope.start_s) * envelope.rate_hz
    last = envelope.values.size - 1
    if last < 1:
        return np.full(times_s.size, np.nan)
    below = np.clip(np.floor(place).astype(np.int64), 0, last - 1)
    share = place - below
    values = envelope.values[below] * (1 - share) + envelope.values[below + 1] * share
    return np.where((place >= 0) & (place <= last), values, np.nan)
