"""How long before the onset of inspiration a unit begins to fire, in milliseconds."""

from __future__ import annotations

import numpy as np

from unitclass.phase.active_phase import ActivePhase
from unitclass.phase.edges import Rise, rise_place
from unitclass.phase.locked import LockedFrame, locked_of
from unitclass.records import FloatArray

EARLIEST, LATEST = 1.5, 0.5
SPIKES = 25.0
QUIET_BINS, ACTIVE_BINS = 12, 20


def lead_ms(times_s: FloatArray, active: ActivePhase, frame: LockedFrame, ti_s: float, te_s: float) -> float:
    """Return by how much firing leads the onset of inspiration; negative when it begins after.

    Defined for units that begin to fire between the middle of expiration and the middle of
    inspiration, NaN otherwise. The onset by phase says where to look; the moment itself is read
    off the histogram locked to the onset of inspiration, since phase smears fixed latencies.

    Parameters
    ----------
    times_s : ndarray, shape (n_spikes,)
        Counted spikes, ascending.
    active : ActivePhase
    frame : LockedFrame
        Locked to the onset, with fine bins.
    ti_s, te_s : float
        Mean durations.
    """
    if not active.is_found or LATEST < active.onset < EARLIEST:
        return np.nan
    by_phase_s = active.onset * ti_s if active.onset <= LATEST else (active.onset - 2) * te_s
    crossing = _crossing_s(times_s, frame, by_phase_s, active, ti_s)
    return float(-1000 * (by_phase_s if np.isnan(crossing) else crossing))


def _crossing_s(times_s: FloatArray, frame: LockedFrame, near_s: float, active: ActivePhase,
                ti_s: float) -> float:
    step_s = (frame.edges_ms[1] - frame.edges_ms[0]) / 1000
    start_s = frame.edges_ms[0] / 1000
    rate = np.nan_to_num(locked_of(times_s, frame).rate_hz)
    smooth = _smoothed(rate, frame.seconds)
    first = _first_active(smooth, round((near_s - start_s) / step_s), round(0.5 * ti_s / step_s), active.level_hz)
    if first < 1:
        return np.nan
    before, after = min(first, QUIET_BINS), min(rate.size - first, ACTIVE_BINS)
    window = slice(first - before, first + after)
    rise = Rise((rate * frame.seconds)[window], frame.seconds[window], smooth[window], before)
    place = rise_place(rise, active.level_hz, active.background_hz, active.peak_hz,
                       is_blurred=active.starts_at_once)
    return float(start_s + (first - before + place.bins) * step_s)


def _first_active(rate: FloatArray, near: int, reach: int, level_hz: float) -> int:
    """Return the bin that passes the level nearest before bin `near`, or, if quiet there, next after; -1 if none."""
    if not 1 <= near < rate.size - 1:
        return -1
    if rate[near] > level_hz:
        quiet = np.flatnonzero(rate[:near] <= level_hz)
        return int(quiet[-1]) + 1 if quiet.size else -1
    busy = np.flatnonzero(rate[near : near + max(reach, 1)] > level_hz)
    return near + int(busy[0]) if busy.size else -1


def _smoothed(rate_hz: FloatArray, seconds: FloatArray) -> FloatArray:
    """Return the rate averaged over as many neighbours as hold some 25 spikes at half the peak."""
    per_bin = max(float(rate_hz.max(initial=0.0)) / 2 * float(seconds.mean()), 1e-9)
    n = int(np.clip(SPIKES / per_bin, 1, 7)) // 2 * 2 + 1
    kernel = np.ones(n)
    below = np.convolve(seconds, kernel, "same")
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(below > 0, np.convolve(rate_hz * seconds, kernel, "same") / below, 0.0)
