"""Where in the cycle a unit is active: onset, peak and offset."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from unitclass.phase.edges import Rise, rise_place
from unitclass.phase.histogram import chosen_bandwidth, smoothed_rate, smoothing_matrix
from unitclass.records import BoolArray, FloatArray, PhaseHistogram

LOW_SHARE = 0.1
NOISE_LEVELS = 3.0
SEEN_LEVELS = 6.0


@dataclass(frozen=True)
class ActivePhase:
    """The active phase in canonical phase; onset greater than offset wraps over the cycle's end.

    `onset`, `offset` are NaN when no part of the cycle stands out; `peak`, `peak_hz` are then those of
    the greatest rate all the same. `background_hz` is the rate of the quietest quarter,
    `level_hz` the rate that counts as active, `is_active` (n_bins,) the bins between; `starts_at_once`
    tells a step from a ramp at the onset.
    """

    onset: float
    peak: float
    offset: float
    peak_hz: float
    background_hz: float
    level_hz: float
    is_active: BoolArray
    starts_at_once: bool = False

    @property
    def is_found(self) -> bool:
        """Return whether some part of the cycle stands out."""
        return bool(np.isfinite(self.onset))

    @property
    def wraps(self) -> bool:
        """Return whether activity runs on from expiration into the next inspiration."""
        return self.is_found and self.onset > self.offset > 0


def active_phase(histogram: PhaseHistogram) -> ActivePhase:
    """Return the stretch of the cycle around the greatest rate in which a unit is active.

    The unit is active where its smoothed rate is above its background by a tenth of the peak's
    height over background (by more, up to a half, the more of the peak is background) and
    above the noise of the background. One quiet bin does not end it. At a transition of phase
    the edge is the transition itself; elsewhere it is found between bins (`edges.rise_place`).
    Nothing stands out unless the peak is above the background by six times the noise that a
    flat cell with as many spikes, as bursty, has.
    """
    width = chosen_bandwidth(histogram, low=0.02)
    rate = np.nan_to_num(smoothed_rate(histogram, bandwidth=width))
    calm = np.nan_to_num(smoothed_rate(histogram, bandwidth=max(width, 0.05)))
    peak_bin = int(np.argmax(calm))
    background = float(np.sort(rate)[: max(1, rate.size // 4)].mean())
    peak_hz = float(calm[peak_bin])
    noise = _flat_noise(histogram, max(width, 0.05))[peak_bin]
    level = _level(background, peak_hz, _background_noise(histogram, background, width))
    first, n_active = _run_around(rate > level, peak_bin)
    is_seen = peak_hz > 0 and peak_hz - background > SEEN_LEVELS * noise and n_active < rate.size
    is_active = np.zeros(rate.size, bool)
    if not is_seen:
        return ActivePhase(np.nan, float(histogram.centres[peak_bin]), np.nan, peak_hz, background, level, is_active)
    is_active[(first + np.arange(n_active)) % rate.size] = True
    edge = _Edge(histogram, rate, level, background, peak_hz, width)
    onset, is_step = edge.phase(first, (peak_bin - first) % rate.size, rate.size - n_active)
    offset, _ = edge.mirrored().phase((-first - n_active) % rate.size, (first + n_active - 1 - peak_bin) % rate.size,
                                   rate.size - n_active)
    return ActivePhase(onset % 2.0, float(histogram.centres[peak_bin]), -offset % 2.0, peak_hz, background, level,
                       is_active, is_step)


@dataclass(frozen=True)
class _Edge:
    """What is needed to place an edge; mirrored in time, an offset is an onset."""

    histogram: PhaseHistogram
    rate_hz: FloatArray
    level_hz: float
    background_hz: float
    peak_hz: float
    width: float
    is_mirrored: bool = False

    def mirrored(self) -> _Edge:
        return replace(self, rate_hz=self.rate_hz[::-1], is_mirrored=True)

    def phase(self, first: int, n_to_peak: int, n_quiet: int) -> tuple[float, bool]:
        """Return the phase at which activity begins, `first` being its first bin, and whether by a step."""
        n = self.rate_hz.size
        if first % (n // 2) == 0:
            return first * 2.0 / n, True
        reach = self.width * n / 2
        before = min(int(np.ceil(2 * reach)) + 2, n_quiet)
        after = max(2, min(int(np.ceil(4 * reach)) + 3, n_to_peak + 1))
        window = (first + np.arange(-before, after)) % n
        turn = -1 if self.is_mirrored else 1
        rise = Rise(self.histogram.counts[::turn][window], self.histogram.exposure_s[::turn][window],
                    self.rate_hz[window], before)
        place = rise_place(rise, self.level_hz, self.background_hz, self.peak_hz)
        return (first - before + place.bins) * 2.0 / n, place.is_step


def _flat_noise(histogram: PhaseHistogram, width: float) -> FloatArray:
    """Return the standard error, (n_bins,), of the smoothed rate of a flat cell with as many spikes.

    Scaled by how much wider than Poisson limits the bootstrap limits are, where they are known.
    """
    kernel = smoothing_matrix(histogram.n_bins, width * histogram.n_bins / 2)
    seconds = histogram.exposure_s @ kernel
    mean_hz = histogram.counts.sum() / max(float(histogram.exposure_s.sum()), 1e-12)
    variance = mean_hz * (histogram.exposure_s @ kernel**2) / np.maximum(seconds, 1e-12) ** 2
    return np.sqrt(variance * _dispersion(histogram))


def _dispersion(histogram: PhaseHistogram) -> float:
    """Return the bins' variance by the bootstrap over that of Poisson counts, at least 1."""
    known = np.isfinite(histogram.low_hz) & np.isfinite(histogram.high_hz) & (histogram.counts > 0)
    if not known.any():
        return 1.0
    spread = ((histogram.high_hz - histogram.low_hz)[known] / 3.92 * histogram.exposure_s[known]) ** 2
    return max(1.0, float(spread.sum() / histogram.counts[known].sum()))


def _background_noise(histogram: PhaseHistogram, background_hz: float, width: float) -> float:
    """Return the standard error of the smoothed rate at the background, Poisson counts assumed."""
    n_bins = max(1.0, 2 * np.sqrt(np.pi) * width * histogram.n_bins / 2)
    seconds = histogram.exposure_s.sum() / histogram.n_bins * n_bins
    return float(np.sqrt(max(background_hz, 1 / seconds) / seconds)) if seconds > 0 else np.inf


def _level(background_hz: float, peak_hz: float, noise_hz: float) -> float:
    share = LOW_SHARE + (0.5 - LOW_SHARE) * background_hz / max(peak_hz, 1e-12)
    height = peak_hz - background_hz
    return background_hz + min(max(share * height, NOISE_LEVELS * noise_hz), 0.6 * height)


def _run_around(is_above: BoolArray, peak_bin: int) -> tuple[int, int]:
    """Return the first bin and the length of the circular run that holds the peak, one-bin gaps bridged."""
    n = is_above.size
    later = np.roll(is_above, -peak_bin)
    later[0] = True
    forward = _reach(later)
    backward = _reach(np.roll(later[::-1], 1))
    return (peak_bin - backward) % n, min(n, forward + backward + 1)


def _reach(is_above: BoolArray) -> int:
    """Return the last place of the run that starts at place 0, one-place gaps bridged."""
    below = ~is_above
    ends = np.flatnonzero(below & np.append(below[1:], True))
    return int(ends[0]) - 1 if ends.size else is_above.size - 1
