import numpy as np
import pytest
from scipy import stats

from unitclass.simulate.breathing import Pattern, breathe, phase_at
from unitclass.simulate.firing import STEP_S, cell_of, missorted, rate_of, spikes, train_of

STOP_S = 400.0


@pytest.fixture(scope="module")
def breaths():
    return breathe(Pattern(0.8, 1.7, sigh_every=0, doublet_share=0), 0.5, STOP_S, np.random.default_rng(1))


def _mean_rate(train, breaths, low, high):
    grid, _ = phase_at(breaths, np.arange(0, STOP_S, 0.001))
    phase, _ = phase_at(breaths, train)
    return np.sum((phase >= low) & (phase < high)) / (np.sum((grid >= low) & (grid < high)) * 0.001)


def test_the_mean_rate_of_a_ramp_i_cell_rises_through_inspiration(breaths):
    rng = np.random.default_rng(2)
    train = train_of(cell_of(["ramp-I"], [1], rng), breaths, STOP_S, rng)
    rates = [_mean_rate(train, breaths, low, low + 0.2) for low in (0.0, 0.2, 0.4, 0.6, 0.75)]
    assert all(np.diff(rates) > 0)
    assert _mean_rate(train, breaths, 1.05, 2.0) == 0


def test_nothing_fires_within_the_dead_time():
    train = spikes(np.full(50000, 80.0), 0.002, np.random.default_rng(3), dead_s=0.003, recovery_s=0.002,
                   doublets=0.0)
    assert np.diff(train).min() > 0.003


@pytest.mark.parametrize("rate_hz", [3.0, 30.0, 90.0])
def test_the_rate_asked_for_is_the_rate_given_in_spite_of_refractoriness(rate_hz):
    train = spikes(np.full(200000, rate_hz), 0.002, np.random.default_rng(4), dead_s=0.002, recovery_s=0.003,
                   doublets=0.0)
    assert train.size / 400 == pytest.approx(rate_hz, rel=0.07)


def test_without_refractoriness_the_train_is_poisson():
    # Intervals of a Poisson process are exponential (handbook fact); Kolmogorov-Smirnov by SciPy.
    train = spikes(np.full(200000, 10.0), 0.002, np.random.default_rng(5), dead_s=0.0, recovery_s=1e-9, doublets=0.0)
    assert stats.kstest(np.diff(train), "expon", args=(0, 0.1)).pvalue > 0.01


def test_doublets_put_a_second_spike_a_few_milliseconds_behind():
    train = spikes(np.full(100000, 5.0), 0.002, np.random.default_rng(6), dead_s=0.002, recovery_s=0.001,
                   doublets=0.3)
    close = np.diff(train) < 0.0051
    assert 0.15 < close.mean() < 0.35


def test_a_cell_that_takes_part_in_every_second_breath_skips_the_others(breaths):
    rng = np.random.default_rng(7)
    train = train_of(cell_of(["late-E"], [2], rng), breaths, STOP_S, rng)
    _, breath = phase_at(breaths, train)
    assert train.size > 100
    assert np.all(breath % 2 == 0)


def test_the_same_type_in_two_conditions_keeps_its_curve():
    cell = cell_of(["early-I", "early-I"], [1, 1], np.random.default_rng(8))
    assert cell.curves[0] == cell.curves[1]
    assert cell.peak_hz[0] == cell.peak_hz[1]


def test_gain_wanders_from_breath_to_breath_but_not_on_the_whole(breaths):
    rng = np.random.default_rng(9)
    cell = cell_of(["NRM"], [1], rng)
    rate = rate_of(cell, breaths, STOP_S, rng)
    inside = ~np.isnan(phase_at(breaths, np.arange(0, STOP_S, STEP_S))[0])
    assert rate[inside].mean() == pytest.approx(cell.peak_hz[0], rel=0.15)
    assert rate[inside].std() > 0.03 * cell.peak_hz[0]


def test_missorting_loses_few_spikes_and_takes_foreign_ones_from_others():
    rng = np.random.default_rng(10)
    trains = [np.sort(rng.uniform(0, 100, 3000)), np.sort(rng.uniform(0, 100, 3000))]
    seen = missorted(trains, rng)
    for before, after in zip(trains, seen, strict=True):
        own = np.isin(after, before)
        assert 0.90 < own.sum() / before.size <= 1
        assert np.mean(~own) <= 0.03
        assert np.all(np.diff(after) > 0)
