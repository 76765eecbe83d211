from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.builders import phasic_spikes, steady_cycles, steady_spikes
from tests.classify.families import TIMING
from unitclass.classify.draws import draw_families
from unitclass.classify.membrane import MembraneLevels, level_words, membrane_evidence, quiet_phases
from unitclass.classify.posterior import probabilities, type_log_prior
from unitclass.classify.reasons import phase_words
from unitclass.classify.regime import judge_regime
from unitclass.classify.suggestion import UnitFacts, suggest
from unitclass.classify.unit_counts import count_row, stacked
from unitclass.io.template_files import read_library
from unitclass.phase.profiles import unit_profiles
from unitclass.records import RhythmEvidence
from unitclass.settings import Settings

LIBRARY, SETTINGS, OPEN = read_library(), Settings(), RhythmEvidence({}, ())
DRAWN = draw_families(LIBRARY, TIMING, n_bins=40, n_draws=256)
RAMP = {"ramp-I": lambda p: np.where(p < 1, 60 * p, 0.0),
        "post-I": lambda p: np.where(p >= 1, 60 * np.exp(-(p - 1) / 0.2), 0.0),
        "aug-E": lambda p: np.where(p > 1.2, 60 * (p - 1.2) / 0.8, 0.0)}


def suggested(trains, *, n_cycles: int = 60, settings: Settings = SETTINGS, rhythm: RhythmEvidence = OPEN, membrane=None,
              is_held: bool = False):
    cycles = steady_cycles(n_cycles, ti_s=1.0, te_s=2.0)
    profiles = list(unit_profiles(((t, None) for t in trains), cycles, settings=settings, seed=1))
    facts = [UnitFacts(p.histogram, p.modulation, p.features, p.histogram.n_cycles, membrane=membrane, is_held=is_held)
             for p in profiles]
    table = stacked([count_row(p.by_phase, p.exposure.seconds, p.modulation.eta_squared_p) for p in profiles], 40)
    return suggest(facts, table, rhythm, library=LIBRARY, drawn=DRAWN, settings=settings)


def firing(type_id: str, seed: int = 0, n_cycles: int = 60):
    return phasic_spikes(steady_cycles(n_cycles, ti_s=1.0, te_s=2.0), RAMP[type_id], np.random.default_rng(seed))


@pytest.mark.parametrize("type_id", RAMP)
def test_a_textbook_cell_gets_its_name_and_probabilities_that_sum_to_one(type_id):
    one = suggested([firing(type_id)]).suggestions[0]
    assert one.type == type_id
    assert one.probability > 0.9
    assert sum(one.probabilities.values()) == pytest.approx(1.0)
    assert set(one.probabilities) == {*(f.id for f in LIBRARY.families), "other"}


def test_a_steady_cell_is_nrm_with_an_upper_limit_on_its_depth():
    train = steady_spikes(steady_cycles(60, ti_s=1.0, te_s=2.0), 20.0, np.random.default_rng(1))
    one = suggested([train]).suggestions[0]
    assert one.type == "NRM"
    assert "at most" in one.reasons[0]


def test_no_spikes_is_silent_few_spikes_undetermined_and_neither_has_a_probability():
    silent, few = suggested([np.zeros(0), np.linspace(0.5, 170.0, 12)]).suggestions
    assert (silent.type, few.type) == ("silent", "undetermined")
    assert not silent.probabilities
    assert not few.probabilities


def test_few_cycles_are_undetermined_however_many_spikes():
    one = suggested([firing("ramp-I", n_cycles=8)], n_cycles=8).suggestions[0]
    assert one.type == "undetermined"
    assert "8 cycles" in one.reasons[0]


def test_a_cell_held_down_by_bias_current_is_not_called_silent():
    one = suggested([np.zeros(0)], is_held=True).suggestions[0]
    assert one.type == "undetermined"
    assert "held down by bias current" in one.reasons


def test_units_do_not_influence_each_other_beyond_the_regime():
    stated = replace(SETTINGS, classify=replace(SETTINGS.classify, regime="three-phase"))
    alone = suggested([firing("ramp-I")], settings=stated).suggestions[0]
    among = suggested([firing("aug-E", 3), firing("ramp-I"), firing("post-I", 4)], settings=stated).suggestions[1]
    assert alone.probabilities == pytest.approx(among.probabilities)


def test_the_fitted_profile_has_as_many_spikes_as_the_unit():
    train = firing("post-I")
    one = suggested([train]).suggestions[0]
    seconds = np.repeat([60 * 1.0 / 20, 60 * 2.0 / 20], 20)
    assert one.fitted_rate_hz @ seconds == pytest.approx(train.size, rel=0.01)
    assert (one.fitted_low_hz <= one.fitted_rate_hz + 1e-9).all()
    assert (one.fitted_rate_hz <= one.fitted_high_hz + 1e-9).all()


def test_more_data_makes_the_same_cell_surer():
    rng = np.random.default_rng(2)
    train = firing("ramp-I", 5)
    few = suggested([rng.choice(train, 25, replace=False)]).suggestions[0]
    assert few.probabilities["ramp-I"] < suggested([train]).suggestions[0].probabilities["ramp-I"]


# ------------------------------------------------------------------------------- regime

def test_a_stated_regime_stands_alone():
    regime = judge_regime(OPEN, np.zeros((0, 15)), LIBRARY, given="two-phase", other_prior=0.05)
    assert regime.probabilities == {"three-phase": 0.0, "two-phase": 1.0, "one-phase": 0.0}


def test_the_regime_follows_the_nerves_and_sums_to_one():
    nerves = RhythmEvidence({"three-phase": 0.0, "two-phase": 6.0, "one-phase": 0.0}, ("square burst",))
    regime = judge_regime(nerves, np.zeros((0, 15)), LIBRARY, given="auto", other_prior=0.05)
    assert max(regime.probabilities, key=regime.probabilities.get) == "two-phase"
    assert sum(regime.probabilities.values()) == pytest.approx(1.0)


def test_an_unlikely_type_is_never_forbidden():
    prior = type_log_prior(LIBRARY, {"two-phase": 1.0}, 0.05)
    assert np.isfinite(prior).all()
    assert np.exp(prior).sum() == pytest.approx(1.0)


def test_the_prior_is_the_mean_over_the_regimes_probabilities():
    mixed = np.exp(type_log_prior(LIBRARY, {"three-phase": 0.25, "two-phase": 0.75}, 0.05))
    pure = [np.exp(type_log_prior(LIBRARY, {name: 1.0}, 0.05)) for name in ("three-phase", "two-phase")]
    np.testing.assert_allclose(mixed, 0.25 * pure[0] + 0.75 * pure[1])


def test_a_temperature_over_one_flattens_the_probabilities():
    evidence, prior = np.array([[4.0, 0.0]]), np.log([0.5, 0.5])
    assert probabilities(evidence, prior, 2.0)[0, 0] < probabilities(evidence, prior, 1.0)[0, 0]


# ------------------------------------------------------------------- membrane potential

POST_I = MembraneLevels({"early I": -7.0, "late I": -7.0, "post-I": 6.0, "E2": -2.0},
                        {"early I": 0.5, "late I": 0.5, "post-I": 0.5, "E2": 0.5})


def test_only_phases_without_firing_vote():
    rate = np.where(np.arange(40) >= 20, 30.0, 0.0)
    assert quiet_phases(rate) == ("early I", "late I")


def test_hyperpolarisation_in_inspiration_speaks_for_post_i_and_against_early_i():
    evidence = membrane_evidence(POST_I, ("early I", "late I"), LIBRARY, DRAWN, is_alone=False)
    ids = [f.id for f in LIBRARY.families]
    assert evidence[ids.index("post-I")] > evidence[ids.index("tonic")] > evidence[ids.index("early-I")]


def test_a_cell_without_spikes_gets_a_suggestion_marked_as_from_its_membrane_potential_alone():
    one = suggested([np.zeros(0)], membrane=POST_I).suggestions[0]
    assert one.type in ("post-I", "dec-E")
    assert "membrane potential alone" in one.reasons[0]


def test_without_a_vote_the_reason_is_shown_and_the_answer_is_that_of_the_spikes():
    mute = replace(POST_I, may_vote=False, reason="the electrode's fill is not known")
    with_vm, without = (suggested([firing("ramp-I")], membrane=m).suggestions[0] for m in (mute, None))
    assert with_vm.probabilities == pytest.approx(without.probabilities)
    assert "the electrode's fill is not known" in with_vm.reasons


def test_levels_are_said_as_hyperpolarised_never_as_inhibited():
    words = " ".join(level_words(POST_I))
    assert "hyperpolarised by 7.0 mV in early I" in words
    assert "inhib" not in words


def test_phases_are_said_as_the_trade_says_them():
    assert phase_words(0.25) == "25 % into inspiration"
    assert phase_words(1.3) == "30 % into expiration"
