"""Rank tests over cycles: Friedman and the sign test."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.records import FloatArray, IntArray


@dataclass(frozen=True)
class Friedman:
    """Friedman's chi squared with ties corrected, its p (k - 1 degrees), and Kendall's W."""

    chi2: float
    p: float
    w: float


def friedman_test(values: ArrayLike) -> Friedman:
    """Test whether columns of (n_cycles, n_fractions) rank alike in all rows [1]_; NaN if all tie.

    References
    ----------
    .. [1] M. Friedman, J. Am. Stat. Assoc. 32 (1937) 675.
    """
    from scipy.special import chdtrc

    rows = np.asarray(values)
    n, k = rows.shape
    rank_sums, ties = _rank_sums(_small_whole(rows))
    room = n * k * (k + 1) - ties / (k - 1)
    if n < 1 or room <= 0:
        return Friedman(np.nan, np.nan, np.nan)
    chi2 = 12 * float(np.sum((rank_sums - n * (k + 1) / 2) ** 2)) / room
    return Friedman(chi2, float(chdtrc(k - 1, chi2)), chi2 / (n * (k - 1)))


def sign_test(first: FloatArray, second: FloatArray) -> float:
    """Return the two-sided exact probability that neither is the greater, pairs (n,); NaN if all tie."""
    from scipy.special import bdtr

    more, less = int(np.count_nonzero(first > second)), int(np.count_nonzero(first < second))
    if more + less == 0:
        return np.nan
    return float(min(1.0, 2 * bdtr(min(more, less), more + less, 0.5)))


def _small_whole(rows: NDArray[np.generic]) -> IntArray:
    """Return `rows` itself when it holds small counts, else the order of its values: ranks stay."""
    if rows.dtype.kind in "iu" and (not rows.size or (rows.min() >= 0 and rows.max() < 8 * rows.shape[1])):
        return rows.astype(np.int64)
    return np.unique(rows, return_inverse=True)[1].reshape(rows.shape)


def _rank_sums(counts: IntArray) -> tuple[FloatArray, float]:
    """Return the column sums of midranks within rows, and the summed t^3 - t of tied groups.

    With small counts a table of how often each value occurs in a row gives the ranks with no
    sorting: those below, and the middle of those equal.
    """
    n, _ = counts.shape
    width = int(counts.max(initial=0)) + 1
    flat = counts + width * np.arange(n)[:, None]
    equal = np.bincount(flat.ravel(), minlength=n * width).reshape(n, width).astype(float)
    below = np.cumsum(equal, axis=1) - equal
    ranks = (below + (equal + 1) / 2).ravel()[flat]
    return ranks.sum(axis=0), float(np.sum(equal**3 - equal))
