"""Where data and suggestion contradict each other, and where they do not."""

from dataclasses import replace

import numpy as np
import pytest

from tests.results import suggestion, unit_result
from unitclass.io.template_files import read_library
from unitclass.records import SILENT, UNDETERMINED
from unitclass.review.family_check import conflicts
from unitclass.review.misfit import contradictions, misfit

KINDS = ("pre-I", "early-I", "ramp-I", "post-I", "aug-E", "late-E")
LIBRARY = read_library()


@pytest.mark.parametrize("kind", KINDS)
def test_a_right_suggestion_meets_no_contradiction(kind):
    unit = unit_result("3", kind)
    assert contradictions(unit) == ()
    assert misfit(unit).is_close
    assert conflicts(unit, LIBRARY.family(kind)) == ()


def test_the_worst_bin_of_a_wrong_fit_is_named_with_its_rates():
    unit = unit_result("3", "post-I")
    wrong = replace(unit, suggestion=suggestion("aug-E", unit_result("3", "aug-E").histogram))
    found = misfit(wrong)
    assert found.is_contradiction
    assert found.phase == pytest.approx(1.075, abs=0.06)  # where post-I peaks and aug-E is silent
    assert f"{found.observed_hz:.0f} spikes/s" in found.words("aug-E")
    assert contradictions(wrong)[0].startswith("does not fit aug-E at phase 1.")


def test_the_share_beyond_both_bands_is_counted_in_spikes():
    unit = unit_result("3", "early-I")
    nothing = np.zeros(unit.histogram.n_bins)
    silent_family = replace(unit.suggestion, fitted_rate_hz=nothing, fitted_low_hz=nothing, fitted_high_hz=nothing)
    h = replace(unit.histogram, low_hz=unit.histogram.rate_hz, high_hz=unit.histogram.rate_hz)
    assert misfit(replace(unit, histogram=h, suggestion=silent_family)).share == pytest.approx(1.0)


@pytest.mark.parametrize("kind", [SILENT, UNDETERMINED])
def test_a_state_has_no_family_to_differ_from(kind):
    assert misfit(unit_result("3", kind)) is None
    assert contradictions(unit_result("3", kind)) == ()


def test_a_silent_cell_with_many_spikes_is_contradicted():
    unit = unit_result("3", "ramp-I")
    nothing = np.zeros(0)
    silent = replace(unit.suggestion, type=SILENT, probabilities={}, fitted_rate_hz=nothing)
    assert f"{unit.n_spikes} spikes were counted" in contradictions(replace(unit, suggestion=silent))[0]


def test_another_type_that_is_more_probable_is_told():
    unit = unit_result("3", "ramp-I")
    told = contradictions(replace(unit, suggestion=replace(unit.suggestion, type="late-I")))
    assert any("ramp-I is more probable (0.93) than late-I" in words for words in told)


@pytest.mark.parametrize(("kind", "claimed", "words"), [
    ("post-I", "aug-E", "peaks at phase 1.12, aug-E peaks at 1.82 to 2.00"),
    ("ramp-I", "post-I", "where post-I may fire"),
    ("early-I", "pre-I", "fires little before inspiration"),
    ("early-I", "con-I", "fires little late in its phase"),
    ("post-I", "bi-E", "fires little late in expiration"),
    ("aug-E", "NRM", "is modulated (depth 0.90), NRM is not")])
def test_a_unit_that_does_not_do_what_the_template_states_is_told(kind, claimed, words):
    assert any(words in told for told in conflicts(unit_result("3", kind), LIBRARY.family(claimed)))


def test_few_spikes_contradict_nothing():
    unit = unit_result("3", "post-I")
    few = replace(unit, histogram=replace(unit.histogram, counts=np.round(unit.histogram.counts / 20)))
    assert few.histogram.n_spikes < 60
    assert conflicts(few, LIBRARY.family("aug-E")) == ()
