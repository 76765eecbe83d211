from math import gamma, pi, sqrt

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from unitclass.phase.intervals import intervals_within, isi_cv, isi_cv2, isi_lv, refractory_violations


def one_burst(intervals):
    times = np.append(0.0, np.cumsum(intervals))
    return intervals_within(times, np.zeros(times.size, int))


def test_cv2_and_lv_of_five_intervals_by_hand():
    found = one_burst([10, 20, 30, 15, 5])
    assert isi_cv2(found) == pytest.approx(0.683333, abs=1e-6)
    assert isi_lv(found) == pytest.approx(0.384167, abs=1e-6)


@pytest.mark.parametrize("k", [1, 2, 4])
def test_gamma_intervals_of_order_k_have_the_theoretical_irregularity(k):
    """LV = 3/(2k+1) (Shinomoto 2003); CV2 = 2 G(k+1/2)/(sqrt(pi) G(k+1)) (Holt 1996); CV = k^-1/2."""
    found = one_burst(np.random.default_rng(k).gamma(k, 1.0, 60_000))
    assert isi_lv(found) == pytest.approx(3 / (2 * k + 1), rel=0.02)
    assert isi_cv2(found) == pytest.approx(2 * gamma(k + 0.5) / (sqrt(pi) * gamma(k + 1)), rel=0.02)
    assert isi_cv(found) == pytest.approx(k**-0.5, rel=0.02)


def test_regular_bursts_are_regular_whatever_the_silence_between_them():
    times = np.concatenate([start + np.arange(8) * 0.02 for start in (0.0, 2.3, 5.9)])
    burst = np.repeat([0, 1, 2], 8)
    found = intervals_within(times, burst)
    assert found.seconds.size == 21
    assert isi_cv(found) == pytest.approx(0, abs=1e-9)
    assert isi_cv2(found) == pytest.approx(0, abs=1e-9)
    assert isi_lv(found) == pytest.approx(0, abs=1e-9)
    assert isi_cv(intervals_within(times, np.zeros(24, int))) > 1


def test_a_pair_of_intervals_counts_only_when_it_shares_a_spike():
    times = np.array([0.0, 0.01, 1.0, 1.03])
    assert np.isnan(isi_cv2(intervals_within(times, np.array([0, 0, 1, 1]))))
    assert np.isnan(isi_cv2(intervals_within(times, np.array([0, 0, -1, -1]))))


def test_spikes_of_no_burst_make_no_interval():
    assert intervals_within(np.arange(4.0), np.array([-1, -1, 0, 0])).seconds.tolist() == [1.0]


@given(st.lists(st.floats(1e-3, 10), min_size=3, max_size=40), st.floats(0.01, 100))
def test_irregularity_does_not_depend_on_the_unit_of_time(intervals, scale):
    first, second = one_burst(intervals), one_burst(scale * np.array(intervals))
    for measure in (isi_cv, isi_cv2, isi_lv):
        assert measure(first) == pytest.approx(measure(second), rel=1e-6, abs=1e-9)


def test_refractory_violations_are_the_share_of_short_intervals_in_any_order():
    assert refractory_violations([0.2, 0.0, 0.0005, 0.1, 0.1009], 1.0) == 0.5
    assert np.isnan(refractory_violations([1.0], 1.0))
    assert np.isnan(isi_cv(one_burst([1.0])))
