"""Interspike intervals: irregularity within bursts, and intervals no single cell can make."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import BoolArray, FloatArray, IntArray


@dataclass(frozen=True)
class Intervals:
    """Interspike intervals that lie within bursts.

    `seconds` has shape (n_intervals,); `follows`, shape (n_intervals - 1,), is true where the next
    interval begins with the spike that ends this one.
    """

    seconds: FloatArray
    follows: BoolArray


def intervals_within(times_s: FloatArray, burst: IntArray) -> Intervals:
    """Return the intervals between successive spikes of the same burst, never across a silent phase.

    Parameters
    ----------
    times_s : ndarray, shape (n_spikes,)
        Ascending, in seconds.
    burst : ndarray, shape (n_spikes,)
        Which burst each spike belongs to; negative for none.
    """
    joined = (burst[1:] == burst[:-1]) & (burst[1:] >= 0)
    places = np.flatnonzero(joined)
    return Intervals(np.diff(times_s)[joined], np.diff(places) == 1)


def isi_cv(intervals: Intervals) -> float:
    """Return the coefficient of variation of the intervals; NaN with fewer than two."""
    t = intervals.seconds
    return float(t.std(ddof=1) / t.mean()) if t.size > 1 and t.mean() > 0 else np.nan


def isi_cv2(intervals: Intervals) -> float:
    """Return CV2, the mean of 2 |b - a| / (a + b) over successive intervals a, b [1]_; NaN without any.

    It sees local irregularity and not a rate that drifts through the burst.

    References
    ----------
    .. [1] G. R. Holt, W. R. Softky, C. Koch, R. J. Douglas, J. Neurophysiol. 75 (1996) 1806.
    """
    ratio = _successive(intervals)
    return float(2 * np.abs(ratio).mean()) if ratio.size else np.nan


def isi_lv(intervals: Intervals) -> float:
    """Return LV, the mean of 3 ((b - a) / (a + b))^2 over successive intervals a, b [1]_; NaN without any.

    References
    ----------
    .. [1] S. Shinomoto, K. Shima, J. Tanji, Neural Comput. 15 (2003) 2823.
    """
    ratio = _successive(intervals)
    return float(3 * np.square(ratio).mean()) if ratio.size else np.nan


def refractory_violations(spike_times_s: ArrayLike, refractory_ms: float) -> float:
    """Return the share of all interspike intervals shorter than `refractory_ms`; NaN with fewer than two spikes."""
    gaps = np.diff(np.sort(np.asarray(spike_times_s, dtype=float)))
    return float(np.count_nonzero(gaps < refractory_ms / 1000) / gaps.size) if gaps.size else np.nan


def _successive(intervals: Intervals) -> FloatArray:
    """Return (b - a)/(a + b) over pairs of intervals that share a spike."""
    a, b = intervals.seconds[:-1][intervals.follows], intervals.seconds[1:][intervals.follows]
    known = a + b > 0
    return np.asarray((b - a)[known] / (a + b)[known])
