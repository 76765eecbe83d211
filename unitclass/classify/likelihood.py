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


def evidence_weight(n_spikes: FloatArray, overdispersion: FloatArray, concentration: float) -> FloatArray:
    """Return the power to which a likelihood is raised so that evidence is honest.

    Two reasons to count less than every spike: trains are burstier than Poisson, so one spike is
    worth 1/overdispersion; and a drawn profile is never exactly the cell's own, so evidence
    saturates at about `concentration` spikes (the first-order effect of a Dirichlet-multinomial
    of that concentration).

    Parameters
    ----------
    n_spikes, overdispersion : ndarray, shape (n_units,)
    concentration : float
        Spikes.

    Returns
    -------
    ndarray, shape (n_units,), in (0, 1].
    """
    return np.asarray(1.0 / (np.maximum(overdispersion, 1.0) + n_spikes / concentration))


def family_evidence(log_lik: FloatArray, weight: FloatArray, drawn: DrawnFamilies) -> FloatArray:
    """Average the tempered likelihood over each family's draws.

    Parameters
    ----------
    log_lik : ndarray, shape (n_units, n_draws_total)
    weight : ndarray, shape (n_units,)

    Returns
    -------
    ndarray, shape (n_units, n_types)
        Log evidence per family.
    """
    top, _, total = _family_sums(weight[:, None] * log_lik + drawn.log_weight, drawn)
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
