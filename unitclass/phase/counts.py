"""A unit's spikes counted once by cycle, phase and time fraction; all statistics share the result."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.phase.exposure import Exposure, is_within
from unitclass.phase.warp import checked_times, to_phase
from unitclass.records import Cycles, FloatArray, IntArray


@dataclass(frozen=True)
class CycleCounts:
    """What one unit fired in the cycles in use while it was observed.

    Attributes
    ----------
    exposure : Exposure
        The cycles and the seconds observed in them.
    time_s, phase, cycle : ndarray, shape (n_spikes,)
        The counted spikes in time order: seconds, canonical phase, row of the cycle.
    by_phase : ndarray, shape (n_cycles, n_bins)
        Counts per phase bin.
    by_fraction : ndarray, shape (n_cycles, n_fractions)
        Counts per equal fraction of the cycle's time; all zero in cycles not wholly observed,
        because only whole cycles can be shifted.
    """

    exposure: Exposure
    time_s: FloatArray
    phase: FloatArray
    cycle: IntArray
    by_phase: NDArray[np.float32]
    by_fraction: NDArray[np.uint16]

    @property
    def cycles(self) -> Cycles:
        """Return the cycles in use."""
        return self.exposure.cycles

    @property
    def n_spikes(self) -> int:
        """Return the number of counted spikes."""
        return int(self.time_s.size)

    @property
    def per_cycle(self) -> IntArray:
        """Return the spikes of each cycle, shape (n_cycles,)."""
        return np.bincount(self.cycle, minlength=self.cycles.n_cycles)


def count_cycles(spike_times_s: ArrayLike, given: Exposure, *, n_fractions: int = 20) -> CycleCounts:
    """Count spikes by cycle, phase bin and time fraction.

    Parameters
    ----------
    spike_times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order. Spikes outside the cycles or the observation
        intervals are not counted.
    given : Exposure
        The cycles in use and the seconds observed in them.
    n_fractions : int
        Equal time fractions of each cycle.

    Raises
    ------
    ValueError
        If `spike_times_s` is not 1-D and finite.
    """
    times = _ascending(checked_times(spike_times_s))
    phased = to_phase(times, given.cycles)
    counted = phased.cycle >= 0
    if not given.is_always:
        counted &= is_within(times, given.observed_s)
    times, phase, cycle = times[counted], phased.phase[counted], phased.cycle[counted]
    shape = (given.cycles.n_cycles, given.n_bins)
    by_phase = _tally(cycle, (phase * (given.n_bins / 2)).astype(np.int64), shape).astype(np.float32)
    return CycleCounts(given, times, phase, cycle, by_phase, _by_fraction(times, cycle, given, n_fractions))


def _ascending(times_s: FloatArray) -> FloatArray:
    return times_s if np.all(times_s[1:] >= times_s[:-1]) else np.sort(times_s)


def _by_fraction(times_s: FloatArray, cycle: IntArray, given: Exposure, n_fractions: int) -> NDArray[np.uint16]:
    cycles = given.cycles
    share = (times_s - cycles.onset_s[cycle]) / cycles.ttot_s[cycle]
    fraction = np.minimum((share * n_fractions).astype(np.int64), n_fractions - 1)
    counts = _tally(cycle, fraction, (cycles.n_cycles, n_fractions))
    counts[~given.is_whole] = 0
    return np.minimum(counts, np.iinfo(np.uint16).max).astype(np.uint16)


def _tally(row: IntArray, column: IntArray, shape: tuple[int, int]) -> IntArray:
    return np.bincount(row * shape[1] + column, minlength=shape[0] * shape[1]).reshape(shape)
