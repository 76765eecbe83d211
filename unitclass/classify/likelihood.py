"""How probable a unit's counts are under every drawn profile, given the seconds observed.

Counts given their total are multinomial with cell probabilities proportional to profile times
exposure [1]_. In matrix form that is two products, so thousands of units take a second.

References
----------
.. [1] R. E. Kass, U. T. Eden, E. N. Brown, *Analysis of Neural Data*, Springer, 2014, ch. 19.
"""

from __future__ import annotations

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.records import FloatArray


def log_likelihood(counts: FloatArray, exposure_s: FloatArray, rate: FloatArray) -> FloatArray:
    """Return the multinomial log-likelihood of each unit's counts under each profile.

    Parameters
    ----------
    counts : ndarray, shape (n_units, n_bins)
    exposure_s : ndarray, shape (n_units, n_bins)
        Seconds observed; bins never observed say nothing.
    rate : ndarray, shape (n_draws, n_bins)
        Positive relative rates.

    Returns
    -------
    ndarray, shape (n_units, n_draws)
        Without the terms that do not depend on the profile (the multinomial coefficient and
        the sum of counts times log exposure).
    """
    total = counts.sum(axis=1, keepdims=True)
    return np.asarray(counts @ np.log(rate).T - total * np.log(exposure_s @ rate.T + 1e-300))


def evidence_share(counts: FloatArray, exposure_s: FloatArray, overdispersion: FloatArray,
                   concentration: float) -> FloatArray:
    """Return the share of each bin's spikes, and seconds, that counts as evidence.

    Two reasons to count less than every spike: trains are burstier than Poisson, so one spike is
    worth 1/overdispersion; and a drawn profile is never exactly the cell's own, so evidence
    saturates at about `concentration` spikes (the first-order effect of a Dirichlet-multinomial
    of that concentration). That doubt is about the profile over canonical phase, where an
    inspiration of a third of a second has as many bins as an expiration of six: each bin
    saturates by itself, at the spikes that steady firing would put there. Counts and exposure
    times this share are those of a unit observed for that much less time.

    Parameters
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    overdispersion : ndarray, shape (n_units,)
    concentration : float
        Spikes.

    Returns
    -------
    ndarray, shape (n_units, n_bins), in (0, 1].
    """
    total_s = np.maximum(exposure_s.sum(axis=1, keepdims=True), 1e-300)
    steady = counts.sum(axis=1, keepdims=True) * exposure_s / total_s
    return np.asarray(1.0 / (np.maximum(overdispersion, 1.0)[:, None] + steady * counts.shape[1] / concentration))


def family_evidence(log_lik: FloatArray, drawn: DrawnFamilies) -> FloatArray:
    """Average the likelihood, shape (n_units, n_draws_total), over each family's draws.

    Returns
    -------
    ndarray, shape (n_units, n_types)
        Log evidence per family.
    """
    top, _, total = _family_sums(log_lik + drawn.log_weight, drawn)
    return np.asarray(top + np.log(total))


def sum_by_family(log_joint: FloatArray, drawn: DrawnFamilies) -> tuple[FloatArray, FloatArray]:
    """Sum over each family's draws.

    Parameters
    ----------
    log_joint : ndarray, shape (n_units, n_draws_total)
        Log of likelihood times share.

    Returns
    -------
    log_evidence : ndarray, shape (n_units, n_types)
    share : ndarray, shape (n_units, n_draws_total)
        Of each draw within its family.
    """
    top, spread, total = _family_sums(log_joint, drawn)
    return np.asarray(top + np.log(total)), np.asarray(spread / total[:, drawn.owner])


def _family_sums(log_joint: FloatArray, drawn: DrawnFamilies) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return each family's highest value, what each draw is relative to it, and the sums of that."""
    starts = np.searchsorted(drawn.owner, np.arange(len(drawn.types)))
    top = np.maximum.reduceat(log_joint, starts, axis=1)
    spread = np.exp(log_joint - np.repeat(top, np.diff([*starts, drawn.owner.size]), axis=1))
    return top, spread, np.add.reduceat(spread, starts, axis=1)
