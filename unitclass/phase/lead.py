"""How long before the onset of inspiration a unit begins to fire, in milliseconds."""

from __future__ import annotations

import numpy as np

from unitclass.phase.active_phase import ActivePhase
from unitclass.phase.locked import LockedFrame, locked_of
from unitclass.records import FloatArray

EARLIEST, LATEST = 1.5, 0.5
SPIKES = 25.0


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
    crossing = _crossing_s(times_s, frame, by_phase_s, active.level_hz, ti_s)
    return float(-1000 * (by_phase_s if np.isnan(crossing) else crossing))


def _crossing_s(times_s: FloatArray, frame: LockedFrame, near_s: float, level_hz: float, ti_s: float) -> float:
    locked = locked_of(times_s, frame)
    rate = _smoothed(np.nan_to_num(locked.rate_hz), np.nan_to_num(frame.seconds))
    step_s = (frame.edges_ms[1] - frame.edges_ms[0]) / 1000
    first = round((near_s - frame.edges_ms[0] / 1000) / step_s)
    stop = min(first + max(1, round(0.5 * ti_s / step_s)), rate.size)
    if not 1 <= first < rate.size - 1:
        return np.nan
    return _walk(rate, locked.centres_ms / 1000, first, stop, level_hz)


def _walk(rate: FloatArray, centres_s: FloatArray, first: int, stop: int, level_hz: float) -> float:
    """Return the rise through the level nearest before `first`, or, when quiet there, next after it."""
    if rate[first] > level_hz:
        quiet = np.flatnonzero(rate[:first] <= level_hz)
        last_quiet = int(quiet[-1]) if quiet.size else -1
    else:
        busy = np.flatnonzero(rate[first:stop] > level_hz)
        last_quiet = first + int(busy[0]) - 1 if busy.size else -1
    if last_quiet < 0:
        return np.nan
    low, high = rate[last_quiet], rate[last_quiet + 1]
    share = (level_hz - low) / (high - low)
    return float(centres_s[last_quiet] + share * (centres_s[last_quiet + 1] - centres_s[last_quiet]))


def _smoothed(rate_hz: FloatArray, seconds: FloatArray) -> FloatArray:
    """Return the rate averaged over as many neighbours as hold some 25 spikes at half the peak."""
    per_bin = max(float(rate_hz.max(initial=0.0)) / 2 * float(seconds.mean()), 1e-9)
    n = int(np.clip(SPIKES / per_bin, 1, 7)) // 2 * 2 + 1
    kernel = np.ones(n)
    below = np.convolve(seconds, kernel, "same")
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(below > 0, np.convolve(rate_hz * seconds, kernel, "same") / below, 0.0)
