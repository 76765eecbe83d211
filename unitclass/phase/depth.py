"""How deeply the rate swings over the cycle, with a limit that noise does not inflate."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from unitclass.phase.exposure import CycleResamples
from unitclass.phase.histogram import chosen_bandwidth
from unitclass.records import FloatArray, PhaseHistogram


@dataclass(frozen=True)
class Depth:
    """(max - min)/(max + min) of the smoothed rate, [0, 1], and its upper 95 % limit."""

    value: float
    high: float


def modulation_depth(histogram: PhaseHistogram, resamples: CycleResamples,
                     by_phase: NDArray[np.float32]) -> Depth:
    """Return the depth of modulation and its upper 95 % limit.

    Noise alone makes a maximum and a minimum, so the raw depth of a flat cell is above zero, and
    a resample of its cycles is off again by about as much. Both numbers are therefore reflected
    at the raw depth (basic bootstrap [1]_): what a resample adds is taken off once. A truly flat
    cell with some hundreds of spikes has a small limit; a deeply modulated one keeps its depth.
    NaN with no spikes or fewer than two cycles.

    Parameters
    ----------
    histogram : PhaseHistogram
    resamples : CycleResamples
    by_phase : ndarray, shape (n_cycles, n_bins)
        The unit's counts.

    References
    ----------
    .. [1] A. C. Davison, D. V. Hinkley, *Bootstrap Methods and their Application*, Cambridge
       University Press, 1997, chapter 5.
    """
    if histogram.n_spikes == 0 or histogram.n_cycles < 2:
        return Depth(np.nan, np.nan)
    width = chosen_bandwidth(histogram, spikes=80.0, low=0.04, high=0.1) * histogram.n_bins / 2
    kernel = _circular_weights(histogram.n_bins, width)
    raw = _depths((histogram.counts @ kernel)[None], (histogram.exposure_s @ kernel)[None])[0]
    drawn = _depths(resamples.counts(by_phase) @ kernel, resamples.seconds @ kernel)
    drawn = drawn[np.isfinite(drawn)]
    if not drawn.size:
        return Depth(float(raw), np.nan)
    high = 2 * raw - np.quantile(drawn, 0.05)
    return Depth(float(np.clip(2 * raw - drawn.mean(), 0.0, 1.0)), float(np.clip(high, 0.0, 1.0)))


@lru_cache(maxsize=64)
def _circular_weights(n_bins: int, width_bins: float) -> FloatArray:
    """Return Gaussian weights between bins, (n_bins, n_bins).

    They run on across the transitions: breaks would leave half as many neighbours there, hence
    the noise that a limit must not have.
    """
    gap = np.abs(np.arange(n_bins)[:, None] - np.arange(n_bins))
    return np.exp(-0.5 * (np.minimum(gap, n_bins - gap) / width_bins) ** 2)


def _depths(counts: FloatArray, seconds: FloatArray) -> FloatArray:
    """Return the depth of each row, shape (n,)."""
    with np.errstate(invalid="ignore", divide="ignore"):
        rate = np.where(seconds > 1e-12, np.maximum(counts, 0.0) / seconds, np.nan)
        top = np.nanmax(np.where(np.isnan(rate), -np.inf, rate), axis=1)
        low = np.nanmin(np.where(np.isnan(rate), np.inf, rate), axis=1)
        return np.where(top > 0, (top - low) / (top + low), np.nan)
