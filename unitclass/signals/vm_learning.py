"""What one cell's spikes and noise look like, learned from samples spread over the recording."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from unitclass.records import ChunkReader, FloatArray, IntArray
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_bumps import BumpFilter, Grid, noise_sd, peaks_above, quiet_mask, quiet_noise_sd
from unitclass.signals.vm_detector import Detector, Events, Kernel, events_in, score_vertex
from unitclass.signals.vm_heights import dominant_size, spike_shaped
from unitclass.signals.vm_measures import Lens, measured, slopes
from unitclass.signals.vm_stream import Block, BlockPlan, blocks

N_WINDOWS = 16
WINDOW_S = 3.0
WIDTHS_MS = (0.6, 1.2, 2.4)
LEAST_SPIKES = 8
"""A mean shape of fewer spikes is more noise than shape."""

SHAPE_DOUBT = 0.04
"""How far single spikes differ from the mean shape, as a share of its height: bounds the whitening."""


@dataclass(frozen=True)
class Sample:
    """Blocks to learn from and their coarse means."""

    blocks: tuple[Block, ...]
    coarse: tuple[FloatArray, ...]


def plan_for(grid: Grid) -> BlockPlan:
    """Return blocks of five seconds with margins of 40 ms, both whole bins."""
    k = grid.bin_samples
    own, margin = k * round(5.0 * grid.rate_hz / k), k * int(np.ceil(0.04 * grid.rate_hz / k))
    return BlockPlan(grid.rate_hz, own, margin)


def sample_blocks(reader: ChunkReader, grid: Grid, start_s: float, stop_s: float) -> Sample:
    """Read the whole of a short recording, else sixteen windows of three seconds spread over it."""
    plan = plan_for(grid)
    if stop_s - start_s <= N_WINDOWS * WINDOW_S + 12.0:
        found = list(blocks(reader, plan, start_s, stop_s))
    else:
        found = [b for low in _window_starts(start_s, stop_s) for b in blocks(reader, plan, low, low + WINDOW_S)]
        if sum(b.last - b.first for b in found) < 5.0 * grid.rate_hz:
            found = _first_minute(reader, plan, start_s, stop_s)
    return Sample(tuple(found), tuple(grid.means(b.values) for b in found))


def _first_minute(reader: ChunkReader, plan: BlockPlan, start_s: float, stop_s: float) -> list[Block]:
    """Return the first blocks that there are: a recording that is mostly gap."""
    found: list[Block] = []
    for block in blocks(reader, plan, start_s, stop_s):
        found.append(block)
        if len(found) >= 12:
            break
    return found


def _window_starts(start_s: float, stop_s: float) -> FloatArray:
    """Spread the windows evenly but out of step, so that no rhythm can hide between them."""
    step = (stop_s - start_s) / N_WINDOWS
    shift = (np.arange(N_WINDOWS) * 0.6180339887) % 1.0
    return np.asarray(start_s + step * np.arange(N_WINDOWS) + shift * (step - WINDOW_S))


def learn_detector(sample: Sample, grid: Grid, settings: MembraneSettings) -> Detector:
    """Fit the detector to the cell.

    Parameters
    ----------
    sample : Sample
        Blocks to learn from; at least one.
    grid : Grid
        The coarse bins.
    settings : MembraneSettings
        Limits the user set.

    Returns
    -------
    Detector
        With a matched filter where at least eight clear spikes were seen, else the bump filter.
    """
    found = [(detector, _dominant(sample, detector, settings))
             for detector in (_bump_detector(sample, grid, width) for width in WIDTHS_MS)]
    detector, events = max(found, key=lambda pair: _contrast(*pair))
    for _ in range(3):
        if events.time_s.size < LEAST_SPIKES:
            return detector
        detector = _matched_detector(sample, detector, events, settings)
        events = _dominant(sample, detector, settings)
    return detector


def _bump_detector(sample: Sample, grid: Grid, width_ms: float) -> Detector:
    m = max(1, round(0.15e-3 * grid.rate_hz))
    lens = Lens(grid.rate_hz, width_ms, slope_samples=m, smooth_samples=1)
    bump = BumpFilter(grid, width_ms)
    noise = quiet_noise_sd(np.concatenate([bump.bumps(c) for c in sample.coarse]), 2 * bump.half_span)
    return Detector(grid, bump, lens, max(noise, 1e-3), _slope_noise(sample, lens))


def _slope_noise(sample: Sample, lens: Lens) -> float:
    some = [slopes(b.values[b.first : min(b.last, b.first + 40_000)], lens.slope_samples)
            for b in sample.blocks[:: max(1, len(sample.blocks) // 8)]]
    return noise_sd(np.concatenate(some)) * lens.rate_hz / 1e3


def _dominant(sample: Sample, detector: Detector, settings: MembraneSettings) -> Events:
    """Return the clear events of the dominant height in the sample."""
    events = Events.joined(events_in(b, c, detector) for b, c in zip(sample.blocks, sample.coarse, strict=True))
    clear = events.select(spike_shaped(events, detector, settings) & (events.z > 4.5))
    size, least = dominant_size(clear.size_mv)
    return clear.select((clear.size_mv >= max(least, 0.6 * size)) & (clear.size_mv <= 1.6 * size))


def _contrast(detector: Detector, events: Events) -> float:
    """Return how far the dominant events stand out, for choosing the width of the bump filter."""
    if events.time_s.size == 0:
        return 0.0
    return float(np.sqrt(min(events.time_s.size, 50)) * np.median(events.z))


def _matched_detector(sample: Sample, detector: Detector, events: Events, settings: MembraneSettings) -> Detector:
    width = float(np.clip(np.median(events.half_width_ms), 0.4, 4.0))
    lens, by_slope, slope = _lens_for(sample, detector, events, width)
    centres = _centres(sample, detector, events)
    taps, before = _matched_taps(sample, detector.grid, centres, width)
    bare = replace(detector, lens=lens, bump=BumpFilter(detector.grid, float(np.clip(1.2 * width, 0.5, 4.0))),
                   kernel=Kernel(taps, before, 0.0), times_by_slope=by_slope,
                   slope_noise_mv_ms=_slope_noise(sample, lens), usual_slope_mv_ms=slope)
    scores = [bare.score(c) for c in sample.coarse]
    noise = max(quiet_noise_sd(np.concatenate(scores), 2 * taps.size), 1e-3)
    steep_ms = _steepest_ms(sample, bare, scores, noise)
    return replace(bare, noise_mv=noise, kernel=Kernel(taps, before, steep_ms))


def _centres(sample: Sample, detector: Detector, events: Events) -> list[IntArray]:
    """Return, per block, the bins at which the score of the given events peaks."""
    bin_s = 1e-3 * detector.grid.bin_ms
    found = []
    for block, coarse in zip(sample.blocks, sample.coarse, strict=True):
        score = detector.score(coarse)
        peaks = peaks_above(score, 3.0 * detector.noise_mv, detector.grid.bins(1.2))
        times = block.start_s + (peaks + 0.5) * bin_s
        found.append(peaks[_has_neighbour(times, events.time_s, 1e-3 * (1.0 + detector.lens.width_ms))])
    return found


def _has_neighbour(times: FloatArray, others: FloatArray, within_s: float) -> np.ndarray:
    low = np.searchsorted(others, times - within_s)
    return np.asarray(np.searchsorted(others, times + within_s) > low)


def _lens_for(sample: Sample, detector: Detector, events: Events, width_ms: float) -> tuple[Lens, bool, float]:
    """Choose how many samples a slope and a smoothed value take, and whether slopes can time a spike.

    The shortest slope that stands eight deviations out of its noise, up to 0.2 ms; else the clearest up
    to 0.4 ms, and then the matched filter times the spikes. The third result is the usual slope.
    """
    rate = detector.grid.rate_hz
    clearest, best, usual = 1, 0.0, 0.0
    for m in _span_samples(rate, 0.4):
        lens = Lens(rate, width_ms, slope_samples=m)
        slope = _usual_slope(sample, lens, events)
        clarity = slope / max(_slope_noise(sample, lens), 1e-6)
        if clarity >= 8.0 and (m == 1 or m <= 0.2e-3 * rate):
            return _smoothing(sample, lens, events), True, slope
        if clarity > best:
            clearest, best, usual = m, clarity, slope
    return _smoothing(sample, Lens(rate, width_ms, slope_samples=clearest), events), False, usual


def _span_samples(rate_hz: float, longest_ms: float) -> list[int]:
    longest = max(2, round(longest_ms * 1e-3 * rate_hz))
    return sorted({m for m in (1, 2, 3, 4, 6, 8, 10, 12, 16, 20, 24, longest) if m <= longest})


def _usual_slope(sample: Sample, lens: Lens, events: Events) -> float:
    waves = _waves(sample, lens, events.time_s[:: max(1, events.time_s.size // 100)])
    return float(np.median(measured(waves, lens).max_dvdt_mv_ms)) if waves.size else 0.0


def _smoothing(sample: Sample, lens: Lens, events: Events) -> Lens:
    """Smooth until the noise is a fortieth of the spike's height, or over 0.2 ms."""
    plain = replace(lens, slope_samples=1)
    noise_mv = _slope_noise(sample, plain) * 1e3 / lens.rate_hz / np.sqrt(2.0)
    height = float(np.median(events.height_mv))
    wanted = min((40.0 * noise_mv / max(height, 1e-6)) ** 2, 0.2e-3 * lens.rate_hz)
    return replace(lens, smooth_samples=max(1, int(wanted + 1) // 2 * 2 - 1))


def _waves(sample: Sample, lens: Lens, times_s: FloatArray) -> FloatArray:
    """Return windows around the given moments, shape (n, lens.before + lens.after)."""
    columns = np.arange(lens.before + lens.after) - lens.before
    parts = []
    for block in sample.blocks:
        at = np.round((times_s - block.start_s) * lens.rate_hz).astype(np.int64)
        at = at[(at >= block.first) & (at < block.last)]
        at = at[(at >= lens.before) & (at < block.values.size - lens.after)]
        parts.append(block.values[at[:, None] + columns])
    return np.concatenate(parts)


def _matched_taps(sample: Sample, grid: Grid, centres: Sequence[IntArray], width_ms: float) -> tuple[FloatArray, int]:
    """Return the whitened matched filter, centred on the peak, that scores the mean spike's own height."""
    before, after = grid.bins(max(1.2, 1.5 * width_ms)), grid.bins(max(2.5, 3.0 * width_ms))
    columns = np.arange(-before, after + 1)
    shift = int(np.argmax(_stacked(sample, centres, columns).mean(axis=0))) - before
    centres = [at + shift for at in centres]
    shape = _stacked(sample, centres, columns).mean(axis=0)
    return _whitened(shape, _quiet_pieces(sample, grid, centres, columns), before), before


def _stacked(sample: Sample, centres: Sequence[IntArray], columns: IntArray) -> FloatArray:
    """Return coarse windows around the centres, shape (n_spikes, n_columns)."""
    parts = []
    for coarse, at in zip(sample.coarse, centres, strict=True):
        at = at[(at + columns[0] >= 0) & (at + columns[-1] < coarse.size)]
        parts.append(coarse[at[:, None] + columns])
    return np.concatenate(parts)


def _quiet_pieces(sample: Sample, grid: Grid, centres: Sequence[IntArray], columns: IntArray) -> FloatArray:
    """Return windows of the same length that no spike comes near, at most 2000."""
    parts = []
    for coarse, at in zip(sample.coarse, centres, strict=True):
        starts = np.arange(0, coarse.size - columns.size, columns.size)
        free = quiet_mask(coarse.size, at, grid.bins(3.0), grid.bins(8.0))
        windows = starts[:, None] + np.arange(columns.size)
        parts.append(coarse[windows[np.all(free[windows], axis=1)]])
    pieces = np.concatenate(parts)
    return pieces[:: max(1, pieces.shape[0] // 2000)]


def _whitened(shape: FloatArray, quiet: FloatArray, before: int) -> FloatArray:
    """Solve (noise covariance) taps = shape, blind to level and slope of the potential."""
    n = shape.size
    blind, _ = np.linalg.qr(np.stack([np.ones(n), np.linspace(-1.0, 1.0, n)], axis=1))
    height = float(shape.max() - shape[: max(1, before // 2)].mean())
    quiet = quiet - (quiet @ blind) @ blind.T
    covariance = np.eye(n) * (SHAPE_DOUBT * height) ** 2
    if quiet.shape[0] >= 3 * n:
        covariance += quiet.T @ quiet / quiet.shape[0]
    elif quiet.size:
        covariance += np.eye(n) * float(np.mean(quiet**2))
    seen = shape - blind @ (blind.T @ shape)
    taps = np.linalg.solve(covariance + blind @ blind.T * height**2, seen)
    taps -= blind @ (blind.T @ taps)
    return np.asarray(taps * (height / (taps @ shape)))


def _steepest_ms(sample: Sample, detector: Detector, scores: Sequence[FloatArray], noise: float) -> float:
    """Return the time from the filter's centre to the steepest rise of the mean spike at the full rate."""
    rate = detector.lens.rate_hz
    lens = replace(detector.lens, slope_samples=max(1, round(0.1e-3 * rate)), smooth_samples=1)
    waves = np.concatenate([_aligned(b.values, _clear_centres(s, detector.grid, noise), lens)
                            for b, s in zip(sample.blocks, scores, strict=True)])
    if waves.size == 0:
        return 0.0
    return float((measured(waves.mean(axis=0)[None], lens).rise_samples[0] - lens.before) * 1e3 / rate)


def _clear_centres(score: FloatArray, grid: Grid, noise: float) -> FloatArray:
    """Return the interpolated samples at which the score of clear events peaks."""
    top = score[np.isfinite(score)].max(initial=0.0)
    peaks = peaks_above(score, max(4.5 * noise, 0.4 * top), grid.bins(1.2))[:200]
    return np.asarray((peaks + 0.5 + score_vertex(score, peaks)) * grid.bin_samples - 0.5)


def _aligned(values: FloatArray, at: FloatArray, lens: Lens) -> FloatArray:
    """Return windows whose centres are the samples `at`, by linear interpolation."""
    whole = np.floor(at).astype(np.int64)
    inside = (whole >= lens.before) & (whole < values.size - lens.after - 1)
    whole, part = whole[inside], (at - whole)[inside][:, None]
    columns = whole[:, None] + np.arange(lens.before + lens.after) - lens.before
    return np.asarray((1.0 - part) * values[columns] + part * values[columns + 1])
