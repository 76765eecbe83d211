"""Cardiac spikes in the activity of a nerve: short, regular, far above what surrounds them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.signals.smoothing import filled, runs, widened

WINDOW_S = 0.05
REACH_S = 0.035
MAX_SPIKE_S = 0.03
FACTOR = 1.8
MIN_REGULAR = 0.6
BEATS_HZ = (0.8, 14.0)


@dataclass(frozen=True)
class Despiked:
    """Activity without cardiac spikes, and how often the heart beat (NaN when none was found)."""

    values: FloatArray
    beats_hz: float = np.nan

    @property
    def words(self) -> str:
        """Return what was found, in words."""
        return f"heart beats ({60 * self.beats_hz:.0f} a minute) cut out" if np.isfinite(self.beats_hz) else ""


def without_heart_beats(values: FloatArray, rate_hz: float, *, noise: float) -> Despiked:
    """Replace spikes of a regular train by the level on either side.

    A spike is shorter than 30 ms and stands well above the medians before and after it, so the
    edge of a burst is none. Nothing is removed unless the spikes come as regularly as a heart
    does: in a nerve of few fibres single impulses look the same, and they are the signal.

    Parameters
    ----------
    values : ndarray, shape (n_samples,)
        Fine activity; NaN in gaps.
    rate_hz : float
        Its rate.
    noise : float
        Standard deviation of one sample relative to the level around it.
    """
    if rate_hz * WINDOW_S < 5:
        return Despiked(values)
    around = _level_around(values, rate_hz)
    with np.errstate(invalid="ignore"):
        is_spike = values > around * max(FACTOR, 1 + 4.5 * noise)
    spikes = runs(is_spike)
    spikes = spikes[(spikes[:, 1] - spikes[:, 0]) <= MAX_SPIKE_S * rate_hz]
    beats = _joined(spikes, 0.03 * rate_hz)
    beats_hz = _regular_rate(beats, rate_hz)
    if np.isnan(beats_hz):
        return Despiked(values)
    flags = widened(_flagged(spikes, values.size), max(1, round(0.004 * rate_hz)))
    return Despiked(np.where(flags & np.isfinite(values), around, values), beats_hz)


def _level_around(values: FloatArray, rate_hz: float) -> FloatArray:
    from scipy.ndimage import median_filter

    width = round(WINDOW_S * rate_hz) | 1
    reach = width // 2 + max(1, round(0.2 * REACH_S * rate_hz))
    median = median_filter(filled(values), width, mode="nearest")
    before = np.concatenate([np.full(reach, median[0]), median[:-reach]])
    after = np.concatenate([median[reach:], np.full(reach, median[-1])])
    return np.maximum(before, after)


def _joined(spikes: np.ndarray, gap: float) -> FloatArray:
    """Return the centres of spikes, those of one QRS complex taken together."""
    if not len(spikes):
        return np.empty(0)
    centre = spikes.mean(axis=1)
    first = np.concatenate([[True], np.diff(centre) > gap])
    return np.asarray(centre[first])


def _regular_rate(beats: FloatArray, rate_hz: float) -> float:
    """Return the beats a second when the train is as regular as a heart's, else NaN.

    Beats hide inside bursts, so an interval of two or three beats counts as regular too.
    """
    if beats.size < 12:
        return np.nan
    intervals = np.diff(beats) / rate_hz
    beat_s = _commonest(intervals)
    ratio = intervals / beat_s
    nearest = np.clip(np.round(ratio), 1, 4)
    regular = np.mean(np.abs(ratio - nearest) < 0.15)
    in_range = BEATS_HZ[0] <= 1 / beat_s <= BEATS_HZ[1]
    return 1 / beat_s if regular >= MIN_REGULAR and in_range else np.nan


def _commonest(intervals: FloatArray) -> float:
    """Return the interval that most others lie near (within 12 %)."""
    ordered = np.sort(intervals)
    count = np.searchsorted(ordered, 1.12 * ordered) - np.searchsorted(ordered, 0.88 * ordered)
    return float(ordered[np.argmax(count)])


def _flagged(spikes: np.ndarray, n: int) -> BoolArray:
    step = np.zeros(n + 1)
    np.add.at(step, spikes[:, 0], 1)
    np.add.at(step, spikes[:, 1], -1)
    return np.cumsum(step[:-1]) > 0
