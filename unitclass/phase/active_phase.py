"""Where in the cycle a unit is active: onset, peak and offset."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.phase.histogram import chosen_bandwidth, smoothed_rate
from unitclass.records import BoolArray, FloatArray, PhaseHistogram

LOW_SHARE = 0.1
NOISE_LEVELS = 3.0
SEEN_LEVELS = 5.0


@dataclass(frozen=True)
class ActivePhase:
    """The active phase in canonical phase; onset greater than offset wraps over the cycle's end.

    `onset`, `offset` are NaN when no part of the cycle stands out; `peak`, `peak_hz` are then those of
    the greatest rate all the same. `background_hz` is the rate of the quietest quarter,
    `level_hz` the rate that counts as active, `is_active` (n_bins,) the bins between.
    """

    onset: float
    peak: float
    offset: float
    peak_hz: float
    background_hz: float
    level_hz: float
    is_active: BoolArray

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
    the edge is the transition itself; elsewhere it is interpolated between bins.
    """
    rate = np.nan_to_num(smoothed_rate(histogram, bandwidth=chosen_bandwidth(histogram, low=0.02)))
    peak_bin = int(np.argmax(smoothed_or_zero(histogram)))
    background = float(np.sort(rate)[: max(1, rate.size // 4)].mean())
    peak_hz = float(rate[max(0, peak_bin - 1) : peak_bin + 2].max())
    noise = _background_noise(histogram, background)
    level = _level(background, peak_hz, noise)
    peak = float(histogram.centres[peak_bin])
    if peak_hz - background <= SEEN_LEVELS * noise or peak_hz <= 0:
        return ActivePhase(np.nan, peak, np.nan, peak_hz, background, level, np.zeros(rate.size, bool))
    first, n_active = _run_around(rate > level, peak_bin)
    is_active = np.zeros(rate.size, bool)
    is_active[(first + np.arange(n_active)) % rate.size] = True
    if n_active >= rate.size:
        return ActivePhase(np.nan, peak, np.nan, peak_hz, background, level, is_active)
    onset = _edge(rate, first, level)
    offset = 2.0 - _edge(rate[::-1], (rate.size - first - n_active) % rate.size, level)
    return ActivePhase(onset, peak, offset % 2.0, peak_hz, background, level, is_active)


def smoothed_or_zero(histogram: PhaseHistogram) -> FloatArray:
    """Return a rate smooth enough that its maximum is not a bin's noise, (n_bins,); 0 where unknown."""
    return np.nan_to_num(smoothed_rate(histogram, bandwidth=chosen_bandwidth(histogram, low=0.05)))


def _background_noise(histogram: PhaseHistogram, background_hz: float) -> float:
    """Return the standard error of the smoothed rate at the background, Poisson counts assumed."""
    width = chosen_bandwidth(histogram, low=0.02) * histogram.n_bins / 2
    seconds = histogram.exposure_s.sum() / histogram.n_bins * max(1.0, 2 * np.sqrt(np.pi) * width)
    if seconds <= 0:
        return np.inf
    return float(np.sqrt(max(background_hz, 1 / seconds) / seconds))


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


def _edge(rate: FloatArray, first: int, level_hz: float) -> float:
    """Return the phase at which the rate first passes `level_hz`, before the centre of bin `first`."""
    n = rate.size
    if first % (n // 2) == 0:
        return first * 2.0 / n
    below, above = rate[first - 1], rate[first]
    share = (level_hz - below) / (above - below) if above > below else 0.5
    return float((first - 0.5 + np.clip(share, 0.0, 1.0)) * 2.0 / n)
