from dataclasses import replace

import numpy as np
import pytest

from tests.builders import phasic_spikes, steady_cycles, steady_spikes, varied_cycles
from unitclass.phase.features import features
from unitclass.phase.histogram import phase_histogram
from unitclass.settings import Settings


def features_of(times, cycles, *, observed_s=None):
    histogram = phase_histogram(times, cycles, observed_s=observed_s)
    return features(times, cycles, observed_s=observed_s, histogram=histogram, settings=Settings())


def fired(rate, *, n_cycles=200, seed=0, **durations):
    cycles = varied_cycles(n_cycles, np.random.default_rng(seed), **durations)
    return phasic_spikes(cycles, rate, np.random.default_rng(seed + 1)), cycles


def test_mean_rates_are_spikes_over_seconds_in_each_phase():
    rate = lambda p: np.select([p < 1, p < 1.5], [20.0, 8.0], 2.0)  # noqa: E731
    found = features_of(*fired(rate, n_cycles=600))
    assert found.rate_i_hz == pytest.approx(20, rel=0.05)
    assert found.rate_e_hz == pytest.approx(5, rel=0.05)
    assert found.rate_e1_hz == pytest.approx(8, rel=0.07)
    assert found.rate_e2_hz == pytest.approx(2, rel=0.1)
    assert found.peak_rate_hz == pytest.approx(20, rel=0.2)


def test_where_a_vagus_tells_the_end_of_post_inspiration_e1_ends_there():
    cycles = steady_cycles(100, ti_s=0.8, te_s=1.6)
    cycles = replace(cycles, post_i_end_s=cycles.offset_s + 0.4)
    times = np.sort((cycles.offset_s[:, None] + np.array([0.1, 0.2, 0.3, 1.0])).ravel())
    found = features_of(times, cycles)
    assert found.rate_e1_hz == pytest.approx(3 / 0.4)
    assert found.rate_e2_hz == pytest.approx(1 / 1.2)
    half_seen = features_of(times, cycles, observed_s=[[0, 120.0]])
    assert half_seen.rate_e1_hz == pytest.approx(3 / 0.4)


@pytest.mark.parametrize(("rate", "slope"), [
    (lambda p: np.where(p < 1, 60 * p, 0.0), 2.0), (lambda p: np.where(p < 1, 60 * (1 - p), 0.0), -2.0),
    (lambda p: np.where(p < 1, 30.0, 0.0), 0.0), (lambda p: np.where(p >= 1, 60 * (p - 1), 0.0), 2.0)])
def test_slope_is_plus_two_from_nothing_minus_two_to_nothing_and_zero_for_a_plateau(rate, slope):
    # The active phase begins at a tenth of the peak: a line from 0.1 to 1 has slope 2 x 0.9 / 1.1 = 1.64.
    trimmed = slope * 0.9 / 1.1
    assert min(trimmed, slope) - 0.3 < features_of(*fired(rate)).slope < max(trimmed, slope) + 0.3


@pytest.mark.parametrize("tau_s", [0.15, 0.3, 0.6])
def test_the_decay_of_post_inspiratory_firing_is_its_time_constant(tau_s):
    cycles = steady_cycles(150, ti_s=0.8, te_s=2.0)
    times = phasic_spikes(cycles, lambda p: np.where(p >= 1, 70 * np.exp(-(p - 1) * 2.0 / tau_s), 0.0),
                          np.random.default_rng(0))
    assert features_of(times, cycles).decay_ms == pytest.approx(1000 * tau_s, rel=0.12)


def test_a_plateau_and_a_ramp_have_no_decay():
    assert np.isnan(features_of(*fired(lambda p: np.where(p < 1, 30.0, 0.0))).decay_ms)
    assert np.isnan(features_of(*fired(lambda p: np.where(p < 1, 60 * p, 0.0))).decay_ms)


@pytest.mark.parametrize("lead_s", [-0.06, 0.0, 0.05, 0.15, 0.35])
def test_lead_is_read_in_milliseconds_however_cycles_vary(lead_s):
    rng = np.random.default_rng(0)
    cycles = varied_cycles(120, rng, cv=0.25)
    times = steady_spikes(cycles, 30, rng)
    row = np.searchsorted(cycles.onset_s - lead_s, times, side="right") - 1
    times = times[(row >= 0) & (times < cycles.offset_s[row])]
    assert features_of(times, cycles).lead_ms == pytest.approx(1000 * lead_s, abs=10)


def test_lead_of_a_phase_locked_start_is_the_mean_over_cycles():
    times, cycles = fired(lambda p: np.where((p > 1.8) | (p < 0.9), 30.0, 0.0))
    assert features_of(times, cycles).lead_ms == pytest.approx(200 * cycles.te_s.mean(), rel=0.08)


def test_units_that_begin_far_from_inspiration_have_no_lead():
    assert np.isnan(features_of(*fired(lambda p: np.where((p > 1) & (p < 1.4), 30.0, 0.0))).lead_ms)


@pytest.mark.parametrize("n", [1, 2, 3, 4])
def test_a_late_expiratory_cell_that_fires_every_nth_cycle_is_told_as_such(n):
    rng = np.random.default_rng(n)
    cycles = varied_cycles(120, rng)
    times = phasic_spikes(cycles, lambda p: np.where(p > 1.8, 40.0, 0.05), rng)
    row = np.searchsorted(cycles.onset_s, times, side="right") - 1
    in_burst = (times - cycles.offset_s[row]) > 0.8 * cycles.te_s[row]
    takes_part = (row % n == 0) & (rng.uniform(size=120) > 0.05)[row]
    found = features_of(times[~in_burst | takes_part], cycles)
    assert found.n_to_1 == n
    assert found.participation == pytest.approx(0.95 / n, abs=0.08)


def test_random_skipping_is_no_pattern():
    rng = np.random.default_rng(0)
    cycles = varied_cycles(300, rng)
    times = phasic_spikes(cycles, lambda p: np.where(p > 1.8, 40.0, 0.0), rng)
    row = np.searchsorted(cycles.onset_s, times, side="right") - 1
    for share in (0.3, 0.5, 0.65):
        found = features_of(times[(rng.uniform(size=300) < share)[row]], cycles)
        assert found.n_to_1 == 0
        assert found.participation == pytest.approx(share, abs=0.08)


def test_a_pattern_is_not_read_across_a_gap():
    cycles = steady_cycles(60)
    broken = cycles.select(np.arange(60) % 6 < 3)
    times = np.sort((broken.offset_s[::3, None] + 1.4 + np.arange(4) * 0.03).ravel())
    assert features_of(times, broken).n_to_1 == 0


def test_drift_is_the_change_from_first_to_last_third_over_the_mean():
    cycles = steady_cycles(300)
    gain = np.repeat([0.5, 1.0, 1.5], 100)
    times = np.concatenate([on + np.arange(int(20 * g)) * 0.02 for on, g in zip(cycles.onset_s, gain, strict=True)])
    assert features_of(times, cycles).drift == pytest.approx(1.0)
    assert features_of(steady_spikes(cycles, 20, np.random.default_rng(0)), cycles).drift == pytest.approx(0, abs=0.06)


def test_halves_agree_for_a_phasic_unit_and_not_for_a_flat_one():
    assert features_of(*fired(lambda p: np.where(p < 1, 30.0, 0.0))).split_half_r > 0.95
    assert abs(features_of(*fired(lambda p: 10.0 + 0 * p)).split_half_r) < 0.5


def test_overdispersion_is_one_for_poisson_firing_in_unequal_cycles_and_grows_with_wandering_gain():
    times, cycles = fired(lambda p: np.where(p < 1, 30.0, 2.0), n_cycles=600)
    assert features_of(times, cycles).overdispersion == pytest.approx(1, abs=0.2)
    gain = np.random.default_rng(5).gamma(4, 0.25, 600)
    row = np.searchsorted(cycles.onset_s, times, side="right") - 1
    thinned = times[np.random.default_rng(6).uniform(0, 2, times.size) < gain[row]]
    mean = thinned.size / 600
    assert features_of(thinned, cycles).overdispersion == pytest.approx(1 + mean / 4, rel=0.3)


def test_intervals_are_those_within_bursts():
    cycles = steady_cycles(50)
    bursts = np.sort((cycles.onset_s[:, None] + 0.1 + np.arange(15) * 0.04).ravel())
    found = features_of(bursts, cycles)
    assert found.isi_cv == pytest.approx(0, abs=1e-6)
    assert found.isi_lv == pytest.approx(0, abs=1e-6)
    assert found.refractory_violations == 0


def test_a_burst_across_the_cycles_end_is_one_burst():
    cycles = steady_cycles(50)
    bursts = np.sort((cycles.onset_s[1:, None] - 0.3 + np.arange(20) * 0.04).ravel())
    found = features_of(bursts, cycles)
    assert found.onset_phase > 1.7
    assert found.isi_cv2 == pytest.approx(0, abs=1e-6)


def test_a_silent_unit_has_rates_of_zero_and_nothing_else():
    found = features_of([], steady_cycles(30))
    assert found.rate_i_hz == found.rate_e_hz == found.participation == 0
    assert np.isnan([found.onset_phase, found.peak_phase, found.slope, found.lead_ms, found.isi_cv, found.drift]).all()
    assert found.n_to_1 == 0


def test_time_shift_and_spike_order_change_nothing():
    times, cycles = fired(lambda p: np.where(p < 1, 30.0, 2.0), n_cycles=40)
    moved = replace(cycles, onset_s=cycles.onset_s + 64, offset_s=cycles.offset_s + 64, end_s=cycles.end_s + 64)
    first, second = features_of(times, cycles), features_of(times[::-1] + 64, moved)
    for name in first.__dataclass_fields__:
        assert getattr(first, name) == pytest.approx(getattr(second, name), rel=1e-6, abs=1e-6, nan_ok=True)
