"""The rhythm regime of one condition, from its nerves and its population of units."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from unitclass.classify.posterior import type_log_prior
from unitclass.classify.templates import TypeLibrary
from unitclass.records import REGIMES, FloatArray, RhythmEvidence

BASE = {"three-phase": 0.6, "two-phase": 0.25, "one-phase": 0.15}  # before anything is seen; common practice
POPULATION_LIMIT = 3.0  # nats: units were picked by the electrode, so they never decide alone
POPULATION_WEIGHT = 0.5  # neighbouring units are not independent witnesses


@dataclass(frozen=True)
class Regime:
    """Probability of each regime, summing to one, and why."""

    probabilities: Mapping[str, float]
    reasons: tuple[str, ...]


def judge_regime(rhythm: RhythmEvidence, evidence: FloatArray, library: TypeLibrary, *,
                 given: str, other_prior: float) -> Regime:
    """Return the probability of each regime.

    Parameters
    ----------
    rhythm : RhythmEvidence
        What the nerves say.
    evidence : ndarray, shape (n_units, n_types + 1)
        Log evidence of the classifiable units; may have no rows.
    given : str
        "auto", or the regime the user states, which then stands alone.
    """
    if given != "auto":
        return Regime({name: float(name == given) for name in REGIMES}, (f"{given} was stated by the user",))
    units = _population(evidence, library, other_prior)
    logits = np.array([np.log(BASE[name]) + rhythm.log_likelihood.get(name, 0.0) for name in REGIMES]) + units
    share = np.exp(logits - logits.max())
    probabilities = dict(zip(REGIMES, (share / share.sum()).tolist(), strict=True))
    return Regime(probabilities, (*rhythm.reasons, *_population_words(units, len(evidence))))


def _population(evidence: FloatArray, library: TypeLibrary, other_prior: float) -> FloatArray:
    """Return the units' log-likelihood of each regime, centred and limited, shape (n_regimes,)."""
    if not len(evidence):
        return np.zeros(len(REGIMES))
    each = []
    for name in REGIMES:
        joint = evidence + type_log_prior(library, {name: 1.0}, other_prior)
        top = joint.max(axis=1)
        each.append(float(np.sum(top + np.log(np.exp(joint - top[:, None]).sum(axis=1)))))
    centred = POPULATION_WEIGHT * (np.array(each) - max(each))
    return np.maximum(centred, -POPULATION_LIMIT)


def _population_words(units: FloatArray, n_units: int) -> tuple[str, ...]:
    if not n_units or np.ptp(units) < 0.5:
        return ()
    return (f"the {n_units} units together are most usual in {REGIMES[int(np.argmax(units))]} rhythm",)
