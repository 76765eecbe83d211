"""The profile of a type behind a unit's histogram: the draws that fit, at the unit's own gain."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.classify.likelihood import log_likelihood
from unitclass.records import FloatArray

BAND = (0.05, 0.95)


@dataclass(frozen=True)
class Fit:
    """Posterior mean profile with its 90 % band, spikes/s, shape (n_bins,); empty where there is none."""

    rate_hz: FloatArray
    low_hz: FloatArray
    high_hz: FloatArray


NO_FIT = Fit(np.zeros(0), np.zeros(0), np.zeros(0))


def fit(counts: FloatArray, exposure_s: FloatArray, evidence: FloatArray, rate: FloatArray, log_weight: FloatArray) -> Fit:
    """Return the draws' mean profile, each weighed by how well it explains one unit's counts.

    Parameters
    ----------
    counts, exposure_s : ndarray, shape (1, n_bins)
    evidence : ndarray, shape (1, n_bins)
        Share of each bin that counts, see `likelihood.evidence_share`.
    rate : ndarray, shape (n_draws, n_bins)
        Relative rates.
    log_weight : ndarray, shape (n_draws,)
        Log share of each draw before the unit was seen.
    """
    tempered = log_likelihood(counts * evidence, exposure_s * evidence, rate)[0] + log_weight
    share = np.exp(tempered - tempered.max())
    share = share / share.sum()
    scaled = rate * (counts.sum() / (rate @ exposure_s[0]))[:, None]
    mean = share @ scaled
    low, high = _weighted_quantiles(scaled, share)
    return Fit(mean, np.minimum(low, mean), np.maximum(high, mean))  # a few strong draws can pull the mean out


def _weighted_quantiles(values: FloatArray, share: FloatArray) -> tuple[FloatArray, FloatArray]:
    order = np.argsort(values, axis=0)
    reached = np.cumsum(share[order], axis=0)
    columns = np.arange(values.shape[1])
    low, high = (np.argmax(reached >= q, axis=0) for q in BAND)
    return values[order[low, columns], columns], values[order[high, columns], columns]
