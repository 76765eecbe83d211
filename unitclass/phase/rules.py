"""The rules by hand, shown beside the probability as a cross-check."""

from __future__ import annotations

import numpy as np

from unitclass.records import NOT_MODULATED, SILENT, UNDETERMINED, Features

PRE_INSPIRATORY = 1.8
"""Onset within the last fifth of expiration (PMC2718418)."""
TONIC_SHARE = 0.3
SPAN = 0.1


def rule_of_thumb(features: Features, regime: str) -> str:
    """Return the type id that the rules by hand give.

    The phase with the higher mean rate; augmenting or decrementing by the half of the active phase
    in which the peak lies; pre-inspiratory when firing begins in the last fifth of expiration and
    goes on into inspiration; tonic when even the quieter phase has a third of the peak rate;
    spanning when inspiration's end lies well inside the active phase. Without three phases every
    decrementing expiratory unit is dec-E.

    Parameters
    ----------
    features : Features
    regime : str
        "three-phase", "two-phase" or "one-phase".
    """
    f = features
    if not np.isfinite(f.rate_i_hz) or not np.isfinite(f.rate_e_hz):
        return UNDETERMINED
    if f.rate_i_hz + f.rate_e_hz <= 0:
        return SILENT
    if not np.isfinite(f.onset_phase) or not np.isfinite(f.offset_phase):
        return NOT_MODULATED
    if min(f.rate_i_hz, f.rate_e_hz) > TONIC_SHARE * f.peak_rate_hz:
        return "tonic"
    return _phasic(f, regime)


def _phasic(f: Features, regime: str) -> str:
    reaches_inspiration = SPAN < f.offset_phase < f.onset_phase
    if f.onset_phase >= PRE_INSPIRATORY:
        return "pre-I" if reaches_inspiration else "late-E"
    if f.onset_phase < 1 - SPAN and f.offset_phase > 1 + SPAN:
        return "I-E"
    is_early = _peak_share(f) < 0.5
    if f.rate_i_hz > f.rate_e_hz:
        return "early-I" if is_early else "ramp-I"
    if is_early:
        return "post-I" if regime == "three-phase" else "dec-E"
    return "aug-E"


def _peak_share(f: Features) -> float:
    """Return how far into the active phase the peak lies, 0 to 1."""
    length = (f.offset_phase - f.onset_phase) % 2.0
    return ((f.peak_phase - f.onset_phase) % 2.0) / length if length else 0.0


# Phase and course that a rule's answer and a type's name each promise. The rules know no plateau and
# no late start, so types that are neither rising nor falling cannot contradict them.
_TRAITS = {"pre-I": ("I", "pre"), "early-I": ("I", "falls"), "ramp-I": ("I", "rises"), "late-I": ("I", "rises"),
           "con-I": ("I", ""), "post-I": ("E", "falls"), "dec-E": ("E", "falls"), "aug-E": ("E", "rises"),
           "late-E": ("E", ""), "con-E": ("E", "")}


def contradicts(rule_type: str, type_id: str) -> bool:
    """Return whether what the rules by hand say speaks against a type; false for types they do not know."""
    if rule_type not in _TRAITS or type_id not in _TRAITS:
        return False
    rule_phase, rule_course = _TRAITS[rule_type]
    phase, course = _TRAITS[type_id]
    return rule_phase != phase or bool(rule_course and course and rule_course != course)
