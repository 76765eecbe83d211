"""The whitened matched filter against the optimum it is known to reach."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import toeplitz
from scipy.signal import lfilter

from tests.simulators.membrane import Recipe, membrane_trace
from tests.simulators.membrane_checks import membrane_of_trace
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_bumps import BumpFilter, Grid, leaders, peaks_above, quiet_noise_sd
from unitclass.signals.vm_kernel import whitened
from unitclass.signals.vm_learning import learn_detector
from unitclass.signals.vm_sample import sample_blocks

SHAPE = np.concatenate([np.zeros(6), [2.0, 8.0, 12.0, 9.0, 5.0, 2.0], -1.0 * np.exp(-np.arange(12) / 6.0)])


def test_the_filter_scores_the_mean_spike_its_own_height_and_a_ramp_nothing() -> None:
    taps = whitened(SHAPE, np.random.default_rng(0).normal(0, 2, (2000, SHAPE.size)), before=8)
    assert taps @ SHAPE == pytest.approx(12.0)
    assert taps @ (np.arange(SHAPE.size) * 0.7 - 50.0) == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize("keep", [0.0, 0.7])
def test_no_filter_blind_to_level_and_slope_does_better(keep: float) -> None:
    # The largest signal-to-noise ratio of any linear filter is sqrt(s' C^-1 s) (North 1943); with level
    # and slope projected out, the same with the projected shape and covariance.
    rng = np.random.default_rng(1)
    n = SHAPE.size
    noise = lfilter([1.0], [1.0, -keep], rng.normal(0, 1, (6000, n + 50)), axis=1)[:, 50:]
    taps = whitened(SHAPE, noise, before=8)
    covariance = toeplitz(keep ** np.arange(n)) / (1 - keep**2)
    level_slope = np.stack([np.ones(n), np.arange(n)], axis=1)
    free = np.linalg.svd(level_slope, full_matrices=True)[0][:, 2:]
    best = np.sqrt((free.T @ SHAPE) @ np.linalg.solve(free.T @ covariance @ free, free.T @ SHAPE))
    reached = (taps @ SHAPE) / np.sqrt(taps @ covariance @ taps)
    assert 0.93 * best < reached <= best * (1 + 1e-9)


def test_too_few_quiet_pieces_fall_back_to_white_noise() -> None:
    taps = whitened(SHAPE, np.random.default_rng(0).normal(0, 2, (5, SHAPE.size)), before=8)
    assert np.isfinite(taps).all()
    assert taps @ SHAPE == pytest.approx(12.0)


def test_learning_gives_a_filter_and_a_noise_that_hold_on_the_whole_trace() -> None:
    trace = membrane_trace(Recipe(duration_s=30, noise_mv=2.0, synaptic_mv=0.0), np.random.default_rng(2))
    grid = Grid(trace.rate_hz)
    sample = sample_blocks(membrane_of_trace(trace).signal.reader, grid, 0.0, 30.0)
    detector = learn_detector(sample, grid, MembraneSettings())
    assert detector.kernel is not None
    score = detector.score(grid.means(trace.values_mv))
    at = np.floor(trace.spike_s * trace.rate_hz / grid.bin_samples).astype(int)
    peaks = np.array([score[i - 3 : i + 6].max() for i in at])
    assert np.median(peaks) == pytest.approx(55.0, rel=0.12)
    quiet = np.ones(score.size, bool)
    for i in at:
        quiet[max(0, i - 60) : i + 120] = False
    assert score[quiet & np.isfinite(score)].std() == pytest.approx(detector.noise_mv, rel=0.15)


def test_without_spikes_there_is_no_filter_to_match() -> None:
    trace = membrane_trace(Recipe(duration_s=10, active=(0.0, 0.0)), np.random.default_rng(3))
    grid = Grid(trace.rate_hz)
    sample = sample_blocks(membrane_of_trace(trace).signal.reader, grid, 0.0, 10.0)
    assert learn_detector(sample, grid, MembraneSettings()).kernel is None


def test_a_bump_is_the_centre_over_the_higher_flank() -> None:
    values = np.random.default_rng(4).normal(size=60)
    bump = BumpFilter(Grid(5000.0), 1.0)
    got = bump.bumps(values)
    for i in range(60):
        first = i - bump.centre // 2
        low, high = first - bump.gap - bump.flank, first + bump.centre + bump.gap
        if low < 0 or high + bump.flank > 60:
            assert got[i] == -np.inf
            continue
        sides = max(values[low : low + bump.flank].mean(), values[high : high + bump.flank].mean())
        assert got[i] == pytest.approx(values[first : first + bump.centre].mean() - sides)


def test_a_step_is_no_bump_and_a_spike_is() -> None:
    bump = BumpFilter(Grid(5000.0), 1.0)
    step = np.where(np.arange(200) < 100, -60.0, -30.0)
    spike = np.full(200, -60.0)
    spike[100:105] = 0.0
    assert np.max(bump.bumps(step)) <= 1e-9
    assert np.max(bump.bumps(spike)) == pytest.approx(60.0)


def test_of_close_peaks_the_higher_stays() -> None:
    at = np.array([0.0, 3.0, 4.0, 9.0, 11.0])
    assert leaders(at, np.array([1.0, 2.0, 5.0, 3.0, 3.5]), 2.0).tolist() == [True, False, True, False, True]
    score = np.array([0, 3, 0, 4, 0, 0, 0, 0, 2, 0, 0.0])
    assert peaks_above(score, 1.0, 3).tolist() == [3, 8]


def test_a_burst_of_spikes_does_not_pass_for_noise() -> None:
    score = np.random.default_rng(5).normal(0, 1.0, 20000)
    score[::20] += 50.0
    score[1::20] += 30.0
    assert quiet_noise_sd(score, 3) == pytest.approx(1.0, rel=0.1)
