"""What the classifier needs of each unit's spikes: counts, exposure, thirds, dispersion."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray

N_THIRDS = 3
CYCLES_A_STRETCH, MOST_STRETCHES = 8, 8


@dataclass(frozen=True)
class UnitCounts:
    """Spikes of many units by phase bin.

    Attributes
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    third_counts, third_exposure_s : ndarray, shape (n_units, 3, n_bins)
        The same for the first, middle and last third of the cycles.
    dispersion : ndarray, shape (n_units,)
        See `shape_dispersion`.
    modulation_p : ndarray, shape (n_units,)
        Of the test for any modulation; NaN where it was not made.
    """

    counts: FloatArray
    exposure_s: FloatArray
    third_counts: FloatArray
    third_exposure_s: FloatArray
    dispersion: FloatArray
    modulation_p: FloatArray

    @property
    def n_units(self) -> int:
        """Return the number of units."""
        return len(self.counts)

    @property
    def n_spikes(self) -> FloatArray:
        """Return the counted spikes of every unit, shape (n_units,)."""
        return np.asarray(self.counts.sum(axis=1))

    def weighed(self, share: FloatArray) -> UnitCounts:
        """Return the units with a share, shape (n_units, n_bins), of each bin's spikes and seconds."""
        by_third = share[:, None, :]
        return replace(self, counts=self.counts * share, exposure_s=self.exposure_s * share,
                       third_counts=self.third_counts * by_third, third_exposure_s=self.third_exposure_s * by_third)

    def rows(self, chosen: slice) -> UnitCounts:
        """Return some of the units."""
        return UnitCounts(self.counts[chosen], self.exposure_s[chosen], self.third_counts[chosen],
                          self.third_exposure_s[chosen], self.dispersion[chosen], self.modulation_p[chosen])


@dataclass(frozen=True)
class CountRow:
    """One unit's row of a `UnitCounts`."""

    counts: FloatArray
    exposure_s: FloatArray
    third_counts: FloatArray
    third_exposure_s: FloatArray
    dispersion: float
    modulation_p: float


def count_row(by_cycle: ArrayLike, seconds: ArrayLike, modulation_p: float = np.nan) -> CountRow:
    """Return what the classifier needs of one unit.

    Parameters
    ----------
    by_cycle : array_like, shape (n_cycles, n_bins)
        Spike counts.
    seconds : array_like, shape (n_cycles, n_bins)
        Seconds observed.
    """
    counts, exposure = np.asarray(by_cycle, dtype=float), np.asarray(seconds, dtype=float)
    thirds = np.array_split(np.arange(len(counts)), N_THIRDS)
    return CountRow(counts.sum(axis=0), exposure.sum(axis=0),
                    np.stack([counts[rows].sum(axis=0) for rows in thirds]),
                    np.stack([exposure[rows].sum(axis=0) for rows in thirds]),
                    shape_dispersion(counts, exposure), modulation_p)


def stacked(rows: Sequence[CountRow], n_bins: int) -> UnitCounts:
    """Return the rows as one table; with no rows, a table of none."""
    if not rows:
        none, thirds = np.zeros((0, n_bins)), np.zeros((0, N_THIRDS, n_bins))
        return UnitCounts(none, none, thirds, thirds, np.zeros(0), np.zeros(0))
    return UnitCounts(np.stack([r.counts for r in rows]), np.stack([r.exposure_s for r in rows]),
                      np.stack([r.third_counts for r in rows]), np.stack([r.third_exposure_s for r in rows]),
                      np.array([r.dispersion for r in rows]), np.array([r.modulation_p for r in rows]))


def shape_dispersion(by_cycle: FloatArray, seconds: FloatArray) -> float:
    """Return how much wilder than Poisson the counts are, the gain of each cycle taken out.

    Pearson's chi-squared of the cycles x bins table, expected counts being the cycle's total
    shared out by the mean profile, over its degrees of freedom [1]_: 1 for a Poisson process
    whatever its gain from cycle to cycle, more for bursts that come and go in phase. Each stretch
    of the session has its own mean profile, so that a cell which drifts in phase is not taken
    for a wild one.

    Parameters
    ----------
    by_cycle, seconds : ndarray, shape (n_cycles, n_bins)

    References
    ----------
    .. [1] P. McCullagh, J. A. Nelder, *Generalized Linear Models*, 2nd ed., 1989, sect. 4.5.
    """
    n_stretches = max(1, min(MOST_STRETCHES, len(by_cycle) // CYCLES_A_STRETCH))
    parts = [_pearson(by_cycle[rows], seconds[rows]) for rows in np.array_split(np.arange(len(by_cycle)), n_stretches)]
    freedom = sum(df for _, df in parts)
    return sum(chi for chi, _ in parts) / freedom if freedom > 0 else 1.0


def _pearson(by_cycle: FloatArray, seconds: FloatArray) -> tuple[float, int]:
    """Return chi-squared against "total of the cycle times mean profile", and its degrees of freedom."""
    total_s = seconds.sum(axis=0)
    rate = np.divide(by_cycle.sum(axis=0), total_s, out=np.zeros(total_s.size), where=total_s > 0)
    share = seconds * rate
    whole = share.sum(axis=1, keepdims=True)
    totals = by_cycle.sum(axis=1, keepdims=True)
    expected = np.divide(totals * share, whole, out=np.zeros_like(share), where=whole > 0)
    used = expected > 0
    freedom = (int(used.any(axis=1).sum()) - 1) * (int(used.any(axis=0).sum()) - 1)
    if freedom < 1:
        return 0.0, 0
    return float(np.sum((by_cycle[used] - expected[used]) ** 2 / expected[used])), freedom
