"""Floor and burst level of an activity, following slow drift, and what stands above them."""

from __future__ import annotations

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.signals.smoothing import filled

FLOOR_WINDOW_S = 30.0
PEAK_WINDOW_S = 24.0
"""Long enough to hold a burst at three cycles a minute."""
COARSE_HZ = 50.0
FLOOR_PERCENT = 20.0


def excess(values: FloatArray, floor: FloatArray | float, is_power: bool) -> FloatArray:
    """Return what stands above the floor, same shape; negative below it.

    Independent noises add as powers: a rectified trace of floor f and burst e reads
    sqrt(f² + e²), so e is found in quadrature. Otherwise the difference.
    """
    if not is_power:
        return np.asarray(values - floor)
    power = values * values
    power -= np.square(floor)
    return np.copysign(np.sqrt(np.abs(power)), power)


def restored(level: FloatArray | float, floor: FloatArray | float, is_power: bool) -> FloatArray:
    """Return the trace value at which the excess equals `level`: the inverse of `excess`."""
    if not is_power:
        return np.asarray(np.asarray(floor) + level)
    return np.asarray(np.sqrt(np.asarray(floor) ** 2 + np.asarray(level) ** 2))


def first_floor(trace: FloatArray, rate_hz: float) -> FloatArray:
    """Return a running low percentile of a smoothed trace, shape (n_samples,): a first guess."""
    return _windowed(trace, rate_hz, FLOOR_WINDOW_S, FLOOR_PERCENT / 100)


def first_peak(trace: FloatArray, rate_hz: float) -> FloatArray:
    """Return the running maximum of a trace over windows that hold at least one burst each."""
    return _windowed(trace, rate_hz, PEAK_WINDOW_S, 1.0, neighbours=7)


def floor_between(trace: FloatArray, in_burst: BoolArray, rate_hz: float, window_s: float) -> FloatArray:
    """Return the running median of a trace outside its bursts, shape (n_samples,)."""
    quiet = np.where(in_burst, np.nan, trace)
    return _windowed(quiet, rate_hz, window_s, 0.5, with_ends=True)


def running_median(values: FloatArray, n: int) -> FloatArray:
    """Return the median of each value and its `n` nearest, shape (n_values,); windows shrink at the ends.

    A slow drift is followed to the last value, but no window holds fewer than five.
    """
    if values.size <= n:
        return np.full(values.size, np.median(values)) if values.size else values
    half, least = n // 2, min(n, 5)
    inner = np.median(np.lib.stride_tricks.sliding_window_view(values, 2 * half + 1), axis=1)
    reach = [max(2 * i + 1, least) for i in range(half)]
    return np.concatenate([[np.median(values[:k]) for k in reach], inner,
                           [np.median(values[-k:]) for k in reversed(reach)]])


def _windowed(trace: FloatArray, rate_hz: float, window_s: float, share: float, neighbours: int = 3, *,
              with_ends: bool = False) -> FloatArray:
    """Return the quantile `share` of half-overlapping windows, read off between their centres.

    Beyond the outermost centres it stays as it is there or, `with_ends`, follows windows of half the
    length: a drift does not stop before the recording does.
    """
    if not trace.size:
        return trace
    step = max(1, int(rate_hz // COARSE_HZ))
    coarse = trace[::step]
    width = max(4, round(window_s * rate_hz / step))
    n_windows = max(1, round(2 * coarse.size / width) - 1)
    starts = np.linspace(0, max(0, coarse.size - width), n_windows).astype(int)
    windows = coarse[starts[:, None] + np.arange(min(width, coarse.size))]
    found = _quantile(windows, share, width)
    smooth = running_median(filled(found), neighbours) if n_windows > 2 else filled(found)
    centres = (starts + min(width, coarse.size) / 2) * step
    if with_ends and n_windows > 2:
        half = width // 2
        ends = _quantile(np.stack([coarse[:half], coarse[-half:]]), share, width)
        smooth = np.concatenate([[ends[0]], smooth, [ends[1]]])
        centres = np.concatenate([[half / 2 * step], centres, [(coarse.size - half / 2) * step]])
        smooth = filled(smooth)
    return np.interp(np.arange(trace.size), centres, smooth)


def _quantile(windows: FloatArray, share: float, width: int) -> FloatArray:
    """Return the quantile of the finite values of each row, linear between ranks; NaN where they are too few."""
    ordered = np.sort(np.where(np.isfinite(windows), windows, np.nan), axis=1)  # NaN comes last
    n_finite = np.count_nonzero(np.isfinite(ordered), axis=1)
    place = share * np.maximum(n_finite - 1, 0)
    below = np.floor(place).astype(int)
    rows = np.arange(len(ordered))
    low, high = ordered[rows, below], ordered[rows, np.ceil(place).astype(int)]
    return np.where(n_finite >= min(4, width // 8), low + (place - below) * (high - low), np.nan)
