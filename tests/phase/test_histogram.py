import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.builders import phasic_spikes, steady_cycles, steady_spikes, varied_cycles
from unitclass.phase.histogram import garwood_limits, phase_histogram, raster, smoothed_rate
from unitclass.records import Cycles


def test_counts_and_exposure_equal_a_plain_loop():
    rng = np.random.default_rng(2)
    cycles = varied_cycles(30, rng)
    times = steady_spikes(cycles, 20, rng)
    counts, exposure = np.zeros(40), np.zeros(40)
    for on, off, end in zip(cycles.onset_s, cycles.offset_s, cycles.end_s, strict=True):
        edges = np.concatenate([np.linspace(on, off, 21), np.linspace(off, end, 21)[1:]])
        counts += np.histogram(times, edges)[0]
        exposure += np.diff(edges)
    histogram = phase_histogram(times, cycles)
    np.testing.assert_array_equal(histogram.counts, counts)
    np.testing.assert_allclose(histogram.exposure_s, exposure)
    assert histogram.n_cycles == 30


def test_steady_firing_gives_a_flat_rate_when_phases_differ_in_length():
    cycles = steady_cycles(2000, ti_s=0.5, te_s=2.0)
    histogram = phase_histogram(steady_spikes(cycles, 10, np.random.default_rng(0)), cycles)
    chi2 = np.sum((histogram.counts - 10 * histogram.exposure_s) ** 2 / (10 * histogram.exposure_s))
    assert chi2 < 73  # 99.9 % of chi squared with 40 degrees
    assert histogram.counts[20:].sum() > 3.5 * histogram.counts[:20].sum()


def test_spikes_outside_the_observation_intervals_are_not_counted():
    cycles = steady_cycles(10)
    times = np.arange(0.05, 24, 0.1)
    histogram = phase_histogram(times, cycles, observed_s=[[0, 12]])
    assert histogram.n_spikes == 120
    assert histogram.exposure_s.sum() == pytest.approx(12)
    assert histogram.n_cycles == 5


def test_no_cycles_give_zero_counts_and_no_limits():
    none = np.array([])
    histogram = phase_histogram([1.0], Cycles.plain(none, none, none))
    assert histogram.counts.sum() == 0
    assert np.isnan(histogram.low_hz).all()
    assert np.isnan(histogram.rate_hz).all()


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(0.2, 5), st.floats(-1000, 1000))
def test_order_and_clock_leave_counts_alone_and_rates_scale(seed, scale, shift):
    rng = np.random.default_rng(seed)
    cycles = varied_cycles(10, rng)
    times = steady_spikes(cycles, 5, rng)
    moved = Cycles.plain(*(shift + scale * m for m in (cycles.onset_s, cycles.offset_s, cycles.end_s)))
    first = phase_histogram(times, cycles, n_bootstrap=0)
    second = phase_histogram(shift + scale * rng.permutation(times), moved, n_bootstrap=0)
    # A spike within rounding of an edge may change sides.
    assert np.abs(first.counts - second.counts).sum() <= 2
    np.testing.assert_allclose(second.exposure_s, scale * first.exposure_s, rtol=1e-6)


def test_bootstrap_limits_cover_the_true_rate_of_a_bursty_unit_where_poisson_limits_do_not():
    rng = np.random.default_rng(4)
    cycles = steady_cycles(60)
    covered, poisson = [], []
    for _ in range(60):
        gain = rng.gamma(1.0, 1.0, 60)
        times = np.concatenate([np.sort(rng.uniform(on, on + 2.4, rng.poisson(24 * g)))
                                for on, g in zip(cycles.onset_s, gain, strict=True)])
        histogram = phase_histogram(times, cycles, n_bins=8, rng=rng)
        low, high = garwood_limits(histogram.counts)
        covered.append((histogram.low_hz <= 10) & (histogram.high_hz >= 10))
        poisson.append((low <= 10 * histogram.exposure_s) & (10 * histogram.exposure_s <= high))
    assert np.mean(covered) > 0.88
    assert np.mean(poisson) < 0.75


def test_a_bin_without_spikes_keeps_an_upper_limit():
    cycles = steady_cycles(20)
    histogram = phase_histogram(cycles.onset_s + 0.01, cycles)
    assert histogram.high_hz[30] == pytest.approx(3.6889 / histogram.exposure_s[30], rel=1e-4)
    assert histogram.low_hz[30] == 0


def test_limits_are_the_same_for_the_same_seed_and_nan_without_resamples():
    cycles = steady_cycles(20)
    times = steady_spikes(cycles, 10, np.random.default_rng(0))
    first, second = phase_histogram(times, cycles), phase_histogram(times, cycles)
    np.testing.assert_array_equal(first.high_hz, second.high_hz)
    assert np.isnan(phase_histogram(times, cycles, n_bootstrap=0).high_hz).all()


# Garwood 1936, 95 %: the table that handbooks of radiation and health statistics print.
GARWOOD = {0: (0, 3.6889), 1: (0.0253, 5.5716), 2: (0.2422, 7.2247), 3: (0.6187, 8.7673), 5: (1.6235, 11.6683),
           10: (4.7954, 18.3904), 20: (12.2165, 30.8884), 50: (37.1110, 65.9188), 100: (81.3640, 121.6268)}


def test_garwood_limits_are_the_published_ones():
    low, high = garwood_limits(list(GARWOOD))
    np.testing.assert_allclose(low, [v[0] for v in GARWOOD.values()], atol=5.1e-5)
    np.testing.assert_allclose(high, [v[1] for v in GARWOOD.values()], atol=5.1e-5)


def test_garwood_limits_equal_those_from_chi_squared_quantiles():
    chi2 = pytest.importorskip("scipy.stats").chi2  # SciPy: low = chi2(2n)/2, high = chi2(2n + 2)/2
    n = np.arange(1, 40)
    low, high = garwood_limits(n, confidence=0.9)
    np.testing.assert_allclose(low, chi2.ppf(0.05, 2 * n) / 2)
    np.testing.assert_allclose(high, chi2.ppf(0.95, 2 * n + 2) / 2)


def test_garwood_refuses_negative_counts_and_odd_confidence():
    with pytest.raises(ValueError, match="negative"):
        garwood_limits([-1])
    with pytest.raises(ValueError, match="confidence"):
        garwood_limits([1], confidence=95)


def test_smoothing_grows_no_foot_across_a_transition():
    cycles = steady_cycles(100)
    times = phasic_spikes(cycles, lambda p: np.where(p < 1, 30.0, 0.0), np.random.default_rng(0))
    smooth = smoothed_rate(phase_histogram(times, cycles), bandwidth=0.1)
    assert (smooth[20:] == 0).all()
    np.testing.assert_allclose(smooth[:20], 30, rtol=0.15)


def test_smoothing_keeps_a_ramp_up_to_the_edge():
    cycles = steady_cycles(2000)
    times = phasic_spikes(cycles, lambda p: np.where(p < 1, 60 * p, 0.0), np.random.default_rng(0))
    smooth = smoothed_rate(phase_histogram(times, cycles, n_bootstrap=0), bandwidth=0.1)
    np.testing.assert_allclose(smooth[:20], 60 * (np.arange(20) + 0.5) / 20, atol=1.5)


def test_smoothing_leaves_a_flat_rate_flat_whatever_the_width():
    cycles = steady_cycles(10)
    histogram = phase_histogram([], cycles, n_bootstrap=0)
    histogram = type(histogram)(7 * histogram.exposure_s, *[getattr(histogram, n) for n in
                                ("exposure_s", "low_hz", "high_hz", "n_cycles")])
    for width in (0.001, 0.05, 0.3):
        np.testing.assert_allclose(smoothed_rate(histogram, bandwidth=width), 7)


def test_the_raster_shows_evenly_spaced_cycles_with_all_their_spikes():
    cycles = steady_cycles(1000)
    times = np.sort(np.concatenate([cycles.onset_s + 0.4, cycles.offset_s + 0.4]))
    shown = raster(times, cycles, max_cycles=50)
    assert (shown.n_cycles, shown.of_cycles) == (50, 1000)
    np.testing.assert_array_equal(np.bincount(shown.row), np.full(50, 2))
    np.testing.assert_allclose(np.unique(shown.phase.round(4)), [0.5, 1.25])
    assert raster(times, steady_cycles(3)).n_cycles == 3
