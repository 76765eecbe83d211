"""The detector fitted to one cell, and the events it finds in a block.

Before a cell's spikes are known the score is the bump filter. Once some are seen it is the
matched filter of their mean shape, whitened by the noise between them: the linear filter that
tells a known shape from coloured Gaussian noise best (North 1943; e.g. Kay, *Fundamentals of
Statistical Signal Processing: Detection Theory*, ch. 4). At 12 mV over 2 mV of noise sampled at
5 kHz this is what separates spikes from noise: 7 standard deviations, where dV/dt gives 4.5.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, fields
from math import inf

import numpy as np

from unitclass.records import FloatArray, IntArray
from unitclass.signals.vm_bumps import BumpFilter, Grid, noise_sd, peaks_above, quiet_mask
from unitclass.signals.vm_measures import Lens, measured
from unitclass.signals.vm_stream import Block

LEAST_Z = 3.3
"""Events below so many standard deviations of the score are not looked at."""

LEAST_NOISE_MV = 0.15
"""A trace without noise (a model cell) still has a smallest event worth a look: half a millivolt."""

AHP_MS = 10.0
"""The after-hyperpolarisation is sought for so long after the steepest rise."""


@dataclass(frozen=True)
class Kernel:
    """A matched filter on coarse bins: `taps`, with `before` of them before the centre.

    `steep_ms` is the time from the centre to the steepest rise of the mean shape.
    """

    taps: FloatArray
    before: int
    steep_ms: float


@dataclass(frozen=True)
class Detector:
    """All that is fitted to one cell before its spikes are sought.

    Attributes
    ----------
    noise_mv : float
        Standard deviation of the score where nothing happens.
    slope_noise_mv_ms : float
        The same of dV/dt as the lens takes it.
    kernel : Kernel or None
        None while the cell's spikes are not known.
    times_by_slope : bool
        True where dV/dt is clear enough to time each spike by itself.
    usual_slope_mv_ms : float
        Median maximal dV/dt of the spikes seen so far; inf while there are none.
    usual_size_mv : float
        Median score of the same.
    value_noise_mv : float
        Standard deviation of the fast noise of single values as the lens smooths them.
    shift_ms : float
        Added to moments read off dV/dt: a slope over several samples sees an uneven rise too early.
    """

    grid: Grid
    bump: BumpFilter
    lens: Lens
    noise_mv: float
    slope_noise_mv_ms: float
    kernel: Kernel | None = None
    times_by_slope: bool = True
    usual_slope_mv_ms: float = inf
    usual_size_mv: float = inf
    value_noise_mv: float = 0.0
    shift_ms: float = 0.0

    def least_slope_mv_ms(self, size_mv: FloatArray) -> FloatArray:
        """Return the threshold of dV/dt for events of these sizes, same shape.

        2.5 deviations of its noise, at most half of what the cell's spikes usually reach; in proportion
        for smaller events.
        """
        clear = np.full(size_mv.shape, 2.5 * self.slope_noise_mv_ms)
        if not np.isfinite(self.usual_size_mv):
            return clear
        return np.minimum(clear, 0.5 * self.usual_slope_mv_ms * np.clip(size_mv / self.usual_size_mv, 0.0, 1.0))

    def score(self, coarse: FloatArray) -> FloatArray:
        """Return the score of an event with its centre in each bin, mV; -inf near both ends."""
        if self.kernel is None:
            return self.bump.bumps(coarse)
        taps, before = self.kernel.taps, self.kernel.before
        out = np.full(coarse.size, -np.inf)
        if coarse.size >= taps.size:
            inner = np.convolve(coarse - coarse[0], taps[::-1], mode="valid")
            out[before : before + inner.size] = inner
        return out


@dataclass(frozen=True)
class Events:
    """All-or-none candidates, arrays of shape (n_events,).

    `size_mv` is the score (for a matched filter the height of the best fitting mean spike), `z` the
    same over the local noise, `bump_mv` how far the potential stands out above both sides.
    """

    time_s: FloatArray
    size_mv: FloatArray
    z: FloatArray
    bump_mv: FloatArray
    threshold_mv: FloatArray
    height_mv: FloatArray
    half_width_ms: FloatArray
    base_width_ms: FloatArray
    max_dvdt_mv_ms: FloatArray
    ahp_mv: FloatArray

    def select(self, rows: FloatArray | IntArray | np.ndarray) -> Events:
        """Return the events of `rows` (indices or a mask)."""
        return Events(*(getattr(self, f.name)[rows] for f in fields(self)))

    @staticmethod
    def joined(parts: Iterable[Events]) -> Events:
        """Return the events of all parts, in their order."""
        kept = list(parts)
        if not kept:
            return Events(*(np.empty(0) for _ in fields(Events)))
        return Events(*(np.concatenate([getattr(p, f.name) for p in kept]) for f in fields(Events)))


def events_in(block: Block, coarse: FloatArray, detector: Detector) -> Events:
    """Find and measure every event whose centre lies in the block's own samples.

    Parameters
    ----------
    block : Block
        With margins that are whole bins.
    coarse : ndarray
        `detector.grid.means(block.values)`.
    detector : Detector
        Fitted to the cell.
    """
    score = detector.score(coarse)
    peaks, noise = _peaks(score, detector)
    after = np.append(peaks[1:], coarse.size + 10_000)
    k = detector.grid.bin_samples
    own = (peaks * k >= block.first) & (peaks * k < block.last)
    return _measured_events(block, coarse, score, peaks[own], after[own], noise, detector)


def _peaks(score: FloatArray, detector: Detector) -> tuple[IntArray, float]:
    """Return the peaks over LEAST_Z and the noise of this block, events left out."""
    grid = detector.grid
    apart = grid.bins(1.2)
    rough = noise_sd(score, at_most=2000)
    start = max(min(rough, detector.noise_mv), LEAST_NOISE_MV)
    peaks = peaks_above(score, LEAST_Z * start, apart)
    quiet = quiet_mask(score.size, peaks[score[peaks] > 5.0 * start], grid.bins(4.0), grid.bins(8.0))
    noise = noise_sd(score[quiet], at_most=2000) if quiet.mean() > 0.2 else rough
    noise = max(noise, LEAST_NOISE_MV)
    return peaks[score[peaks] > LEAST_Z * noise], noise


def _measured_events(block: Block, coarse: FloatArray, score: FloatArray, peaks: IntArray, after: IntArray,
                     noise: float, detector: Detector) -> Events:
    if peaks.size == 0:
        return Events.joined([])
    grid, lens = detector.grid, detector.lens
    k = grid.bin_samples
    centre = np.round((peaks + 0.5) * k).astype(np.int64)
    first = np.clip(centre - lens.before, 0, max(0, block.values.size - lens.before - lens.after))
    waves = block.values[first[:, None] + np.arange(lens.before + lens.after)]
    found = measured(waves, lens)
    at = first + found.rise_samples + detector.shift_ms * 1e-3 * lens.rate_hz
    if detector.kernel is not None and not detector.times_by_slope:
        at = (peaks + 0.5 + score_vertex(score, peaks)) * k - 0.5 + detector.kernel.steep_ms * 1e-3 * lens.rate_hz
    trough = _trough_mv(coarse, (first + found.rise_samples) / k, after, grid)
    return Events(time_s=block.start_s + at / lens.rate_hz, size_mv=score[peaks], z=score[peaks] / noise,
                  bump_mv=_bump_near(coarse, peaks, detector), threshold_mv=found.threshold_mv,
                  height_mv=found.height_mv, half_width_ms=found.half_width_ms,
                  base_width_ms=found.base_width_ms, max_dvdt_mv_ms=found.max_dvdt_mv_ms,
                  ahp_mv=found.threshold_mv - trough)


def score_vertex(score: FloatArray, peaks: IntArray) -> FloatArray:
    """Return where the parabola through each peak of the score tops, in bins from the peak."""
    left, mid, right = score[peaks - 1], score[peaks], score[np.minimum(peaks + 1, score.size - 1)]
    with np.errstate(invalid="ignore", divide="ignore"):
        bend = left - 2.0 * mid + right
        shift = np.where(np.isfinite(bend) & (bend < 0.0), 0.5 * (left - right) / bend, 0.0)
    return np.clip(shift, -0.5, 0.5)


def _bump_near(coarse: FloatArray, peaks: IntArray, detector: Detector) -> FloatArray:
    """Return the largest bump within two bins of each peak."""
    half = detector.bump.half_span + 3
    near = np.clip(peaks[:, None] + np.arange(-half, half + 1), 0, coarse.size - 1)
    return np.asarray(detector.bump.bumps(coarse[near])[:, half - 2 : half + 3].max(axis=1))


def _trough_mv(coarse: FloatArray, rise: FloatArray, after: IntArray, grid: Grid) -> FloatArray:
    """Return the lowest coarse mean from the peak on, before the next event; NaN where there is no room."""
    first = np.ceil(rise).astype(np.int64) + grid.bins(0.4)
    columns = first[:, None] + np.arange(grid.bins(AHP_MS))
    last = np.minimum(after - grid.bins(1.0), coarse.size - 1)
    values = np.where(columns < last[:, None], coarse[np.clip(columns, 0, coarse.size - 1)], np.inf)
    lowest = values.min(axis=1)
    return np.where(np.isfinite(lowest), lowest, np.nan)
