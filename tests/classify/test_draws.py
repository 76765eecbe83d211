from __future__ import annotations

import numpy as np
import pytest

from tests.classify.families import TIMING
from unitclass.classify.draws import Timing, draw_families, draw_profiles
from unitclass.classify.templates import family_from_mapping
from unitclass.io.template_files import read_library

STANDARD = read_library()


def mean_profile(type_id: str, timing: Timing = TIMING) -> np.ndarray:
    profiles = draw_profiles(STANDARD.family(type_id), timing, n_bins=40, n_draws=512)
    return (profiles / profiles.max(axis=1, keepdims=True)).mean(axis=0)


def test_profiles_are_positive_with_mean_one_and_the_same_every_time():
    drawn = draw_families(STANDARD, TIMING, n_bins=40, n_draws=64)
    again = draw_families(STANDARD, TIMING, n_bins=40, n_draws=64)
    assert (drawn.rate > 0).all()
    np.testing.assert_allclose(drawn.rate.mean(axis=1), 1.0)
    np.testing.assert_array_equal(drawn.rate, again.rate)


def test_the_shares_of_each_familys_draws_sum_to_one():
    drawn = draw_families(STANDARD, TIMING, n_bins=40, n_draws=50)
    for type_id in drawn.types:
        assert np.exp(drawn.log_weight[drawn.rows(type_id)]).sum() == pytest.approx(1.0)


@pytest.mark.parametrize(("type_id", "strong", "weak"), [
    ("early-I", slice(1, 5), slice(14, 20)), ("ramp-I", slice(15, 19), slice(0, 5)),
    ("late-I", slice(16, 19), slice(0, 8)), ("post-I", slice(21, 24), slice(35, 40)),
    ("aug-E", slice(35, 39), slice(20, 26)), ("late-E", slice(37, 39), slice(20, 32)),
    ("dec-E", slice(21, 25), slice(34, 39)), ("pre-I", slice(2, 8), slice(24, 30)),
    ("I-E", slice(18, 22), slice(32, 40)), ("bi-E", slice(37, 39), slice(3, 17)),
])
def test_a_family_fires_where_the_trade_says(type_id, strong, weak):
    """Phases from the trade's table of firing types (reference pages, common practice)."""
    profile = mean_profile(type_id)
    assert profile[strong].mean() > 2 * profile[weak].mean()


def test_draws_of_a_flat_family_stay_within_its_depth():
    family = family_from_mapping({"id": "x", "form": "flat", "ranges": {
        "depth": [0.0, 0.1], "wiggle": [0, 0], "foreign": [0, 0]}}, where="")
    profiles = draw_profiles(family, TIMING, n_bins=40, n_draws=128)
    depth = np.ptp(profiles, axis=1) / (profiles.max(axis=1) + profiles.min(axis=1))
    assert depth.max() <= 0.1 + 1e-9


def test_pre_inspiratory_firing_is_judged_in_milliseconds_when_expiration_lasts_seconds():
    """In a slice expiration lasts seconds, so "late" is judged in ms (reference pages, common practice)."""
    slow = mean_profile("pre-I", Timing(ti_s=0.5, te_s=9.0))
    fast = mean_profile("pre-I", Timing(ti_s=0.5, te_s=1.0))
    assert slow[30:38].sum() < 0.7 * fast[30:38].sum()


def test_a_drawn_family_follows_its_points():
    family = family_from_mapping({"id": "x", "form": "drawn", "points": [[0.0, 0], [0.5, 1], [1.0, 0], [1.5, 0]],
                                  "ranges": {"shift": [0, 0], "stretch": [1, 1], "background": [0, 0],
                                             "wiggle": [0, 0], "foreign": [0, 0]}}, where="")
    profile = draw_profiles(family, TIMING, n_bins=40, n_draws=1)[0]
    np.testing.assert_allclose(profile[5] / profile[9], 0.55 / 0.95, rtol=0.02)
    assert profile[25] < 0.01 * profile.max()


def test_a_steady_cell_may_be_held_down_by_one_short_input_and_stays_within_its_depth():
    """Tonic cells of the trade show shallow swings, whichever input makes them (common practice)."""
    family = family_from_mapping({"id": "x", "form": "cosine", "ranges": {
        "depth": [0.3, 0.4], "wiggle": [0, 0], "foreign": [0, 0], "harmonic": [0, 0]}}, where="")
    profiles = draw_profiles(family, TIMING, n_bins=40, n_draws=512)
    depth = np.ptp(profiles, axis=1) / (profiles.max(axis=1) + profiles.min(axis=1))
    assert depth.max() <= 0.4 + 1e-9
    low = profiles < np.sqrt(profiles.max(axis=1, keepdims=True) * profiles.min(axis=1, keepdims=True))
    n_low = low.sum(axis=1)
    is_one_run = (low != np.roll(low, 1, axis=1)).sum(axis=1) == 2
    assert ((n_low < 10) & is_one_run).sum() > 20, "short rests"
    assert ((n_low > 30) & is_one_run).sum() > 20, "short bursts on a steady rate"


def test_foreign_spikes_are_a_share_of_spikes_however_short_inspiration_is():
    family = family_from_mapping({"id": "x", "form": "flat", "ranges": {
        "depth": [0, 0], "wiggle": [0, 0], "foreign": [0.1, 0.1]}}, where="")
    timing = Timing(ti_s=0.35, te_s=5.65)
    seconds = np.repeat([timing.ti_s, timing.te_s], 20) / 20
    spikes = draw_profiles(family, timing, n_bins=40, n_draws=256) * seconds
    own = np.median(spikes / seconds, axis=1, keepdims=True) * seconds  # the steady rate, which most bins show
    foreign = (spikes - own).sum(axis=1) / spikes.sum(axis=1)
    assert foreign.max() == pytest.approx(0.1, abs=0.02)
    assert (spikes / seconds).max() > 3 * np.median(spikes / seconds), "a foreign burst in inspiration stands high"
