"""Floor and burst level of an activity, following slow drift, and what stands above them."""

from __future__ import annotations

from collections.abc import Callable

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
    power = values * values - np.asarray(floor) ** 2
    return np.asarray(np.sign(power) * np.sqrt(np.abs(power)))


def restored(level: FloatArray | float, floor: FloatArray | float, is_power: bool) -> FloatArray:
    """Return the trace value at which the excess equals `level`: the inverse of `excess`."""
    if not is_power:
        return np.asarray(np.asarray(floor) + level)
    return np.asarray(np.sqrt(np.asarray(floor) ** 2 + np.asarray(level) ** 2))


def first_floor(trace: FloatArray, rate_hz: float) -> FloatArray:
    """Return a running low percentile of a smoothed trace, shape (n_samples,): a first guess."""
    return _windowed(trace, rate_hz, FLOOR_WINDOW_S, lambda part: float(np.percentile(part, FLOOR_PERCENT)))


def first_peak(trace: FloatArray, rate_hz: float) -> FloatArray:
    """Return the running maximum of a trace over windows that hold at least one burst each."""
    return _windowed(trace, rate_hz, PEAK_WINDOW_S, lambda part: float(np.max(part)), neighbours=7)


def floor_between(trace: FloatArray, in_burst: BoolArray, rate_hz: float, window_s: float) -> FloatArray:
    """Return the running median of a trace outside its bursts, shape (n_samples,)."""
    quiet = np.where(in_burst, np.nan, trace)
    return _windowed(quiet, rate_hz, window_s, lambda part: float(np.median(part)), with_ends=True)


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


def _windowed(trace: FloatArray, rate_hz: float, window_s: float, statistic: Callable[[FloatArray], float],
              neighbours: int = 3, *, with_ends: bool = False) -> FloatArray:
    """Return a statistic of half-overlapping windows, read off between their centres.

    Beyond the outermost centres it stays as it is there or, `with_ends`, follows windows of half the
    length: a drift does not stop before the recording does.
    """
    step = max(1, int(rate_hz // COARSE_HZ))
    coarse = trace[::step]
    width = max(4, round(window_s * rate_hz / step))
    n_windows = max(1, round(2 * coarse.size / width) - 1)
    starts = np.linspace(0, max(0, coarse.size - width), n_windows).astype(int)
    found = np.array([_of_finite(coarse[start : start + width], statistic, width) for start in starts])
    smooth = running_median(filled(found), neighbours) if n_windows > 2 else filled(found)
    centres = (starts + min(width, coarse.size) / 2) * step
    if with_ends and n_windows > 2:
        half = width // 2
        ends = [_of_finite(part, statistic, width) for part in (coarse[:half], coarse[-half:])]
        smooth = np.concatenate([[ends[0]], smooth, [ends[1]]])
        centres = np.concatenate([[half / 2 * step], centres, [(coarse.size - half / 2) * step]])
        smooth = filled(smooth)
    return np.interp(np.arange(trace.size), centres, smooth)


def _of_finite(part: FloatArray, statistic: Callable[[FloatArray], float], width: int) -> float:
    finite = part[np.isfinite(part)]
    return statistic(finite) if finite.size >= min(4, width // 8) else np.nan
