"""The evidence for `other`: modulated, but like none of the families.

An odd cell is one whose histogram is better told by "any profile at all" than by any family.
"Any profile" is a Dirichlet prior over coarse fractions of the cycle, whose evidence is closed
[1]_, averaged over several grids so that no edge matters, and competing with all families.

References
----------
.. [1] C. M. Bishop, *Pattern Recognition and Machine Learning*, Springer, 2006, eq. 2.38.
"""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray

GRIDS = (8, 10, 20)  # coarse fractions of the cycle
ALPHA = 0.7  # Dirichlet parameter per fraction: profiles with silent and busy stretches


def other_evidence(counts: FloatArray, exposure_s: FloatArray, weight: FloatArray) -> FloatArray:
    """Return the log evidence of an arbitrary profile, shape (n_units,).

    Comparable with `likelihood.log_likelihood` raised to `weight`: the same terms are left out.

    Parameters
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    weight : ndarray, shape (n_units,)
    """
    n_bins = counts.shape[1]
    each = [_grid_evidence(counts, exposure_s, weight, edges)
            for n in GRIDS if n <= n_bins for edges in _edges(n_bins, n)]
    stacked = np.stack(each)
    top = stacked.max(axis=0)
    return np.asarray(top + np.log(np.exp(stacked - top).mean(axis=0)))


def _edges(n_bins: int, n_coarse: int) -> list[FloatArray]:
    """Return coarse bin of every fine bin, for the grid and for the grid moved by half a bin."""
    width = n_bins / n_coarse
    return [np.floor(((np.arange(n_bins) + shift) % n_bins) / width).astype(int)
            for shift in (0, int(width / 2))]


def _grid_evidence(counts: FloatArray, exposure_s: FloatArray, weight: FloatArray,
                   coarse: FloatArray) -> FloatArray:
    from scipy.special import gammaln

    member = np.eye(int(coarse.max()) + 1)[coarse.astype(int)]
    count, seconds = counts @ member, exposure_s @ member
    tempered = weight[:, None] * count
    alpha = np.where(seconds > 0, ALPHA, 0.0)
    observed = seconds > 0
    gamma = np.where(observed, gammaln(np.where(observed, alpha, 1.0) + tempered)
                     - gammaln(np.where(observed, alpha, 1.0)), 0.0).sum(axis=1)
    total = alpha.sum(axis=1)
    spread = (tempered * np.log(np.where(observed, seconds, 1.0))).sum(axis=1)
    return np.asarray(gammaln(total) - gammaln(total + tempered.sum(axis=1)) + gamma - spread)
