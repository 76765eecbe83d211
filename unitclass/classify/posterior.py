"""From log evidence to probabilities: families, NRM and other compete through their priors."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.likelihood import evidence_share, family_evidence, log_likelihood
from unitclass.classify.open_set import arbitrary_evidence, other_evidence
from unitclass.classify.templates import TypeLibrary
from unitclass.classify.unit_counts import UnitCounts
from unitclass.records import NOT_MODULATED, FloatArray
from unitclass.settings import ClassifySettings

STEADY = "tonic"
SMALL_P = 0.01  # of the modulation test: at or below this a steady cell must explain itself
SHALLOW = 12.0  # Dirichlet parameter per fraction of the cycle: rates within a third or so of their mean
BLOCK = 100  # units scored at once: keeps the (units x draws) matrix small


def score_units(units: UnitCounts, drawn: DrawnFamilies, settings: ClassifySettings) -> FloatArray:
    """Return the log evidence of every family and of `other`, shape (n_units, n_types + 1)."""
    blocks = [_block_evidence(units.rows(slice(i, i + BLOCK)), drawn, settings)
              for i in range(0, units.n_units, BLOCK)]
    return np.concatenate(blocks) if blocks else np.zeros((0, len(drawn.types) + 1))


def _block_evidence(units: UnitCounts, drawn: DrawnFamilies, settings: ClassifySettings) -> FloatArray:
    weighed = _weighed(units, settings.concentration)
    evidence = family_evidence(log_likelihood(weighed.counts, weighed.exposure_s, drawn.rate), drawn)
    if NOT_MODULATED in drawn.types and STEADY in drawn.types:
        nrm, steady = drawn.types.index(NOT_MODULATED), drawn.types.index(STEADY)
        certain = evidence[:, steady] + _modulation_odds(units, drawn, settings)
        evidence[:, nrm] = np.minimum(evidence[:, nrm], certain)
    return np.column_stack([evidence, other_evidence(weighed)])


def _weighed(units: UnitCounts, concentration: float) -> UnitCounts:
    return units.weighed(evidence_share(units.counts, units.exposure_s, units.dispersion, concentration))


def _modulation_odds(units: UnitCounts, drawn: DrawnFamilies, settings: ClassifySettings) -> FloatArray:
    """Return the log odds of no modulation against steady firing with modulation.

    Doubt about a profile's shape is no doubt about whether there is one: here evidence
    saturates ten times later, so that a shallow but certain modulation is not called NRM. And
    the rival is not only a drawn wave but any profile that stays near a steady rate. The test
    by circular shifts sees what counts per bin cannot, the regularity of a train: its p bounds
    the odds of a perfectly steady cell [1]_.

    References
    ----------
    .. [1] T. Sellke, M. J. Bayarri, J. O. Berger, "Calibration of p values", Am Stat 55:62, 2001.
    """
    units = _weighed(units, 10 * settings.concentration)
    both = drawn.only(STEADY, NOT_MODULATED)
    wavy, unmodulated = family_evidence(log_likelihood(units.counts, units.exposure_s, both.rate), both).T
    shallow = arbitrary_evidence(units.counts, units.exposure_s, alpha=SHALLOW)
    rival = np.logaddexp(wavy, shallow) - np.log(2)
    steady = log_likelihood(units.counts, units.exposure_s, np.ones((1, units.counts.shape[1])))[:, 0]
    bound = _log_odds_bound(units.modulation_p) + np.maximum(unmodulated - steady, 0.0)
    return np.minimum(unmodulated - rival, bound)


def _log_odds_bound(p: FloatArray) -> FloatArray:
    """Return log of -e p log p, the most that a p value can say against the null; no bound unless p is small."""
    is_small = np.isfinite(p) & (p <= SMALL_P)
    safe = np.where(is_small, np.maximum(p, 1e-12), SMALL_P)
    return np.where(is_small, 1.0 + np.log(safe) + np.log(-np.log(safe)), np.inf)


def probabilities(log_evidence: FloatArray, log_prior: FloatArray, temperature: float) -> FloatArray:
    """Return posteriors, rows summing to one, shape (n_units, n_types)."""
    logits = (log_evidence + log_prior) / temperature
    logits = logits - logits.max(axis=1, keepdims=True) if logits.size else logits
    odds = np.exp(logits)
    return np.asarray(odds / odds.sum(axis=1, keepdims=True))


def type_log_prior(library: TypeLibrary, regimes: Mapping[str, float], other_prior: float) -> FloatArray:
    """Average type priors over the probabilities of the regimes; log, families then "other".

    A type that is unlikely in a regime is never forbidden: every weight has a floor.
    """
    total = np.zeros(len(library.families))
    for regime, share in regimes.items():
        weights = np.array([max(family.prior_in(regime), 1e-3) for family in library.families])
        total += share * weights / weights.sum()
    total = total / total.sum()
    return np.log(np.concatenate([(1 - other_prior) * total, [other_prior]]))
