"""Beats of the heart or strokes of a pump, from the channel that records them."""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.smoothing import boxcar, filled

SLOWEST_S, FASTEST_S = 3.0, 0.07  # a slow ventilator; a mouse's heart
LOOKED_AT_S = 120.0
BLUR_S = 0.03
REGULAR = 0.3  # autocorrelation one beat later
TALL = 0.4  # share of the usual beat's height that the least one reaches


def find_beats(values: FloatArray, rate_hz: float, start_s: float) -> FloatArray:
    """Return the time of every beat, s; none when nothing beats regularly.

    Parameters
    ----------
    values : ndarray, shape (n_samples,)
        Electrocardiogram, blood or perfusion pressure, or a pump's own signal; NaN in gaps.
    rate_hz : float
        50 or more.
    start_s : float
        Session time of the first sample.
    """
    from scipy.signal import find_peaks

    trace = _upright(filled(values), rate_hz)
    period_s = _period(trace, rate_hz)
    if np.isnan(period_s):
        return np.zeros(0)
    at, _ = find_peaks(trace, distance=max(1, round(0.6 * period_s * rate_hz)))
    height = trace[at]
    usual = float(np.median(height[height > np.median(height)])) if at.size > 2 else 0.0
    return np.asarray(start_s + at[(height > TALL * usual) & np.isfinite(values[at])] / rate_hz)


def _upright(trace: FloatArray, rate_hz: float) -> FloatArray:
    """Return the trace without its slow part, its sharper side up."""
    flat = trace - boxcar(trace, max(3, round(1.5 * rate_hz)) | 1)
    return flat if float(np.mean(flat**3)) >= 0 else -flat


def _period(trace: FloatArray, rate_hz: float) -> float:
    """Return the usual time from one beat to the next, s, by the autocorrelation; NaN when irregular."""
    # Hearts are not clocks: narrow peaks are widened so that they still meet one beat later.
    part = boxcar(trace[: int(LOOKED_AT_S * rate_hz)], max(1, round(BLUR_S * rate_hz)) | 1)
    part = part - part.mean()
    power = np.abs(np.fft.rfft(part, 2 * part.size)) ** 2
    same = np.fft.irfft(power)[: part.size]
    if same[0] <= 0:
        return float("nan")
    lags = np.arange(round(FASTEST_S * rate_hz), min(round(SLOWEST_S * rate_hz), part.size // 3))
    likeness = same[lags] / same[0] * part.size / (part.size - lags) if lags.size > 2 else np.zeros(3)
    is_top = np.r_[False, (likeness[1:-1] > likeness[:-2]) & (likeness[1:-1] >= likeness[2:]), False]
    tops = np.flatnonzero(is_top & (likeness > max(REGULAR, 0.8 * float(likeness.max()))))
    return float(lags[tops[0]] / rate_hz) if tops.size else float("nan")
