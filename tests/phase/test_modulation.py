from functools import partial

import numpy as np
import pytest

from tests.builders import phasic_spikes, steady_cycles, steady_spikes, varied_cycles
from unitclass.phase.counts import count_cycles
from unitclass.phase.depth import modulation_depth
from unitclass.phase.exposure import cycle_resamples, exposure
from unitclass.phase.histogram import histogram_of, phase_histogram
from unitclass.phase.modulation import equal_time_counts, modulation
from unitclass.phase.rank_tests import sign_test
from unitclass.settings import ModulationSettings


def modulation_of(times, cycles, *, observed_s=None, seed=1, **changed):
    histogram = phase_histogram(times, cycles, observed_s=observed_s)
    return modulation(times, cycles, observed_s=observed_s, histogram=histogram,
                      settings=ModulationSettings(**changed), seed=seed)


def cosine(phase, *, mean_hz, depth):
    return mean_hz * (1 + depth * np.cos(np.pi * (phase - 0.5)))


def test_a_steady_unit_is_not_modulated_when_phases_differ_in_length():
    rng = np.random.default_rng(0)
    cycles = steady_cycles(400, ti_s=0.5, te_s=2.0)
    found = modulation_of(steady_spikes(cycles, 12, rng), cycles)
    assert found.eta_squared_p > 0.05
    assert found.sign_test_p > 0.01
    assert found.friedman_p > 0.01
    assert found.rayleigh_p > 0.01
    assert found.kuiper_p > 0.01
    assert found.watson_u2 < 0.267  # 1 % critical value, Stephens 1970
    assert found.depth < 0.1
    assert found.depth_high < 0.15


def test_a_unit_of_inspiration_is_modulated_by_every_measure():
    cycles = varied_cycles(80, np.random.default_rng(0))
    times = phasic_spikes(cycles, lambda p: np.where(p < 1, 30.0, 0.5), np.random.default_rng(1))
    found = modulation_of(times, cycles)
    assert found.eta_squared > 0.3
    assert found.eta_squared_within > found.eta_squared
    assert found.eta_squared_p == pytest.approx(1 / 501)
    assert found.n_shifts == 500
    assert max(found.sign_test_p, found.friedman_p, found.rayleigh_p, found.kuiper_p) < 1e-6
    assert found.mean_phase == pytest.approx(0.5, abs=0.05)
    assert found.depth > 0.9


@pytest.mark.parametrize("centre", [0.3, 0.95, 1.4, 1.97])
def test_the_mean_phase_of_a_narrow_burst_is_its_middle_in_canonical_phase(centre):
    cycles = steady_cycles(200)
    away = partial(lambda p, c: np.abs((p - c + 1) % 2 - 1), c=centre)
    times = phasic_spikes(cycles, lambda p: np.where(away(p) < 0.05, 60.0, 0.0), np.random.default_rng(0))
    found = modulation_of(times, cycles)
    assert away(found.mean_phase) < 0.02
    assert found.resultant_length > 0.95


def test_a_flat_unit_gets_every_probability_alike_though_cycles_wander():
    rng = np.random.default_rng(3)
    cycles = varied_cycles(40, rng, ti_s=0.5, te_s=1.5)
    found = [modulation_of(steady_spikes(cycles, 3, rng), cycles, n_shifts=99) for _ in range(100)]
    p = np.array([m.eta_squared_p for m in found])
    assert np.mean(p <= 0.05) <= 0.11
    assert np.mean(p) == pytest.approx(0.5, abs=0.1)
    assert np.mean([m.sign_test_p <= 0.05 for m in found]) <= 0.11


def test_the_sign_test_favours_neither_phase_where_comparing_rates_would():
    rng = np.random.default_rng(5)
    cycles = steady_cycles(400, ti_s=0.4, te_s=2.0)
    given = exposure(cycles)
    counts = count_cycles(steady_spikes(cycles, 0.8, rng), given)
    inspiration, expiration = equal_time_counts(counts)
    assert inspiration.sum() == pytest.approx(expiration.sum(), rel=0.25)
    assert sign_test(inspiration, expiration) > 0.05
    in_i = np.bincount(counts.cycle[counts.phase < 1], minlength=400) / 0.4
    in_e = np.bincount(counts.cycle[counts.phase >= 1], minlength=400) / 2.0
    assert sign_test(in_i, in_e) < 1e-6


def test_below_the_floors_the_probability_of_eta_squared_is_withheld():
    cycles = steady_cycles(9)
    times = phasic_spikes(cycles, lambda p: np.where(p < 1, 30.0, 0.0), np.random.default_rng(0))
    assert np.isnan(modulation_of(times, cycles).eta_squared_p)
    few = steady_cycles(40).onset_s[:19] + 0.1
    assert np.isnan(modulation_of(few, steady_cycles(40)).eta_squared_p)
    assert np.isfinite(modulation_of(few, steady_cycles(40), min_spikes=19).eta_squared_p)


def test_only_cycles_observed_whole_enter_the_shifts():
    cycles = steady_cycles(60)
    times = phasic_spikes(cycles, lambda p: np.where(p < 1, 30.0, 1.0), np.random.default_rng(0))
    part = modulation_of(times, cycles, observed_s=[[0, 20 * 2.4 + 0.7]])
    kept = cycles.select(np.arange(60) < 20)
    assert part.eta_squared == pytest.approx(modulation_of(times, kept).eta_squared)


def test_the_same_seed_gives_the_same_answer_and_spike_order_does_not_matter():
    cycles = varied_cycles(50, np.random.default_rng(0))
    times = steady_spikes(cycles, 10, np.random.default_rng(1))
    assert modulation_of(times, cycles) == modulation_of(times[::-1], cycles)
    assert modulation_of(times, cycles).eta_squared_p != modulation_of(times, cycles, seed=2).eta_squared_p


def test_a_silent_unit_has_no_modulation_to_tell():
    found = modulation_of([], steady_cycles(30))
    assert np.isnan([found.eta_squared, found.eta_squared_p, found.sign_test_p, found.rayleigh_p, found.depth,
                     found.depth_high, found.mean_phase]).all()


@pytest.mark.parametrize(("depth", "rate_hz"), [(0.3, 2.0), (0.5, 2.0), (0.5, 8.0), (0.8, 8.0), (1.0, 8.0)])
def test_the_upper_limit_of_depth_covers_the_true_depth(depth, rate_hz):
    rng = np.random.default_rng(7)
    cycles = varied_cycles(80, rng)
    given = exposure(cycles)
    resamples = cycle_resamples(given, 200, rng)
    found = []
    for _ in range(60):
        counts = count_cycles(phasic_spikes(cycles, partial(cosine, mean_hz=rate_hz, depth=depth), rng,
                                            highest_hz=2.1 * rate_hz), given)
        found.append(modulation_depth(histogram_of(counts, resamples), resamples, counts.by_phase))
    assert np.mean([d.high >= depth - 0.03 for d in found]) > 0.85
    assert np.mean([d.value for d in found]) == pytest.approx(depth, abs=0.08)


def test_a_flat_cell_with_decent_data_has_a_small_upper_limit_of_depth():
    rng = np.random.default_rng(8)
    cycles = varied_cycles(150, rng)
    high = [modulation_of(steady_spikes(cycles, rate, rng), cycles, n_shifts=99).depth_high
            for rate in (3, 30) for _ in range(15)]
    assert np.mean(high[:15]) < 0.3
    assert np.mean(high[15:]) < 0.12
