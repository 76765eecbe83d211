import numpy as np
import pytest

from tests.builders import steady_cycles, steady_spikes, varied_cycles
from unitclass.phase.locked import locked_histogram
from unitclass.records import Cycles


def test_a_fixed_latency_stays_in_one_bin_while_phase_smears_it():
    cycles = varied_cycles(200, np.random.default_rng(0))
    histogram = locked_histogram(cycles.onset_s[1:] - 0.055, cycles, "onset", 500, 10)
    busy = histogram.rate_hz > 0
    assert histogram.centres_ms[busy & (np.abs(histogram.centres_ms) < 300)].tolist() == [-55]
    assert histogram.rate_hz[histogram.centres_ms == -55] == pytest.approx(100, rel=0.01)


def test_the_locked_histogram_equals_a_plain_loop_over_transitions():
    rng = np.random.default_rng(1)
    cycles = varied_cycles(20, rng, ti_s=0.3, te_s=0.6)
    times = steady_spikes(cycles, 30, rng)
    observed = np.array([[0.0, 7.0], [9.0, 40.0]])
    edges = np.arange(-50, 51) * 0.02
    counts, seconds = np.zeros(100), np.zeros(100)
    fine = np.arange(0, cycles.end_s[-1], 1e-4) + 5e-5
    for event in cycles.offset_s:
        for t, into, weight in ((times, counts, 1.0), (fine, seconds, 1e-4)):
            seen = np.any([(t >= a) & (t <= b) for a, b in observed], axis=0)
            into += weight * np.histogram(t[seen] - event, edges)[0]
    histogram = locked_histogram(times, cycles, "offset", 1000, 20, observed_s=observed)
    np.testing.assert_allclose(histogram.rate_hz, counts / seconds, rtol=0.02)


def test_steady_firing_is_flat_around_cycles_that_lie_apart():
    cycles = steady_cycles(400)
    kept = cycles.select(np.arange(400) % 3 != 1)
    times = steady_spikes(cycles, 300, np.random.default_rng(0))
    rate = locked_histogram(times, kept, "onset", 800, 100).rate_hz
    np.testing.assert_allclose(rate, 300, rtol=0.07)


def test_wrong_words_and_bins_are_refused():
    with pytest.raises(ValueError, match="'onset' or 'offset'"):
        locked_histogram([], steady_cycles(2), "peak", 100, 10)
    with pytest.raises(ValueError, match="bin_ms"):
        locked_histogram([], steady_cycles(2), "onset", 100, 0)


def test_without_cycles_the_rate_is_unknown():
    none = np.array([])
    assert np.isnan(locked_histogram([1.0], Cycles.plain(none, none, none), "onset", 100, 10).rate_hz).all()
