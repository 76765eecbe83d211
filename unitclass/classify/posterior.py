"""From log evidence to probabilities: families, NRM and other compete through their priors."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.likelihood import evidence_weight, family_evidence, log_likelihood
from unitclass.classify.open_set import other_evidence
from unitclass.classify.templates import TypeLibrary
from unitclass.records import NOT_MODULATED, OTHER, FloatArray
from unitclass.settings import ClassifySettings

STEADY = "tonic"
BLOCK = 500  # units scored at once: keeps the (units x draws) matrix small


@dataclass(frozen=True)
class Scores:
    """Evidence and probabilities of many units.

    Attributes
    ----------
    types : tuple of str
        All families' ids, then "other".
    log_evidence, log_prior : ndarray, shapes (n_units, n_types) and (n_types,)
    probability : ndarray, shape (n_units, n_types)
        Rows sum to one.
    weight : ndarray, shape (n_units,)
        What one spike counted.
    """

    types: tuple[str, ...]
    log_evidence: FloatArray
    log_prior: FloatArray
    probability: FloatArray
    weight: FloatArray


def score_units(counts: FloatArray, exposure_s: FloatArray, overdispersion: FloatArray, *,
                drawn: DrawnFamilies, log_prior: FloatArray, settings: ClassifySettings) -> Scores:
    """Score every unit against every family and `other`.

    Parameters
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    overdispersion : ndarray, shape (n_units,)
        Variance of the counts over a Poisson process's, whole-cycle gain taken out.
    log_prior : ndarray, shape (n_types + 1,)
        Of the families in order, then of "other".
    """
    weight = evidence_weight(counts.sum(axis=1), overdispersion, settings.concentration)
    blocks = [_block_evidence(counts[i : i + BLOCK], exposure_s[i : i + BLOCK], weight[i : i + BLOCK],
                              overdispersion[i : i + BLOCK], drawn, settings)
              for i in range(0, len(counts), BLOCK)]
    types = (*drawn.types, OTHER)
    evidence = np.concatenate(blocks) if blocks else np.zeros((0, len(types)))
    return Scores(types, evidence, log_prior, probabilities(evidence, log_prior, settings.temperature), weight)


def _block_evidence(counts: FloatArray, exposure_s: FloatArray, weight: FloatArray,
                    overdispersion: FloatArray, drawn: DrawnFamilies, settings: ClassifySettings) -> FloatArray:
    log_lik = log_likelihood(counts, exposure_s, drawn.rate)
    evidence = family_evidence(log_lik, weight, drawn)
    if NOT_MODULATED in drawn.types and STEADY in drawn.types:
        nrm, steady = drawn.types.index(NOT_MODULATED), drawn.types.index(STEADY)
        evidence[:, nrm] = evidence[:, steady] + _modulation_odds(
            log_lik, counts.sum(axis=1), overdispersion, drawn, settings)
    odd = other_evidence(counts, exposure_s, weight)
    return np.column_stack([evidence, odd])


def _modulation_odds(log_lik: FloatArray, n_spikes: FloatArray, overdispersion: FloatArray,
                     drawn: DrawnFamilies, settings: ClassifySettings) -> FloatArray:
    """Return the log odds of no modulation against steady firing with modulation.

    Doubt about a profile's shape is no doubt about whether there is one: here evidence
    saturates ten times later, so that a shallow but certain modulation is not called NRM.
    """
    weight = evidence_weight(n_spikes, overdispersion, 10 * settings.concentration)
    evidence = family_evidence(log_lik, weight, drawn)
    return np.asarray(evidence[:, drawn.types.index(NOT_MODULATED)] - evidence[:, drawn.types.index(STEADY)])


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
