"""What one cell's spikes and noise look like, learned from samples spread over the recording."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from unitclass.records import BoolArray, FloatArray, IntArray
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_bumps import BumpFilter, Grid, peaks_above, quiet_noise_sd
from unitclass.signals.vm_detector import LEAST_NOISE_MV, Detector, Events, Kernel, events_in
from unitclass.signals.vm_heights import dominant_size, spike_shaped
from unitclass.signals.vm_kernel import matched_taps
from unitclass.signals.vm_measures import Lens
from unitclass.signals.vm_sample import Sample, slope_noise, value_noise
from unitclass.signals.vm_timing import choose_timing

WIDTHS_MS = (0.6, 1.2, 2.4)
LEAST_SPIKES = 8
"""A mean shape of fewer spikes is more noise than shape."""


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
    detector, events = max(found, key=lambda pair: _contrast(pair[1]))
    for _ in range(2):
        if events.time_s.size < LEAST_SPIKES:
            return detector
        detector = _matched_detector(sample, detector, events)
        events = _dominant(sample, detector, settings)
    return detector


def _bump_detector(sample: Sample, grid: Grid, width_ms: float) -> Detector:
    lens = Lens(grid.rate_hz, width_ms, slope_samples=max(1, round(0.15e-3 * grid.rate_hz)))
    bump = BumpFilter(grid, width_ms)
    noise = quiet_noise_sd(np.concatenate([bump.bumps(c) for c in sample.coarse]), 2 * bump.half_span)
    return Detector(grid, bump, lens, max(noise, LEAST_NOISE_MV), slope_noise(sample, lens),
                    value_noise_mv=value_noise(sample, lens))


def _dominant(sample: Sample, detector: Detector, settings: MembraneSettings) -> Events:
    """Return the clear events of the dominant height in the sample."""
    events = Events.joined(events_in(b, c, detector) for b, c in zip(sample.blocks, sample.coarse, strict=True))
    clear = events.select(spike_shaped(events, detector, settings) & (events.z > 4.5))
    size, least = dominant_size(clear.size_mv)
    return clear.select((clear.size_mv >= max(least, 0.6 * size)) & (clear.size_mv <= 1.6 * size))


def _contrast(events: Events) -> float:
    """Return how far the dominant events stand out, for choosing the width of the bump filter."""
    if events.time_s.size == 0:
        return 0.0
    return float(np.sqrt(min(events.time_s.size, 50)) * np.median(events.z))


def _matched_detector(sample: Sample, detector: Detector, events: Events) -> Detector:
    centres = _centres(sample, detector, events)
    if not any(at.size for at in centres):
        return detector
    width = float(np.clip(np.median(events.half_width_ms), 0.4, 4.0))
    bump = BumpFilter(detector.grid, float(np.clip(1.2 * width, 0.5, 4.0)))
    taps, before = matched_taps(sample, detector.grid, centres, width)
    bare = replace(detector, bump=bump, kernel=Kernel(taps, before, 0.0))
    scores = [bare.score(c) for c in sample.coarse]
    noise = max(quiet_noise_sd(np.concatenate(scores), 2 * taps.size), LEAST_NOISE_MV)
    bare = replace(bare, noise_mv=noise)
    timing = choose_timing(sample, bare, _centres(sample, bare, events), scores, width)
    return replace(bare, lens=timing.lens, slope_noise_mv_ms=slope_noise(sample, timing.lens),
                   kernel=Kernel(taps, before, timing.steep_ms), times_by_slope=timing.by_slope,
                   usual_slope_mv_ms=timing.usual_slope_mv_ms, usual_size_mv=float(np.median(events.height_mv)),
                   value_noise_mv=value_noise(sample, timing.lens), shift_ms=timing.shift_ms)


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


def _has_neighbour(times: FloatArray, others: FloatArray, within_s: float) -> BoolArray:
    low = np.searchsorted(others, times - within_s)
    return np.asarray(np.searchsorted(others, times + within_s) > low)
