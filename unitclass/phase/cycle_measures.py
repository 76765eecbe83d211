"""What a unit does from cycle to cycle: bursts, taking part, n:1 pattern, drift, dispersion, stability."""

from __future__ import annotations

import numpy as np

from unitclass.phase.active_phase import ActivePhase
from unitclass.phase.counts import CycleCounts
from unitclass.records import BoolArray, Cycles, FloatArray, IntArray

EVERY = 0.8
MIN_GAPS = 5
LONGEST_PATTERN = 8


def bursts(counts: CycleCounts, active: ActivePhase) -> IntArray:
    """Return the burst each counted spike belongs to, shape (n_spikes,): the row of its cycle, -1 for none.

    A burst that begins in late expiration belongs to the inspiration it leads to. Without an
    active phase, the unit fires throughout: cycles that follow on one another are one burst.
    """
    follows = follows_on(counts.cycles)
    if not active.is_found:
        stretch: IntArray = np.cumsum(~follows)
        return stretch[counts.cycle]
    place = np.minimum((counts.phase * (active.is_active.size / 2)).astype(np.int64), active.is_active.size - 1)
    burst = np.where(active.is_active[place], counts.cycle, -1)
    if active.wraps:
        early = (burst >= 0) & (counts.phase >= (active.onset + active.offset) / 2)
        led_to = np.append(np.where(follows[1:], np.arange(1, follows.size), -1), -1)
        burst = np.where(early, led_to[counts.cycle], burst)
    return burst


def follows_on(cycles: Cycles) -> BoolArray:
    """Return which cycles begin where the one before ends, shape (n_cycles,)."""
    follows = np.zeros(cycles.n_cycles, bool)
    follows[1:] = cycles.onset_s[1:] - cycles.end_s[:-1] <= 1e-6
    return follows


def active_counts(counts: CycleCounts, active: ActivePhase) -> FloatArray:
    """Return the spikes within the active phase (anywhere, without one) per cycle, shape (n_cycles,)."""
    n = counts.cycles.n_cycles
    row = bursts(counts, active) if active.is_found else counts.cycle
    return np.bincount(row[row >= 0], minlength=n).astype(float)


def participation(per_burst: FloatArray, is_whole: BoolArray) -> float:
    """Return the share of whole cycles with at least one spike in the active phase; NaN without cycles."""
    return float((per_burst[is_whole] > 0).mean()) if is_whole.any() else np.nan


def n_to_one(per_burst: FloatArray, is_whole: BoolArray, follows: BoolArray) -> int:
    """Return n when the unit fires in every n-th cycle, 0 when there is no such order.

    1 when at least four in five cycles hold a burst. For n over 1, at least half of the distances
    between bursts are n, and more than one and a half times as many as chance would make with as
    many bursts. A burst has at least three tenths of the spikes of the fuller ones, so that a
    stray spike is none.

    Parameters
    ----------
    per_burst, is_whole, follows : ndarray, shape (n_cycles,)
        Spikes in the active phase; whether the cycle was observed whole; whether it follows on
        the one before.
    """
    if not is_whole.any() or not per_burst[is_whole].any():
        return 0
    some = per_burst[is_whole & (per_burst > 0)]
    takes_part = per_burst >= max(1.0, 0.3 * float(np.quantile(some, 0.9)))
    share = float(takes_part[is_whole].mean())
    if share >= EVERY:
        return 1
    stretch = np.cumsum(~(follows & is_whole & np.append(True, is_whole[:-1])))
    rows = np.flatnonzero(takes_part & is_whole)
    gaps = np.diff(rows)[np.diff(stretch[rows]) == 0]
    if gaps.size < MIN_GAPS:
        return 0
    n = int(np.bincount(np.minimum(gaps, LONGEST_PATTERN + 1)).argmax())
    seen, by_chance = float((gaps == n).mean()), share * (1 - share) ** (n - 1)
    return n if 2 <= n <= LONGEST_PATTERN and seen >= 0.5 and seen > 1.5 * by_chance else 0


def drift(per_cycle: IntArray, seconds: FloatArray) -> float:
    """Return the change of mean rate from the first to the last third of the cycles, over the mean.

    `per_cycle` and `seconds`, shape (n_cycles,), are spikes and seconds observed. NaN when silent.
    """
    third = len(seconds) // 3
    if third < 1 or not per_cycle.any() or not seconds[:third].any() or not seconds[-third:].any():
        return np.nan
    first, last = (per_cycle[part].sum() / seconds[part].sum() for part in (slice(0, third), slice(-third, None)))
    return float((last - first) / (per_cycle.sum() / seconds.sum()))


def split_half_r(counts: CycleCounts) -> float:
    """Return the correlation of the phase histograms of odd and even cycles; NaN if either is flat."""
    seconds = counts.exposure.seconds
    both = [(counts.by_phase[k::2].sum(axis=0, dtype=float), seconds[k::2].sum(axis=0)) for k in (0, 1)]
    seen = (both[0][1] > 0) & (both[1][1] > 0)
    first, second = (n[seen] / s[seen] for n, s in both)
    if seen.sum() < 3 or np.ptp(first) == 0 or np.ptp(second) == 0:
        return np.nan
    first, second = first - first.mean(), second - second.mean()
    return float(first @ second / np.sqrt((first @ first) * (second @ second)))


def overdispersion(counts: CycleCounts, rate_hz: FloatArray) -> float:
    """Return the variance of the cycles' counts over that of a Poisson process with this exposure.

    Expected counts follow from the mean rate by phase, (n_bins,), and the seconds each cycle was
    observed in each; gain that wanders from cycle to cycle, drift and skipped bursts lift it over 1.
    """
    expected = counts.exposure.seconds @ np.nan_to_num(rate_hz)
    used = expected > 0
    if np.count_nonzero(used) < 2:
        return np.nan
    away = counts.per_cycle[used] - expected[used]
    return float(away @ away / expected[used].sum() * used.sum() / (used.sum() - 1))
