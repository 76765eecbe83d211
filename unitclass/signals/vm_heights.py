"""Which events are a cell's spikes, which are spikelets, which neither.

A cell's spikes are its dominant height: the tallest group with enough members. Smaller
all-or-none events are spikelets, counted apart. Heights drift with the electrode's seal, and
shrink along a burst, so the height that counts is a running one, and an event only somewhat
smaller than the spike just before it belongs to the same burst.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from math import erfc, sqrt

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_bumps import leaders
from unitclass.signals.vm_detector import Detector, Events

LEAST_HEIGHT_MV = 7.0
"""A cell whose largest events are smaller has no spikes here: remote sharp electrodes see over 10 mV."""

WIDEST_SPIKELET_MS = 2.5
GRADED_CV = 0.18
"""Events whose sizes vary more (noise alone gives 0.05 to 0.15) are not all-or-none."""

BURST_S = 0.1
BURST_SHRINK = 0.6


@dataclass(frozen=True)
class Sorted:
    """Masks over the events, shape (n_events,), and what was decided on the way."""

    is_spike: BoolArray
    is_spikelet: BoolArray
    n_artefacts: int
    dominant_mv: float
    least_z: float
    new_heights_s: tuple[float, ...] = ()


def sort_events(events: Events, detector: Detector, settings: MembraneSettings, observed_s: float) -> Sorted:
    """Tell spikes from spikelets, artefacts and noise.

    Parameters
    ----------
    events : Events
        In time order.
    detector : Detector
        That found them.
    settings : MembraneSettings
        Limits the user set; 0 derives them.
    observed_s : float
        Seconds searched; sets how many chance crossings are to be expected.
    """
    shaped = spike_shaped(events, detector, settings)
    clear = shaped & (events.z > 4.5)
    dominant, split = dominant_size(events.size_mv[clear])
    if not _is_tall_enough(events, clear, split, settings):
        return _no_spikes(events, clear, dominant, too_brief(events, settings, detector))
    least_z = threshold_z(float(np.median(events.z[clear & (events.size_mv >= split)])),
                          float(np.sum(clear) / max(observed_s, 1e-9)))
    typical = clear & (events.size_mv >= split)
    width = float(np.median(events.half_width_ms[typical]))
    usual = ~too_brief(events, settings, detector, usual_ms=width) & (events.half_width_ms <= 3.5 * width + 0.5)
    passing = shaped & usual & (events.z >= least_z) & (events.height_mv >= settings.min_height_mv)
    is_spike, jumps = _follow(events, passing, dominant, split / dominant)
    is_spike = _refractory(events, is_spike, settings.refractory_ms)
    spikelet = shaped & usual & ~is_spike & _sharp(events) & (events.half_width_ms >= 0.6 * width)
    spikelet &= ~_near(events.time_s, events.time_s[is_spike], 0.004)
    n_artefacts = int(np.sum((events.z > 6.0) & ~is_spike & (events.height_mv > 0.4 * dominant)
                             & too_brief(events, settings, detector, usual_ms=width)))
    return Sorted(is_spike, spikelet, n_artefacts, dominant, least_z, jumps)


def spike_shaped(events: Events, detector: Detector, settings: MembraneSettings) -> BoolArray:
    """Return which events rise steeply, last long enough, and fall again on both sides."""
    slope = settings.min_dvdt_mv_ms or detector.least_slope_mv_ms(events.size_mv)
    return ((events.max_dvdt_mv_ms >= slope) & _stands_out(events) & _is_as_high_as_it_scores(events, detector)
            & ~too_brief(events, settings, detector)
            & (events.half_width_ms <= max(6.0, 4.0 * detector.lens.width_ms)))


def _stands_out(events: Events) -> BoolArray:
    """Return which events are bumps of about the size their score says: not the flank of another, not a step."""
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = events.bump_mv / events.size_mv
    clear = events.z > 4.5
    usual = min(float(np.median(ratio[clear])), 1.0) if clear.any() else 1.0
    noise = events.size_mv / np.maximum(events.z, 1e-9)
    return np.asarray(events.bump_mv >= 0.35 * usual * events.size_mv - 2.0 * noise)


def _is_as_high_as_it_scores(events: Events, detector: Detector) -> BoolArray:
    """Return which events rise by about what their score says: not the echo of a pop in the filter."""
    clear = (events.z > 4.5) & (events.height_mv > 0.0)
    usual = float(np.median(events.height_mv[clear] / events.size_mv[clear])) if clear.any() else 1.0
    least = 0.65 * usual * events.size_mv - 0.5 * detector.value_noise_mv
    return np.asarray((events.height_mv > 0.0) & (events.height_mv >= least))


def too_brief(events: Events, settings: MembraneSettings, detector: Detector, *,
              usual_ms: float = 0.0) -> BoolArray:
    """Return which events are pops: they rise and fall within `min_width_ms`, or far faster than the cell's.

    A single sample cannot look briefer than 1.6 of its intervals, and smoothing lengthens it. Noise can
    make a small spike look brief: an event below twelve deviations of the noise is a pop only if its
    score, which averages over the whole shape, is small for its height too.

    Parameters
    ----------
    usual_ms : float
        Usual half-width of the cell's spikes; 0 while it is not known.
    """
    sample_ms = 1e3 / detector.lens.rate_hz
    least_ms = max(settings.min_width_ms, 1.7 * sample_ms) + 0.6 * (detector.lens.smooth_samples - 1) * sample_ms
    brief = (events.base_width_ms < least_ms) | (events.half_width_ms < 0.45 * usual_ms)
    longer = ~brief & (events.z > 4.5) & (events.height_mv > 0.0)
    if longer.sum() < 5 or not brief.any():
        return np.asarray(brief)
    usual = float(np.median(events.size_mv[longer] / events.height_mv[longer]))
    fits = events.size_mv >= 0.65 * usual * events.height_mv
    return np.asarray(brief & ~(fits & (events.height_mv < 12.0 * detector.value_noise_mv)))


def dominant_size(sizes: FloatArray) -> tuple[float, float]:
    """Return the median of the tallest group of sizes that has enough members, and its lower limit.

    Groups are parted where the density of the logarithm falls below half of both its neighbouring
    modes and the modes differ by half as much again. The limit is 0 where nothing lies below. Enough is
    three in a hundred, at least five, and never more than twenty: some artefacts are taller than spikes.
    """
    if sizes.size == 0:
        return 0.0, 0.0
    limits = [0.0, *group_limits(sizes), np.inf]
    enough = min(20.0, max(5.0, 0.03 * sizes.size))
    for low, high in reversed(list(pairwise(limits))):
        inside = sizes[(sizes >= low) & (sizes < high)]
        if inside.size >= enough or low == 0.0:
            return float(np.median(inside if inside.size else sizes)), float(low)
    return float(np.median(sizes)), 0.0


def group_limits(sizes: FloatArray, *, bin_log2: float = 0.1) -> list[float]:
    """Return the sizes at which groups part, ascending."""
    logs = np.log2(np.maximum(sizes, 1e-6))
    n_bins = max(3, int(np.ceil((logs.max() - logs.min()) / bin_log2)) + 6)
    low = logs.min() - 3 * bin_log2
    counts, edges = np.histogram(logs, bins=n_bins, range=(low, low + n_bins * bin_log2))
    density = np.convolve(counts.astype(float), [0.05, 0.25, 0.4, 0.25, 0.05], mode="same")
    modes = [i for i in range(1, n_bins - 1) if density[i] > density[i - 1] and density[i] >= density[i + 1]]
    limits: list[float] = []
    last = modes[0] if modes else 0
    for mode in modes[1:]:
        valley = last + int(np.argmin(density[last : mode + 1]))
        is_deep = density[valley] < 0.5 * min(density[last], density[mode])
        if is_deep and (mode - last) * bin_log2 >= np.log2(1.5):
            limits.append(float(2.0 ** (edges[valley] + 0.5 * bin_log2)))
            last = mode
        elif density[mode] > density[last]:
            last = mode
    return limits


def threshold_z(dominant_z: float, rate_hz: float, *, tests_hz: float = 1500.0) -> float:
    """Return the score, in deviations, from which an event counts.

    Where spikes stand far out of the noise: chance crossings of one in a thousand seconds. Where they do
    not: the level at which chance crossings and missed spikes are as many.
    """
    levels = np.arange(LOWEST_Z, 6.0, 0.05)
    chance = tests_hz * np.array([_tail(z) for z in levels])
    missed = rate_hz * np.array([_tail(dominant_z - z) for z in levels])
    strict = levels[np.flatnonzero(chance <= 1e-3)[0]]
    even = levels[int(np.argmin(chance + missed))]
    return float(min(strict, max(even, LOWEST_Z)))


LOWEST_Z = 3.4


def _tail(z: float) -> float:
    return 0.5 * erfc(z / sqrt(2.0))


def _is_tall_enough(events: Events, clear: BoolArray, split: float, settings: MembraneSettings) -> bool:
    tall = events.height_mv[clear & (events.size_mv >= split)]
    return bool(tall.size and np.median(tall) >= (settings.min_height_mv or LEAST_HEIGHT_MV))


def _sharp(events: Events) -> BoolArray:
    """Return which events are clear and as sharp as an action current: synaptic potentials fall slowly."""
    return np.asarray((events.z > 5.5) & (events.height_mv > 2.0) & (events.bump_mv >= 0.3 * events.height_mv))


def _no_spikes(events: Events, clear: BoolArray, dominant: float, brief: BoolArray) -> Sorted:
    """Return the verdict on a cell without spikes: all-or-none events of one size are spikelets."""
    spikelet = clear & _sharp(events) & (events.half_width_ms < WIDEST_SPIKELET_MS)
    sizes = events.size_mv[spikelet]
    if sizes.size >= 10 and 1.4826 * np.median(np.abs(sizes - np.median(sizes))) > GRADED_CV * np.median(sizes):
        spikelet = np.zeros(spikelet.size, bool)  # graded: synaptic
    n_artefacts = int(np.sum(brief & (events.z > 6.0) & (events.height_mv > LEAST_HEIGHT_MV)))
    return Sorted(np.zeros(events.time_s.size, bool), spikelet, n_artefacts, dominant, 5.5)


def _follow(events: Events, passing: BoolArray, dominant: float, least: float) -> tuple[BoolArray, tuple[float, ...]]:
    """Go through the events in time with a running height; return the spikes and where it jumped.

    Where the cell's height falls for good within a moment (the electrode's seal) nothing would ever
    pass again: thirty events in a row that failed, over ten seconds, and whose like was rare before, are
    taken for the spikes.
    """
    tracker = _Tracker(dominant, least)
    is_spike = np.zeros(events.time_s.size, bool)
    for i in np.flatnonzero(passing):
        rows = tracker.take(int(i), float(events.time_s[i]), float(events.size_mv[i]))
        is_spike[rows] = True
    return is_spike, tuple(tracker.jumps_s)


class _Tracker:
    def __init__(self, dominant: float, least: float) -> None:
        self.reference = dominant
        self.least = least
        self.last_s, self.last_size = -np.inf, 0.0
        self.failed: list[tuple[int, float, float]] = []
        self.n_before = 0
        self.begun_s: float | None = None
        self.jumps_s: list[float] = []

    def take(self, row: int, time_s: float, size: float) -> list[int]:
        """Return the rows that this event shows to be spikes: itself, none, or a failed run."""
        if self.begun_s is None:
            self.begun_s = time_s
        in_burst = time_s - self.last_s < BURST_S
        chained = in_burst and size >= BURST_SHRINK * self.last_size
        if size >= self.least * self.reference or chained:
            self._accept(time_s, size, in_burst)
            return [row]
        self.failed.append((row, time_s, size))
        return self._jump()

    def _accept(self, time_s: float, size: float, in_burst: bool) -> None:
        if not in_burst:
            self.reference += 0.05 * (size - self.reference)
        self.n_before += len(self.failed)
        self.failed.clear()
        self.last_s, self.last_size = time_s, size

    def _jump(self) -> list[int]:
        run = self.failed
        if len(run) < 30 or run[-1][1] - run[0][1] < 10.0:
            return []
        rate = len(run) / (run[-1][1] - run[0][1])
        before_s = max(run[0][1] - (self.begun_s or 0.0), 1e-9)
        if self.n_before / before_s > 0.2 * rate or run[0][1] == self.begun_s:
            return []
        rows = [r for r, _, _ in run]
        self.jumps_s.append(run[0][1])
        self.reference = float(np.median([s for _, _, s in run]))
        self.last_s, self.last_size = run[-1][1], run[-1][2]
        self.failed = []
        return rows


def _refractory(events: Events, is_spike: BoolArray, refractory_ms: float) -> BoolArray:
    rows = np.flatnonzero(is_spike)
    out = np.zeros(is_spike.size, bool)
    out[rows[leaders(events.time_s[rows], events.size_mv[rows], 1e-3 * refractory_ms)]] = True
    return out


def _near(times: FloatArray, spikes: FloatArray, within_s: float) -> BoolArray:
    """Return which times lie within `within_s` of a spike."""
    if spikes.size == 0:
        return np.zeros(times.size, bool)
    right = np.clip(np.searchsorted(spikes, times), 0, spikes.size - 1)
    left = np.maximum(right - 1, 0)
    return np.asarray(np.minimum(np.abs(times - spikes[right]), np.abs(times - spikes[left])) < within_s)
