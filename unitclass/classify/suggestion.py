"""Suggestions for all units of one condition: states, probabilities, fit and reasons."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.fit import NO_FIT, Fit, fit
from unitclass.classify.likelihood import evidence_share
from unitclass.classify.membrane import MembraneLevels, level_words, membrane_evidence, quiet_phases
from unitclass.classify.posterior import probabilities, score_units, type_log_prior
from unitclass.classify.reasons import firing_reasons, odds_words, type_reasons
from unitclass.classify.regime import Regime, judge_regime
from unitclass.classify.templates import TypeLibrary
from unitclass.classify.unit_counts import UnitCounts
from unitclass.phase.rules import rule_of_thumb
from unitclass.records import (
    OTHER,
    SILENT,
    UNDETERMINED,
    Features,
    FloatArray,
    Modulation,
    PhaseHistogram,
    RhythmEvidence,
    Suggestion,
)
from unitclass.settings import Settings

NOTHING = np.zeros(0)


@dataclass(frozen=True)
class UnitFacts:
    """What is known of one unit in one condition before it gets a suggestion."""

    histogram: PhaseHistogram
    modulation: Modulation
    features: Features
    n_cycles: int
    membrane: MembraneLevels | None = None
    is_held: bool = False


@dataclass(frozen=True)
class Suggested:
    """One suggestion per unit, and the regime they were made under."""

    suggestions: tuple[Suggestion, ...]
    regime: Regime


def suggest(facts: Sequence[UnitFacts], units: UnitCounts, rhythm: RhythmEvidence, *, library: TypeLibrary,
            drawn: DrawnFamilies, settings: Settings) -> Suggested:
    """Return a suggestion for every unit of one condition.

    Parameters
    ----------
    facts : sequence of UnitFacts, length n_units
    units : UnitCounts
        Of the same units in the same order.
    rhythm : RhythmEvidence
        What the nerves say of the regime.
    """
    states = [unit_state(fact, settings) for fact in facts]
    histogram = score_units(units, drawn, settings.classify)
    membrane = np.stack([_membrane(fact, library, drawn) for fact in facts]) if facts else histogram
    judged = np.array([state == "" for state in states], dtype=bool)
    regime = judge_regime(rhythm, histogram[judged], library, given=settings.classify.regime,
                          other_prior=settings.classify.other_prior)
    prior = type_log_prior(library, regime.probabilities, settings.classify.other_prior)
    table = probabilities(histogram + membrane, prior, settings.classify.temperature)
    rhythm_name = max(regime.probabilities, key=lambda name: regime.probabilities[name])
    made = []
    for i, fact in enumerate(facts):
        if states[i] and not _speaks_alone(fact, settings):
            made.append(_state_suggestion(states[i], fact))
            continue
        witnesses = {"histogram": histogram[i], "membrane potential": membrane[i], "regime": prior}
        typed = _typed_suggestion(fact, units.rows(slice(i, i + 1)), table[i], witnesses, drawn, settings)
        made.append(replace(typed, rule_type=rule_of_thumb(fact.features, rhythm_name)))
    return Suggested(tuple(made), regime)


def unit_state(fact: UnitFacts, settings: Settings) -> str:
    """Return "silent", "undetermined", or empty when there is enough to classify."""
    floor, n_spikes = settings.modulation, fact.histogram.n_spikes
    if fact.n_cycles < floor.min_cycles:
        return UNDETERMINED
    if n_spikes < floor.silent_share * fact.n_cycles:
        # A cell held down by bias current is kept from firing: that is no silence of its own.
        return UNDETERMINED if fact.is_held else SILENT
    return UNDETERMINED if n_spikes < floor.min_spikes else ""


def _speaks_alone(fact: UnitFacts, settings: Settings) -> bool:
    """Return whether a cell with too few spikes can be judged by its membrane potential."""
    return fact.membrane is not None and fact.membrane.may_vote and (
        fact.n_cycles >= settings.modulation.min_cycles) and bool(level_words(fact.membrane))


def _membrane(fact: UnitFacts, library: TypeLibrary, drawn: DrawnFamilies) -> FloatArray:
    levels = fact.membrane
    if levels is None or not levels.may_vote:
        return np.zeros(len(library.families) + 1)
    is_alone = fact.histogram.n_spikes == 0
    return membrane_evidence(levels, quiet_phases(fact.histogram.rate_hz), library, drawn, is_alone=is_alone)


def _state_suggestion(state: str, fact: UnitFacts) -> Suggestion:
    n_spikes = fact.histogram.n_spikes
    reason = (f"{n_spikes} spikes in {fact.n_cycles} cycles" if state == SILENT
              else f"too little data: {n_spikes} spikes in {fact.n_cycles} cycles")
    held = ("held down by bias current",) if fact.is_held else ()
    return Suggestion(state, {}, (reason, *held), {}, NOTHING, NOTHING, NOTHING, "")


def _typed_suggestion(fact: UnitFacts, unit: UnitCounts, row: FloatArray, witnesses: dict[str, FloatArray],
                      drawn: DrawnFamilies, settings: Settings) -> Suggestion:
    types = (*drawn.types, OTHER)
    order = np.argsort(-row, kind="stable")
    first, second = int(order[0]), int(order[1])
    ranked = {types[i]: float(row[i]) for i in order}
    found = _fit(unit, types[first], drawn, settings)
    return Suggestion(
        type=types[first], probabilities=ranked, reasons=_reasons(fact, types, row, first, second, settings),
        evidence={name: float(values[first] - values[second]) for name, values in witnesses.items()},
        fitted_rate_hz=found.rate_hz, fitted_low_hz=found.low_hz, fitted_high_hz=found.high_hz)


def _reasons(fact: UnitFacts, types: tuple[str, ...], row: FloatArray, first: int, second: int,
             settings: Settings) -> tuple[str, ...]:
    alone = ("no spikes to speak of: suggested from the membrane potential alone",) if (
        fact.histogram.n_spikes < settings.modulation.min_spikes) else ()
    membrane = () if fact.membrane is None else (
        level_words(fact.membrane) if fact.membrane.may_vote else (fact.membrane.reason,))
    return (*alone, *type_reasons(types[first], fact.modulation, settings.classify.nrm_depth),
            *firing_reasons(fact.histogram, fact.modulation, fact.features), *membrane,
            odds_words(types[first], types[second], float(row[first]), float(row[second])))


def _fit(unit: UnitCounts, type_id: str, drawn: DrawnFamilies, settings: Settings) -> Fit:
    if type_id == OTHER or not unit.n_spikes[0]:
        return NO_FIT
    mine = drawn.rows(type_id)
    evidence = evidence_share(unit.counts, unit.exposure_s, unit.dispersion, settings.classify.concentration)
    return fit(unit.counts, unit.exposure_s, evidence, drawn.rate[mine], drawn.log_weight[mine])
