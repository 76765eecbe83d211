"""Where the potential rises and falls again like a spike: a search on coarse means.

A bump is a centre of one spike width that stands out above *both* flanks. So a bridge step (which
does not fall), a slow synaptic potential (which falls late) and a pop (which holds no area)
hardly show, whatever the cell's spikes look like.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import BoolArray, FloatArray, IntArray

BIN_MS = 0.2
"""Length of a coarse bin, as near as whole samples allow: fine against any spike's width."""


@dataclass(frozen=True)
class Grid:
    """Coarse bins over samples at `rate_hz`."""

    rate_hz: float

    @property
    def bin_samples(self) -> int:
        """Return the samples averaged into one bin."""
        return max(1, round(1e-3 * BIN_MS * self.rate_hz))

    @property
    def bin_ms(self) -> float:
        """Return the length of a bin."""
        return 1e3 * self.bin_samples / self.rate_hz

    def bins(self, duration_ms: float, least: int = 1) -> int:
        """Return the bins nearest to `duration_ms`."""
        return max(least, round(duration_ms / self.bin_ms))

    def means(self, values: FloatArray) -> FloatArray:
        """Return the means of whole bins of `values`, shape (n_samples // bin_samples,)."""
        k = self.bin_samples
        if k == 1:
            return values
        rows = values[: values.size // k * k].reshape(-1, k)
        return np.asarray(rows @ np.full(k, 1.0 / k))


@dataclass(frozen=True)
class BumpFilter:
    """The bump detector for spikes about `width_ms` wide at half height."""

    grid: Grid
    width_ms: float

    @property
    def centre(self) -> int:
        """Return the bins of the centre."""
        return self.grid.bins(self.width_ms)

    @property
    def gap(self) -> int:
        """Return the bins left out between centre and flank."""
        return self.grid.bins(0.5 * self.width_ms)

    @property
    def flank(self) -> int:
        """Return the bins of each flank."""
        return self.grid.bins(0.75 * self.width_ms, least=2)

    @property
    def half_span(self) -> int:
        """Return the bins that a bump reaches to either side of its middle."""
        return self.centre // 2 + self.gap + self.flank + 1

    def bumps(self, coarse: FloatArray) -> FloatArray:
        """Return how far a centre with its middle in each bin stands above both flanks, mV.

        Shape as `coarse`, along the last axis; -inf within reach of either end.
        """
        out = np.full(coarse.shape, -np.inf)
        reach = self.gap + self.flank
        span = self.centre + reach
        n = coarse.shape[-1] - span - reach + 1
        if n <= 0:
            return out
        start = np.zeros((*coarse.shape[:-1], 1))
        total = np.concatenate([start, np.cumsum(coarse - coarse[..., :1], axis=-1)], axis=-1)
        flank = np.subtract(total[..., self.flank :], total[..., : -self.flank]) / self.flank
        centre = np.subtract(total[..., self.centre :], total[..., : -self.centre]) / self.centre
        first = reach + self.centre // 2
        later = span + self.gap
        sides = np.maximum(flank[..., :n], flank[..., later : later + n])
        out[..., first : first + n] = centre[..., reach : reach + n] - sides
        return out


def noise_sd(values: FloatArray, *, at_most: int = 20000) -> float:
    """Return a standard deviation by the median absolute deviation of at most `at_most` values."""
    some = values[:: max(1, values.size // at_most)]
    some = some[np.isfinite(some)]
    if some.size == 0:
        return 0.0
    return float(1.4826 * np.median(np.abs(some - np.median(some))))


def quiet_mask(n_bins: int, events: IntArray, before: int, after: int) -> BoolArray:
    """Return which of `n_bins` are not within `before` and `after` bins of an event."""
    edges = np.zeros(n_bins + 1, np.int64)
    np.add.at(edges, np.clip(events - before, 0, n_bins), 1)
    np.add.at(edges, np.clip(events + after + 1, 0, n_bins), -1)
    return np.asarray(np.cumsum(edges[:n_bins]) == 0)


def quiet_noise_sd(score: FloatArray, reach: int, *, at_most: int = 20000) -> float:
    """Return the noise of a score where nothing happens.

    Everything within `reach` bins of an excursion beyond five deviations is left out and the
    estimate repeated, so that a burst of spikes does not pass for noise.
    """
    sigma = noise_sd(score, at_most=at_most)
    for _ in range(2):
        wild = np.flatnonzero(np.abs(score) > 5.0 * sigma)
        quiet = quiet_mask(score.size, wild, reach, reach)
        if quiet.mean() < 0.1:
            break
        sigma = noise_sd(score[quiet], at_most=at_most)
    return sigma


def peaks_above(score: FloatArray, threshold: float, apart: int) -> IntArray:
    """Return the bins of local maxima over `threshold` that have no higher one within `apart` bins."""
    high = np.flatnonzero(score > threshold)
    if high.size == 0:
        return high
    level = score[high]
    before = np.where(high > 0, score[high - 1], -np.inf)
    after = np.where(high < score.size - 1, score[np.minimum(high + 1, score.size - 1)], -np.inf)
    peaks = high[(level >= before) & (level > after)]
    return peaks[leaders(peaks.astype(float), score[peaks], apart)]


def leaders(at: FloatArray, level: FloatArray, apart: float) -> BoolArray:
    """Return which of `at` (ascending) do not stand within `apart` of a higher one, highest first."""
    keep = np.ones(at.size, bool)
    if at.size < 2 or np.diff(at).min() > apart:
        return keep
    first = np.searchsorted(at, at - apart, side="left")
    last = np.searchsorted(at, at + apart, side="right")
    for i in np.argsort(-level, kind="stable"):
        if keep[i] and last[i] - first[i] > 1:
            keep[first[i] : last[i]] = False
            keep[i] = True
    return keep
