"""What is measured on each action potential: steepest rise, threshold, height, width.

Definitions (those of common practice; other programs differ in the numbers):

- dV/dt at j + 1/2 is the mean of the next `slope_samples` minus the mean of the last, over their
  distance: with one sample the plain difference, with more a fit that noise disturbs less.
- threshold: the potential where dV/dt, going back from the steepest rise, falls below 10 mV/ms
  (or 15 % of its own maximum where that is less: small and filtered spikes never reach 10).
- height: peak minus threshold. Half-width: duration above threshold + height / 2; base width: above
  threshold + height / 5, which is what a pop lasts from rise to fall.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray, IntArray

THRESHOLD_SLOPE_MV_MS = 10.0
THRESHOLD_SHARE = 0.15


@dataclass(frozen=True)
class Lens:
    """How closely to look: samples per slope and per smoothed value, chosen from the noise.

    `width_ms` is the spikes' usual half-width; it sets how far from the centre to search.
    """

    rate_hz: float
    width_ms: float
    slope_samples: int = 1
    smooth_samples: int = 1

    def samples(self, duration_ms: float) -> int:
        """Return the samples nearest to `duration_ms`."""
        return max(1, round(duration_ms * 1e-3 * self.rate_hz))

    @property
    def before(self) -> int:
        """Return the samples of a window before its centre."""
        return self.samples(1.5 * self.width_ms + 2.0) + self.slope_samples

    @property
    def after(self) -> int:
        """Return the samples of a window after its centre."""
        return self.samples(max(5.0 * self.width_ms, 2.5)) + self.slope_samples


@dataclass(frozen=True)
class Measures:
    """Per event, shape (n_events,): `rise_samples` is the steepest rise from the window's start.

    Widths are inf where the potential does not fall below their level inside the window.
    """

    rise_samples: FloatArray
    max_dvdt_mv_ms: FloatArray
    threshold_mv: FloatArray
    height_mv: FloatArray
    half_width_ms: FloatArray
    base_width_ms: FloatArray


def measured(waves: FloatArray, lens: Lens) -> Measures:
    """Measure every event.

    Parameters
    ----------
    waves : ndarray, shape (n_events, lens.before + lens.after)
        Potential in mV around each event, its centre at column `lens.before`.
    lens : Lens
        How closely to look.
    """
    smooth = smoothed(waves, lens.smooth_samples)
    slope = slopes(waves, lens.slope_samples) * (lens.rate_hz / 1e3)
    rise = _steepest(slope, lens)
    top_slope = slope[np.arange(rise.size), rise]
    threshold = _threshold_mv(smooth, slope, rise, top_slope, lens)
    peak = _peak(smooth, rise, lens)
    peak_mv = smooth[np.arange(rise.size), peak]
    height = peak_mv - threshold
    half, base = (_width_samples(smooth, peak, threshold + share * height) for share in (0.5, 0.2))
    sample_ms = 1e3 / lens.rate_hz
    return Measures(rise_samples=rise + 0.5 + _vertex(slope, rise), max_dvdt_mv_ms=top_slope,
                    threshold_mv=threshold, height_mv=height, half_width_ms=half * sample_ms,
                    base_width_ms=base * sample_ms)


def smoothed(waves: FloatArray, n: int) -> FloatArray:
    """Return the centred mean of `n` (odd) samples along the last axis; ends keep their value."""
    if n <= 1:
        return waves
    out = waves.copy()
    half = n // 2
    out[..., half : waves.shape[-1] - half] = _box_sums(waves, n) / n
    return out


def slopes(waves: FloatArray, m: int) -> FloatArray:
    """Return the mean of the `m` samples after each gap minus the `m` before, per sample.

    Shape as `waves`; column j is the slope at j + 1/2, and 0 where the window runs out.
    """
    out = np.zeros(waves.shape)
    sums = _box_sums(waves, m)
    out[..., m - 1 : waves.shape[-1] - m] = (sums[..., m:] - sums[..., :-m]) / (m * m)
    return out


def _box_sums(waves: FloatArray, n: int) -> FloatArray:
    """Return sums of `n` consecutive samples, shape (..., n_samples - n + 1)."""
    if n == 1:
        return waves
    total = np.cumsum(waves - waves[..., :1], axis=-1)
    zero = np.zeros((*waves.shape[:-1], 1))
    total = np.concatenate([zero, total], axis=-1)
    return np.asarray(total[..., n:] - total[..., :-n] + n * waves[..., :1])


def _steepest(slope: FloatArray, lens: Lens) -> IntArray:
    """Return the column of the steepest rise, sought around the centre only."""
    first = lens.before - lens.samples(1.5 * lens.width_ms)
    last = lens.before + lens.samples(0.75 * lens.width_ms) + 1
    return first + np.argmax(slope[:, first:last], axis=1)


def _vertex(slope: FloatArray, column: IntArray) -> FloatArray:
    """Return where the parabola through three points peaks, in samples from the middle one."""
    rows = np.arange(column.size)
    left, mid, right = slope[rows, column - 1], slope[rows, column], slope[rows, column + 1]
    bend = left - 2.0 * mid + right
    with np.errstate(invalid="ignore", divide="ignore"):
        shift = np.where(bend < 0.0, 0.5 * (left - right) / bend, 0.0)
    return np.clip(shift, -0.5, 0.5)


def _threshold_mv(smooth: FloatArray, slope: FloatArray, rise: IntArray, top: FloatArray,
                  lens: Lens) -> FloatArray:
    level = np.minimum(THRESHOLD_SLOPE_MV_MS, THRESHOLD_SHARE * top)
    back = rise[:, None] - np.arange(1, lens.samples(2.0) + 1)
    path = np.take_along_axis(slope, np.maximum(back, 0), axis=1)
    below = path < level[:, None]
    below[:, -1] = True
    rows = np.arange(rise.size)
    foot = np.maximum(back[rows, np.argmax(below, axis=1)], 1)
    low, high = slope[rows, foot], slope[rows, foot + 1]
    with np.errstate(invalid="ignore", divide="ignore"):
        part = np.clip(np.where(high > low, (level - low) / (high - low), 0.0), 0.0, 1.0)
    # The slope of column j stands at j + 1/2, so the crossing lies `part` of a sample after it.
    before = 0.5 * (smooth[rows, foot] + smooth[rows, foot + 1])
    after = 0.5 * (smooth[rows, foot + 1] + smooth[rows, foot + 2])
    return np.asarray(before + part * (after - before))


def _peak(smooth: FloatArray, rise: IntArray, lens: Lens) -> IntArray:
    """Return the column of the highest potential within two widths of the steepest rise."""
    ahead = rise[:, None] + np.arange(lens.samples(2.0 * lens.width_ms) + 2)
    ahead = np.minimum(ahead, smooth.shape[1] - 1)
    return rise + np.argmax(np.take_along_axis(smooth, ahead, axis=1), axis=1)


def _width_samples(smooth: FloatArray, peak: IntArray, level: FloatArray) -> FloatArray:
    """Return the samples between the crossings of `level` on both sides of the peak."""
    n = smooth.shape[1]
    columns = np.arange(n)
    below = smooth < level[:, None]
    rows = np.arange(peak.size)
    before, after = below & (columns < peak[:, None]), below & (columns > peak[:, None])
    a, b = n - 1 - np.argmax(before[:, ::-1], axis=1), np.argmax(after, axis=1)
    known = before[rows, a] & after[rows, b]
    rising = a + _crossing(smooth[rows, a], smooth[rows, np.minimum(a + 1, n - 1)], level)
    falling = b - 1 + _crossing(smooth[rows, b - 1], smooth[rows, b], level)
    return np.where(known, falling - rising, np.inf)


def _crossing(first: FloatArray, second: FloatArray, level: FloatArray) -> FloatArray:
    with np.errstate(invalid="ignore", divide="ignore"):
        part = np.where(second != first, (level - first) / (second - first), 0.5)
    return np.clip(part, 0.0, 1.0)
