"""Numbers that screens show and do not compute."""

from dataclasses import replace

import numpy as np
import pytest

from tests.results import cycles, nerve_cycles, unit_result, vm_result
from unitclass.records import SILENT
from unitclass.review.unit_facts import by_phase, facts, family_band, grouped, mean_durations, picture_top


def test_mean_durations_are_of_the_cycles_that_are_used():
    c = cycles()
    longer = replace(c, end_s=np.where(c.accepted, c.end_s, c.end_s + 100))
    assert mean_durations(longer) == pytest.approx((1.0, 2.0))


def test_without_a_used_cycle_durations_are_unknown():
    c = cycles()
    assert np.isnan(mean_durations(replace(c, accepted=np.zeros(c.n_cycles, bool)))).all()


def test_units_are_ordered_by_the_phase_of_their_peak():
    rates = np.zeros((3, 8))
    rates[0, 6], rates[1, 1], rates[2, 4] = 5, 2, 9
    assert by_phase(rates) == [1, 2, 0]
    assert by_phase(np.zeros((0, 8))) == []


def test_a_single_stray_bin_does_not_decide_the_order():
    rates = np.array([[0, 3, 3, 3, 0, 0, 4, 0], [0, 0, 0, 2, 2, 2, 0, 0]], float)
    assert by_phase(rates) == [0, 1]


def test_groups_follow_the_given_order_and_keep_the_rest():
    assert grouped(["b", "z", "a", "b"], ["a", "b", "c"]) == {"a": [2], "b": [0, 3], "z": [1]}


def test_facts_have_units_and_leave_out_what_is_unknown():
    told = dict(facts(unit_result("3", "early-I")))
    assert told["lead over inspiration"] == "25 ms"
    assert told["peak rate"] == "40.0/s"
    assert told["region"] == "rostral column"
    assert not any("nan" in value for value in dict(facts(unit_result("3", SILENT))).values())
    assert "resting Vm" in dict(facts(vm_result()))


def test_the_picture_of_a_trace_ends_above_the_trace_and_the_threshold():
    envelope = nerve_cycles().envelopes[0]
    assert 0.25 <= picture_top(envelope) <= 0.3
    assert picture_top(envelope, 1.0) == pytest.approx(1.3)
    assert np.isnan(picture_top(replace(envelope, values=np.full(9, np.nan, np.float32))))


def test_a_familys_band_holds_nine_tenths_of_its_profiles():
    profiles = np.abs(np.random.default_rng(3).normal(1, 0.2, (400, 200)))
    low, middle, high = family_band(profiles)
    scaled = profiles / profiles.max(axis=1, keepdims=True)
    assert np.mean((scaled >= low) & (scaled <= high)) == pytest.approx(0.9, abs=0.01)
    assert np.all((low <= middle) & (middle <= high))
