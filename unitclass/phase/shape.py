"""The form of the active phase: its slope, and how firing decays after the peak."""

from __future__ import annotations

import numpy as np

from unitclass.phase.active_phase import ActivePhase
from unitclass.records import FloatArray, PhaseHistogram

TAUS_S = np.geomspace(0.01, 10.0, 121)
MIN_BINS = 5
MIN_GAIN = 12.0
"""Fall in the weighted squares that an exponential must bring over a flat line (chi squared, 1 degree)."""


def active_slope(histogram: PhaseHistogram, active: ActivePhase) -> float:
    """Return the change of rate over the active phase relative to its mean.

    A weighted line over time: +2 rises from nothing, -2 falls to nothing. NaN without an active
    phase of at least three bins.
    """
    first = int(np.floor(active.onset * histogram.n_bins / 2 + 1e-9)) if active.is_found else 0
    order = (first + np.arange(histogram.n_bins)) % histogram.n_bins
    order = order[active.is_active[order] & (histogram.exposure_s[order] > 0)]
    if not active.is_found or order.size < 3:
        return np.nan
    seconds = histogram.exposure_s[order]
    rate = histogram.counts[order] / seconds
    place = (np.cumsum(seconds) - seconds / 2) / seconds.sum()
    middle, mean = np.average(place, weights=seconds), np.average(rate, weights=seconds)
    away = place - middle
    if mean <= 0:
        return np.nan
    return float(np.sum(seconds * away * (rate - mean)) / np.sum(seconds * away**2) / mean)


def decay_ms(histogram: PhaseHistogram, active: ActivePhase) -> float:
    """Return the time constant in ms with which firing falls to background after its peak.

    An exponential is fitted by weighted least squares from the peak to the next transition, so a
    burst that ends sharply with its phase has none. NaN when the peak is within five bins of the
    transition, firing has not fallen to 1/e by then, or a flat line explains it as well.
    """
    half = histogram.n_bins // 2
    peak_bin = min(int(active.peak * half), histogram.n_bins - 1)
    bins = np.arange(peak_bin, half if peak_bin < half else 2 * half)
    seconds = histogram.exposure_s[bins]
    if not active.is_found or bins.size < MIN_BINS or not seconds.all():
        return np.nan
    rate = histogram.counts[bins] / seconds
    lasting = seconds / histogram.n_cycles
    after_s = np.cumsum(lasting) - lasting / 2
    weight = seconds / np.maximum(rate, rate.mean())
    tau_s = _fitted_tau(rate - active.background_hz, after_s, weight)
    return tau_s * 1000 if tau_s <= lasting.sum() else np.nan


def _fitted_tau(excess: FloatArray, after_s: FloatArray, weight: FloatArray) -> float:
    curves = np.exp(-after_s / TAUS_S[:, None])
    height = (curves * weight) @ excess / ((curves * weight) * curves).sum(axis=1)
    squares = (weight * (excess - height[:, None] * curves) ** 2).sum(axis=1)
    flat = np.sum(weight * (excess - np.average(excess, weights=weight)) ** 2)
    best = int(np.argmin(squares))
    if not 0 < best < TAUS_S.size - 1 or height[best] <= 0 or flat - squares[best] < MIN_GAIN:
        return np.nan
    left, middle, right = squares[best - 1 : best + 2]
    shift = 0.5 * (left - right) / max(left - 2 * middle + right, 1e-300)
    step = np.log(TAUS_S[1] / TAUS_S[0])
    return float(TAUS_S[best] * np.exp(np.clip(shift, -1, 1) * step))
