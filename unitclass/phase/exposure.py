"""How long each phase of each cycle was observed, and resamples of cycles for limits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.records import BoolArray, Cycles, FloatArray

WHOLE = 1 - 1e-6
ALWAYS = np.array([[-np.inf, np.inf]])


@dataclass(frozen=True)
class Exposure:
    """Seconds observed, by cycle and phase bin. Units observed over the same time share it.

    Attributes
    ----------
    cycles : Cycles
        Shape (n_cycles,).
    observed_s : ndarray, shape (n_intervals, 2)
        Observation intervals, ascending and merged; ALWAYS when they cover every cycle.
    seconds : ndarray, shape (n_cycles, n_bins)
        Zero in cycles without a known end of inspiration.
    is_whole : ndarray, shape (n_cycles,)
        Cycles observed from end to end.
    """

    cycles: Cycles
    observed_s: FloatArray
    seconds: FloatArray
    is_whole: BoolArray

    @property
    def n_bins(self) -> int:
        """Return the number of phase bins over one cycle."""
        return int(self.seconds.shape[1])

    @property
    def is_always(self) -> bool:
        """Return whether every cycle was observed from end to end."""
        return self.observed_s is ALWAYS

    @property
    def n_cycles(self) -> int:
        """Return the number of cycles observed at all."""
        return int(np.count_nonzero(self.seconds.any(axis=1)))


def exposure(cycles: Cycles, *, observed_s: ArrayLike | None = None, n_bins: int = 40) -> Exposure:
    """Return the seconds observed in each phase bin of each cycle.

    Parameters
    ----------
    cycles : Cycles
        The cycles in use, shape (n_cycles,), in time order.
    observed_s : array_like, shape (n_intervals, 2), optional
        Observation intervals in seconds, any order; None means always.
    n_bins : int
        Even; the first half divides inspiration, the second expiration.

    Raises
    ------
    ValueError
        If `n_bins` is not a positive even number or an interval ends before it starts.
    """
    half = _checked_half(n_bins)
    ti_s, te_s = np.nan_to_num(cycles.ti_s), np.nan_to_num(cycles.te_s)
    full = np.repeat(np.stack([ti_s, te_s], axis=1) / half, half, axis=1)
    merged = None if observed_s is None else merged_intervals(observed_s)
    if merged is None or _covers(merged, cycles):
        return Exposure(cycles, ALWAYS, full, ti_s > 0)
    seconds = _observed(merged, cycles, half)
    return Exposure(cycles, merged, seconds, (ti_s > 0) & (seconds.sum(axis=1) >= WHOLE * (ti_s + te_s)))


def merged_intervals(intervals_s: ArrayLike) -> FloatArray:
    """Return the union of intervals (n, 2), ascending, touching ones joined; raises ValueError if one is backward."""
    pairs = np.asarray(intervals_s, dtype=float).reshape(-1, 2)
    if np.any(~(pairs[:, 1] >= pairs[:, 0])):
        raise ValueError("observed_s holds an interval that ends before it starts; swap its two times")
    pairs = pairs[np.argsort(pairs[:, 0], kind="stable")]
    if not len(pairs):
        return pairs
    reach = np.maximum.accumulate(pairs[:, 1])
    is_first = np.append(True, pairs[1:, 0] > reach[:-1])
    is_last = np.append(is_first[1:], True)
    return np.stack([pairs[is_first, 0], reach[is_last]], axis=1)


def is_within(times_s: FloatArray, intervals_s: FloatArray) -> BoolArray:
    """Return which times, shape (n,), lie in merged intervals (n_intervals, 2), both ends included."""
    rows = np.searchsorted(intervals_s[:, 0], times_s, side="right") - 1
    inside: BoolArray = (rows >= 0) & (times_s <= np.append(intervals_s[:, 1], -np.inf)[rows])
    return inside


def observed_before(times_s: FloatArray, intervals_s: FloatArray) -> FloatArray:
    """Return the seconds of merged finite intervals that lie before each time, the times' own shape."""
    if not len(intervals_s):
        return np.zeros(times_s.shape)
    total = np.append(0.0, np.cumsum(np.diff(intervals_s, axis=1)))
    ladder = np.stack([total[:-1], total[1:]], axis=1).ravel()
    return np.interp(times_s, intervals_s.ravel(), ladder)


def common_intervals(first_s: FloatArray, second_s: FloatArray) -> FloatArray:
    """Return what two sets of merged intervals, each (n, 2), have in common, shape (n_common, 2)."""
    edges = np.concatenate([first_s[:, 0], second_s[:, 0], first_s[:, 1], second_s[:, 1]])
    n_starts = len(first_s) + len(second_s)
    step = np.where(np.arange(edges.size) < n_starts, 1, -1)
    order = np.lexsort((-step, edges))
    both = np.flatnonzero(np.cumsum(step[order]) == 2)
    pairs = np.stack([edges[order][both], edges[order][both + 1]], axis=1) if both.size else np.empty((0, 2))
    return pairs[pairs[:, 1] > pairs[:, 0]]


@dataclass(frozen=True)
class CycleResamples:
    """Bootstrap resamples of whole cycles, shared by all units with one exposure.

    `weights`, shape (n_bootstrap, n_cycles), says how often each cycle was drawn; `seconds`,
    shape (n_bootstrap, n_bins), is the exposure of each resample.
    """

    weights: NDArray[np.float32]
    seconds: FloatArray

    def counts(self, by_phase: NDArray[np.float32]) -> FloatArray:
        """Return the spikes of each resample, shape (n_bootstrap, n_bins).

        `by_phase`, shape (n_cycles, n_bins), holds spike counts. Sums of whole numbers are exact
        in single precision below 2**24, hence the same whatever the number of threads.
        """
        return (self.weights @ by_phase).astype(float)


def cycle_resamples(given: Exposure, n_bootstrap: int, rng: np.random.Generator) -> CycleResamples:
    """Draw `n_bootstrap` resamples of the cycles that were observed at all, with replacement."""
    rows = np.flatnonzero(given.seconds.any(axis=1))
    n_cycles = len(given.seconds)
    weights = np.zeros((n_bootstrap, n_cycles))
    if rows.size:
        drawn = rows[rng.integers(0, rows.size, size=(n_bootstrap, rows.size))]
        flat = drawn + n_cycles * np.arange(n_bootstrap)[:, None]
        weights = np.bincount(flat.ravel(), minlength=weights.size).reshape(weights.shape).astype(float)
    return CycleResamples(weights.astype(np.float32), weights @ given.seconds)


def _checked_half(n_bins: int) -> int:
    if n_bins <= 0 or n_bins % 2:
        raise ValueError(f"n_bins must be a positive even number, not {n_bins}")
    return n_bins // 2


def _covers(intervals_s: FloatArray, cycles: Cycles) -> bool:
    return (len(intervals_s) == 1 and cycles.n_cycles > 0 and intervals_s[0, 0] <= cycles.onset_s[0]
            and intervals_s[0, 1] >= cycles.end_s[-1])


def _observed(intervals_s: FloatArray, cycles: Cycles, half: int) -> FloatArray:
    steps = np.arange(half) / half
    inspiration = cycles.onset_s[:, None] + steps * cycles.ti_s[:, None]
    expiration = cycles.offset_s[:, None] + steps * cycles.te_s[:, None]
    edges = np.concatenate([inspiration, expiration, cycles.end_s[:, None]], axis=1)
    seconds = np.diff(observed_before(np.nan_to_num(edges), intervals_s), axis=1)
    return np.where(np.isfinite(cycles.offset_s)[:, None], np.maximum(seconds, 0.0), 0.0)
