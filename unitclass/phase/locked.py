"""Firing around a transition in milliseconds, which phase would smear."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.phase.exposure import common_intervals, is_within, merged_intervals, observed_before
from unitclass.phase.warp import checked_times
from unitclass.records import Cycles, FloatArray, LockedHistogram


@dataclass(frozen=True)
class LockedFrame:
    """What all units share: the transitions, the bins around them and the seconds in each bin.

    `events_s` shape (n_events,), `edges_ms` (n_bins + 1,) with an edge at 0, `seconds` (n_bins,);
    `covered_s` (n_intervals, 2) is the time that counts: cycles in use while the unit was observed.
    """

    lock: str
    events_s: FloatArray
    edges_ms: FloatArray
    seconds: FloatArray
    covered_s: FloatArray


def locked_histogram(spike_times_s: ArrayLike, cycles: Cycles, lock: str, window_ms: float, bin_ms: float, *,
                     observed_s: ArrayLike | None = None) -> LockedHistogram:
    """Return the spike rate by time from the onset or the offset of inspiration.

    Only time inside the cycles in use counts, for spikes and seconds alike, so a sigh that was
    left out does not reach into its neighbours' windows.

    Parameters
    ----------
    spike_times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order.
    cycles : Cycles
        The cycles in use, shape (n_cycles,), in time order.
    lock : str
        "onset" or "offset" (of inspiration).
    window_ms, bin_ms : float
        Half width of the window, rounded to whole bins, and the bin.
    observed_s : array_like, shape (n_intervals, 2), optional
        Observation intervals in seconds; None means always.

    Raises
    ------
    ValueError
        If `lock` is neither word, or `bin_ms` is not between 0 and `window_ms`.
    """
    frame = locked_frame(cycles, lock, window_ms, bin_ms, observed_s=observed_s)
    times = np.sort(checked_times(spike_times_s))
    return locked_of(times[is_within(times, frame.covered_s)], frame)


def locked_frame(cycles: Cycles, lock: str, window_ms: float, bin_ms: float, *,
                 observed_s: ArrayLike | None = None) -> LockedFrame:
    """Return the frame of `locked_histogram` that all units observed over the same time share."""
    if lock not in ("onset", "offset") or not 0 < bin_ms <= window_ms:
        raise ValueError(f"lock is 'onset' or 'offset' and 0 < bin_ms <= window_ms, not {lock!r}, "
                         f"{bin_ms}, {window_ms}")
    known = np.isfinite(cycles.offset_s)
    events = (cycles.onset_s if lock == "onset" else cycles.offset_s)[known]
    covered = merged_intervals(np.stack([cycles.onset_s, cycles.end_s], axis=1)[known])
    if observed_s is not None:
        covered = common_intervals(covered, merged_intervals(observed_s))
    half = max(1, round(window_ms / bin_ms))
    edges = np.arange(-half, half + 1) * bin_ms
    reached = observed_before(events[:, None] + edges / 1000, covered)
    return LockedFrame(lock, events, edges, np.diff(reached, axis=1).sum(axis=0), covered)


def locked_of(times_s: FloatArray, frame: LockedFrame) -> LockedHistogram:
    """Return the locked histogram of ascending spike times that all lie in the frame's covered time."""
    edges_s = frame.edges_ms / 1000
    first = np.searchsorted(times_s, frame.events_s + edges_s[0])
    last = np.searchsorted(times_s, frame.events_s + edges_s[-1])
    n_near = last - first
    spike = np.repeat(first - np.cumsum(n_near) + n_near, n_near) + np.arange(n_near.sum())
    lag = times_s[spike] - np.repeat(frame.events_s, n_near)
    n_bins = edges_s.size - 1
    # A lag within rounding of an edge belongs to the bin that the edge opens.
    bins = np.clip(((lag - edges_s[0]) / (edges_s[1] - edges_s[0]) + 1e-9).astype(np.int64), 0, n_bins - 1)
    counts = np.bincount(bins, minlength=n_bins)
    with np.errstate(invalid="ignore", divide="ignore"):
        rate = np.where(frame.seconds > 1e-9, counts / frame.seconds, np.nan)
    return LockedHistogram(frame.lock, (frame.edges_ms[:-1] + frame.edges_ms[1:]) / 2, rate)
