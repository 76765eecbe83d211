"""The evidence for `other`: modulated, but like none of the families.

Three ways to be odd compete with the families. *Any profile*: a Dirichlet prior over coarse
fractions of the cycle, whose evidence is closed [1]_. *Any profile, but another one in each third
of the session*: a cell that drifts in phase. *A few humps anywhere*: profiles drawn at random,
because a closed prior over twenty fractions asks more spikes than a narrow hump has.

References
----------
.. [1] C. M. Bishop, *Pattern Recognition and Machine Learning*, Springer, 2006, eq. 2.38.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from unitclass.classify.likelihood import log_likelihood
from unitclass.classify.unit_counts import UnitCounts
from unitclass.records import FloatArray

GRIDS = (8, 10, 20)  # coarse fractions of the cycle
ALPHA = 0.7  # Dirichlet parameter per fraction: profiles with silent and busy stretches
N_HUMPED = 1500
SHARES = {"any": 0.4, "drifting": 0.2, "humps": 0.4}


def other_evidence(units: UnitCounts) -> FloatArray:
    """Return the log evidence of `other`, shape (n_units,).

    Comparable with `likelihood.log_likelihood`: the same terms are left out.
    """
    each = {"any": arbitrary_evidence(units.counts, units.exposure_s),
            "drifting": _drifting_evidence(units), "humps": _humped_evidence(units)}
    mixed = np.stack([each[name] + np.log(share * len(SHARES)) for name, share in SHARES.items()])
    return _log_mean(mixed)


def arbitrary_evidence(counts: FloatArray, exposure_s: FloatArray, *, alpha: float = ALPHA) -> FloatArray:
    """Return the log evidence of an arbitrary profile, averaged over grids so that no edge matters.

    Parameters
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    alpha : float
        Dirichlet parameter per fraction; large values keep the profile near a steady rate.
    """
    n_bins = counts.shape[1]
    each = [_grid_evidence(counts, exposure_s, member, alpha)
            for n in GRIDS if n <= n_bins for member in _grids(n_bins, n)]
    return _log_mean(np.stack(each))


def _drifting_evidence(units: UnitCounts) -> FloatArray:
    parts = [arbitrary_evidence(units.third_counts[:, i], units.third_exposure_s[:, i])
             for i in range(units.third_counts.shape[1])]
    # The terms left out hold the exposure of the whole session there, of each third here.
    left_out = _count_log(units.third_counts, units.third_exposure_s).sum(axis=1) - _count_log(
        units.counts, units.exposure_s)
    return np.asarray(np.sum(parts, axis=0) + left_out)


def _count_log(counts: FloatArray, exposure_s: FloatArray) -> FloatArray:
    return np.asarray((counts * np.log(np.where(exposure_s > 0, exposure_s, 1.0))).sum(axis=-1))


def _humped_evidence(units: UnitCounts) -> FloatArray:
    log_lik = log_likelihood(units.counts, units.exposure_s, humped_profiles(units.counts.shape[1]))
    return _log_mean(log_lik.T)


@lru_cache(maxsize=4)
def humped_profiles(n_bins: int, n_draws: int = N_HUMPED) -> FloatArray:
    """Return random profiles that no family draws, shape (n_draws, n_bins), mean 1.

    One narrow hump away from both transitions, two humps amid the phases, or three humps.
    """
    rng = np.random.default_rng(20)
    phase = (np.arange(n_bins) + 0.5) * (2.0 / n_bins)
    makers = (_one_hump, _two_humps, _three_humps)
    level = np.stack([makers[i % 3](phase, rng) for i in range(n_draws)])
    background = 0.3 * rng.random((n_draws, 1)) ** 2
    level = np.maximum(background + (1 - background) * level, 0.002)
    made = level / level.mean(axis=1, keepdims=True)
    made.setflags(write=False)  # shared by all who ask
    return np.asarray(made)


def _hump(phase: FloatArray, centre: float, width: float) -> FloatArray:
    away = np.abs((phase - centre + 1.0) % 2.0 - 1.0)
    return np.asarray(np.exp(-0.5 * (away / width) ** 2))


def _one_hump(phase: FloatArray, rng: np.random.Generator) -> FloatArray:
    centre = rng.choice([rng.uniform(0.3, 0.62), rng.uniform(1.3, 1.75)])
    return _hump(phase, centre, rng.uniform(0.02, 0.09))


def _two_humps(phase: FloatArray, rng: np.random.Generator) -> FloatArray:
    tops = rng.uniform(0.4, 1.0, 2)
    return tops[0] * _hump(phase, rng.uniform(0.35, 0.65), rng.uniform(0.05, 0.2)) + tops[1] * _hump(
        phase, rng.uniform(1.35, 1.65), rng.uniform(0.05, 0.2))


def _three_humps(phase: FloatArray, rng: np.random.Generator) -> FloatArray:
    centres = rng.uniform(0, 2) + np.arange(3) * 2 / 3 + rng.uniform(-0.15, 0.15, 3)
    width = rng.uniform(0.04, 0.14)
    humps = np.stack([_hump(phase, float(c), width) for c in centres])
    return np.asarray(rng.uniform(0.4, 1.0, 3) @ humps)


def _grids(n_bins: int, n_coarse: int) -> list[FloatArray]:
    """Return bins x fractions membership, for the grid and for the grid moved by half a fraction."""
    width = n_bins / n_coarse
    fractions = [np.floor(((np.arange(n_bins) + shift) % n_bins) / width).astype(int)
                 for shift in (0, int(width / 2))]
    return [np.eye(n_coarse)[np.minimum(f, n_coarse - 1)] for f in fractions]


def _grid_evidence(counts: FloatArray, exposure_s: FloatArray, member: FloatArray, alpha: float) -> FloatArray:
    from scipy.special import gammaln

    count, seconds = counts @ member, exposure_s @ member
    observed = seconds > 0
    # The prior's mean is a steady rate, so a fraction's share goes with the seconds it lasts.
    share = alpha * seconds * observed.sum(axis=1, keepdims=True) / np.maximum(seconds.sum(axis=1, keepdims=True), 1e-12)
    safe = np.where(observed, share, 1.0)
    gained = np.where(observed, gammaln(safe + count) - gammaln(safe), 0.0).sum(axis=1)
    whole = np.maximum(share.sum(axis=1), 1e-12)
    spread = (count * np.log(np.where(observed, seconds, 1.0))).sum(axis=1)
    normal = gammaln(whole) - gammaln(whole + count.sum(axis=1))
    return np.asarray(normal + gained - spread)


def _log_mean(values: FloatArray) -> FloatArray:
    """Return log of the mean of exp over the first axis."""
    top = values.max(axis=0)
    return np.asarray(top + np.log(np.exp(values - top).mean(axis=0)))
