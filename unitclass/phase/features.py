"""What a reviewer reads about a unit."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from unitclass.phase.active_phase import ActivePhase, active_phase
from unitclass.phase.counts import CycleCounts, count_cycles
from unitclass.phase.cycle_measures import (
    active_counts,
    bursts,
    drift,
    follows_on,
    n_to_one,
    overdispersion,
    participation,
    split_half_r,
)
from unitclass.phase.exposure import exposure, observed_before
from unitclass.phase.intervals import intervals_within, isi_cv, isi_cv2, isi_lv, refractory_violations
from unitclass.phase.lead import lead_ms
from unitclass.phase.locked import LockedFrame, locked_frame
from unitclass.phase.rules import rule_of_thumb
from unitclass.phase.shape import active_slope, decay_ms
from unitclass.records import Cycles, Features, FloatArray, PhaseHistogram
from unitclass.settings import Settings

__all__ = ["features", "features_of", "lead_frame", "rule_of_thumb"]

LEAD_WINDOW_MS, LEAD_BIN_MS = 1000.0, 10.0


def features(spike_times_s: ArrayLike, cycles: Cycles, *, observed_s: ArrayLike | None,
             histogram: PhaseHistogram, settings: Settings) -> Features:
    """Return the features of one unit in one condition.

    For many units `profiles.unit_profiles` gives the same faster.

    Parameters
    ----------
    spike_times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order.
    cycles : Cycles
        The cycles in use, shape (n_cycles,).
    observed_s : array_like, shape (n_intervals, 2), or None
        Observation intervals; None means always.
    histogram : PhaseHistogram
        Of the same spikes, cycles and intervals.
    settings : Settings

    Raises
    ------
    ValueError
        As `phase_histogram`.
    """
    given = exposure(cycles, observed_s=observed_s, n_bins=histogram.n_bins)
    counts = count_cycles(spike_times_s, given, n_fractions=settings.modulation.n_fractions)
    return features_of(counts, histogram, lead_frame(cycles, observed_s), settings)


def lead_frame(cycles: Cycles, observed_s: ArrayLike | None) -> LockedFrame:
    """Return the fine onset-locked frame from which leads are read; shared by units."""
    return locked_frame(cycles, "onset", LEAD_WINDOW_MS, LEAD_BIN_MS, observed_s=observed_s)


def features_of(counts: CycleCounts, histogram: PhaseHistogram, frame: LockedFrame,
                settings: Settings) -> Features:
    """Return the features of spikes that are counted already."""
    active = active_phase(histogram)
    per_burst = active_counts(counts, active)
    whole, cycles = counts.exposure.is_whole, counts.cycles
    intervals = intervals_within(counts.time_s, bursts(counts, active))
    inspiration, expiration = _half_rates(histogram)
    e1, e2 = expiration_rates(counts, histogram)
    return Features(
        onset_phase=active.onset,
        peak_phase=active.peak if counts.n_spikes else np.nan,
        offset_phase=active.offset,
        rate_i_hz=inspiration,
        rate_e_hz=expiration,
        rate_e1_hz=e1,
        rate_e2_hz=e2,
        peak_rate_hz=active.peak_hz if histogram.n_cycles else np.nan,
        slope=active_slope(histogram, active),
        decay_ms=decay_ms(histogram, active),
        lead_ms=_lead(counts, active, frame),
        participation=participation(per_burst, whole),
        n_to_1=n_to_one(per_burst, whole, follows_on(cycles)),
        isi_cv=isi_cv(intervals),
        isi_cv2=isi_cv2(intervals),
        isi_lv=isi_lv(intervals),
        refractory_violations=refractory_violations(counts.time_s, settings.modulation.refractory_ms),
        drift=drift(counts.per_cycle, counts.exposure.seconds.sum(axis=1)),
        split_half_r=split_half_r(counts),
        overdispersion=overdispersion(counts, histogram.rate_hz),
    )


def expiration_rates(counts: CycleCounts, histogram: PhaseHistogram) -> tuple[float, float]:
    """Return the rates in E1 and E2, spikes/s.

    They part at the end of post-inspiration, over the cycles where a vagus tells it if those are at
    least half of all, else in the middle of expiration.
    """
    cycles = counts.cycles
    known = np.isfinite(cycles.post_i_end_s) & np.isfinite(cycles.offset_s)
    if not cycles.n_cycles or known.mean() < 0.5:
        quarter = histogram.n_bins * 3 // 4
        return (_rate(histogram, slice(histogram.n_bins // 2, quarter)), _rate(histogram, slice(quarter, None)))
    in_e = known[counts.cycle] & (counts.phase >= 1)
    in_e1 = in_e & (counts.time_s < cycles.post_i_end_s[counts.cycle])
    e1_s = _seconds_between(cycles.offset_s[known], cycles.post_i_end_s[known], counts)
    e2_s = _seconds_between(cycles.post_i_end_s[known], cycles.end_s[known], counts)
    return (_share(float(in_e1.sum()), e1_s), _share(float((in_e & ~in_e1).sum()), e2_s))


def _lead(counts: CycleCounts, active: ActivePhase, frame: LockedFrame) -> float:
    cycles = counts.cycles
    if not active.is_found:
        return np.nan
    return lead_ms(counts.time_s, active, frame, float(np.nanmean(cycles.ti_s)), float(np.nanmean(cycles.te_s)))


def _seconds_between(start_s: FloatArray, stop_s: FloatArray, counts: CycleCounts) -> float:
    if counts.exposure.is_always:
        return float(np.sum(stop_s - start_s))
    observed = counts.exposure.observed_s
    return float(np.sum(observed_before(stop_s, observed) - observed_before(start_s, observed)))


def _half_rates(histogram: PhaseHistogram) -> tuple[float, float]:
    half = histogram.n_bins // 2
    return _rate(histogram, slice(0, half)), _rate(histogram, slice(half, None))


def _rate(histogram: PhaseHistogram, bins: slice) -> float:
    return _share(float(histogram.counts[bins].sum()), float(histogram.exposure_s[bins].sum()))


def _share(count: float, seconds: float) -> float:
    return count / seconds if seconds > 0 else np.nan
