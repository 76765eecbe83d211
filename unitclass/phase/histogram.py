"""Spike rate by phase, with limits, a smoothed estimate and a raster for pictures."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike

from unitclass.phase.counts import CycleCounts, count_cycles
from unitclass.phase.exposure import CycleResamples, cycle_resamples, exposure
from unitclass.phase.warp import checked_times, to_phase
from unitclass.records import Cycles, FloatArray, IntArray, PhaseHistogram, Raster

CONFIDENCE = 0.95


def phase_histogram(spike_times_s: ArrayLike, cycles: Cycles, *, observed_s: ArrayLike | None = None,
                    n_bins: int = 40, n_bootstrap: int = 200,
                    rng: np.random.Generator | None = None) -> PhaseHistogram:
    """Count a unit's spikes by cycle phase, with the seconds observed in each bin.

    Inspiration and expiration last unequally long, so counts alone mislead; divided by
    exposure they are the maximum-likelihood rate of a Poisson process that is constant
    within a bin [1]_. The limits come from resampling whole cycles, so they hold for bursty
    firing and gain that wanders, too; where a bin holds no spike the resamples can tell nothing
    and the upper limit is that of a Poisson count of zero.

    Parameters
    ----------
    spike_times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order. Spikes outside every cycle are not counted.
    cycles : Cycles
        The cycles in use, shape (n_cycles,), sorted, not overlapping.
    observed_s : array_like, shape (n_intervals, 2), optional
        Observation intervals of the unit in seconds; None means always.
    n_bins : int
        Bins over one cycle; even, so that an edge falls on the end of inspiration.
    n_bootstrap : int
        Resamples of cycles; 0 leaves the limits NaN.
    rng : numpy.random.Generator, optional
        Draws the resamples; a fixed seed when None.

    Returns
    -------
    PhaseHistogram
        With no cycles, counts and exposure are zero and the limits NaN.

    Raises
    ------
    ValueError
        If `spike_times_s` is not 1-D and finite, `n_bins` is not a positive even number, the
        cycles do not ascend, or an observation interval is backward.

    References
    ----------
    .. [1] R. E. Kass, U. T. Eden, E. N. Brown, *Analysis of Neural Data*, Springer, 2014.
    """
    given = exposure(cycles, observed_s=observed_s, n_bins=n_bins)
    counts = count_cycles(spike_times_s, given)
    return histogram_of(counts, cycle_resamples(given, n_bootstrap, rng or np.random.default_rng(0)))


def histogram_of(counts: CycleCounts, resamples: CycleResamples) -> PhaseHistogram:
    """Return the phase histogram of spikes that are counted already."""
    totals = counts.by_phase.sum(axis=0, dtype=float)
    seconds = counts.exposure.seconds.sum(axis=0)
    rates = _ratio(resamples.counts(counts.by_phase), resamples.seconds)
    low, high = _bootstrap_limits(totals, seconds, rates, counts.exposure.n_cycles)
    return PhaseHistogram(totals, seconds, low, high, counts.exposure.n_cycles)


def garwood_limits(counts: ArrayLike, confidence: float = CONFIDENCE) -> tuple[FloatArray, FloatArray]:
    """Return exact limits (low, high) of Poisson means given counts [1]_, each the counts' shape.

    They assume Poisson counts, which bursty or wandering cells are not; the bootstrap over
    cycles does not.

    Raises
    ------
    ValueError
        If a count is negative or `confidence` is not between 0 and 1.

    References
    ----------
    .. [1] F. Garwood, "Fiducial limits for the Poisson distribution", Biometrika 28 (1936) 437.
    """
    from scipy.special import gammaincinv

    n = np.asarray(counts, dtype=float)
    if np.any(~(n >= 0)) or not 0 < confidence < 1:
        raise ValueError(f"counts must not be negative and confidence must be in (0, 1), not {confidence}")
    tail = (1 - confidence) / 2
    low = np.where(n > 0, gammaincinv(np.maximum(n, 1e-300), tail), 0.0)
    return low, gammaincinv(n + 1, 1 - tail)


def smoothed_rate(histogram: PhaseHistogram, *, bandwidth: float | None = None) -> FloatArray:
    """Return a smooth rate, spikes/s, shape (n_bins,), that breaks at both transitions.

    Inspiration and expiration are smoothed apart, by local lines under a Gaussian weight, so a
    sharp onset grows no foot on the other side and a ramp keeps its height at the edge.

    Parameters
    ----------
    histogram : PhaseHistogram
    bandwidth : float, optional
        Standard deviation of the weight in canonical phase; None chooses it from the number of
        spikes (`chosen_bandwidth`).
    """
    width = chosen_bandwidth(histogram) if bandwidth is None else bandwidth
    kernel = smoothing_matrix(histogram.n_bins, width * histogram.n_bins / 2)
    return _ratio(histogram.counts @ kernel, histogram.exposure_s @ kernel)


def chosen_bandwidth(histogram: PhaseHistogram, *, spikes: float = 40.0, low: float = 0.03,
                     high: float = 0.125) -> float:
    """Return the standard deviation, in phase, under which a mean bin's neighbourhood holds `spikes`.

    Clipped to [low, high]. A Gaussian weight of standard deviation h averages over 2 sqrt(pi) h.
    """
    per_phase = histogram.counts.sum() / 2
    if per_phase <= 0:
        return high
    return float(np.clip(spikes / (2 * np.sqrt(np.pi) * per_phase), low, high))


@lru_cache(maxsize=256)
def smoothing_matrix(n_bins: int, width_bins: float) -> FloatArray:
    """Return the local-line smoother as (n_bins, n_bins): values @ matrix is smooth, halves apart."""
    half = n_bins // 2
    gap = np.arange(half)[:, None] - np.arange(half)[None, :]
    weight = np.exp(-0.5 * (gap / max(width_bins, 1e-3)) ** 2)
    s0, s1, s2 = (np.sum(weight * gap**k, axis=0) for k in range(3))
    with np.errstate(invalid="ignore", divide="ignore"):
        line = weight * (s2 - gap * s1) / (s0 * s2 - s1**2)
    block = np.where(np.isfinite(line), line, np.eye(half))
    matrix = np.zeros((n_bins, n_bins))
    matrix[:half, :half] = matrix[half:, half:] = block
    matrix.setflags(write=False)
    return matrix


def raster(spike_times_s: ArrayLike, cycles: Cycles, max_cycles: int = 200) -> Raster:
    """Return the spikes of up to `max_cycles` cycles, evenly spaced in time, for a picture.

    Raises
    ------
    ValueError
        If `spike_times_s` is not 1-D and finite, or the cycles do not ascend.
    """
    phased = to_phase(np.sort(checked_times(spike_times_s)), cycles)
    return raster_of(phased.phase, phased.cycle, cycles.n_cycles, max_cycles)


def raster_of(phase: FloatArray, cycle: IntArray, n_cycles: int, max_cycles: int = 200) -> Raster:
    """Return the raster of spikes whose phase and cycle, shape (n_spikes,), are known."""
    shown = np.unique(np.linspace(0, n_cycles - 1, min(n_cycles, max_cycles)).round().astype(np.int64))
    row_of = np.full(n_cycles + 1, -1, dtype=np.int32)
    row_of[shown] = np.arange(shown.size)
    row = row_of[cycle]
    keep = row >= 0
    return Raster(phase[keep].astype(np.float32), row[keep], int(shown.size), n_cycles)


def _bootstrap_limits(totals: FloatArray, seconds: FloatArray, rates: FloatArray,
                      n_cycles: int) -> tuple[FloatArray, FloatArray]:
    if len(rates) == 0 or n_cycles < 2:
        return np.full(totals.size, np.nan), np.full(totals.size, np.nan)
    low, high = quantiles(rates, ((1 - CONFIDENCE) / 2, (1 + CONFIDENCE) / 2))
    none_seen = _ratio(np.full(totals.size, -np.log((1 - CONFIDENCE) / 2)), seconds)
    return low, np.where(totals > 0, high, none_seen)


def quantiles(values: FloatArray, shares: tuple[float, ...]) -> FloatArray:
    """Return quantiles over the first axis, linear between ranks, NaN values left out.

    `values` has shape (n, m); the result (n_shares, m), NaN where a column holds no number.
    """
    ordered = np.sort(values, axis=0)
    last = np.count_nonzero(np.isfinite(ordered), axis=0) - 1
    place = np.maximum(last, 0) * np.asarray(shares)[:, None]
    below = place.astype(np.int64)
    above = np.minimum(below + 1, np.maximum(last, 0))
    columns = np.arange(values.shape[1])
    share = place - below
    return ordered[below, columns] * (1 - share) + ordered[above, columns] * share


def _ratio(counts: FloatArray, seconds: FloatArray) -> FloatArray:
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(seconds > 1e-12, np.maximum(counts, 0.0) / seconds, np.nan)
