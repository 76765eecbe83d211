import numpy as np
import pytest

from tests.builders import steady_cycles, varied_cycles
from unitclass.phase.exposure import (
    common_intervals,
    cycle_resamples,
    exposure,
    is_within,
    merged_intervals,
    observed_before,
)
from unitclass.phase.warp import to_phase


def test_without_intervals_every_bin_holds_its_share_of_ti_or_te():
    given = exposure(steady_cycles(3, ti_s=0.8, te_s=1.6), n_bins=8)
    np.testing.assert_allclose(given.seconds, np.tile([0.2] * 4 + [0.4] * 4, (3, 1)))
    assert given.is_whole.all()
    assert given.n_cycles == 3


def test_exposure_under_intervals_equals_counting_a_fine_clock():
    rng = np.random.default_rng(3)
    cycles = varied_cycles(12, rng)
    intervals = np.array([[3.3, 9.1], [-5.0, 1.0], [8.0, 11.7], [20.0, 300.0]])
    step = 1e-4
    clock = np.arange(0, cycles.end_s[-1], step) + step / 2
    clock = clock[np.any([(clock >= a) & (clock < b) for a, b in intervals], axis=0)]
    phased = to_phase(clock[clock < cycles.end_s[-1]], cycles)
    bins = (phased.phase * 10).astype(int)
    by_clock = np.zeros((12, 20))
    np.add.at(by_clock, (phased.cycle, bins), step)
    given = exposure(cycles, observed_s=intervals, n_bins=20)
    np.testing.assert_allclose(given.seconds, by_clock, atol=3 * step)
    whole = [any(a <= on and end <= b for a, b in [(-5, 1), (3.3, 11.7), (20, 300)])
             for on, end in zip(cycles.onset_s, cycles.end_s, strict=True)]
    np.testing.assert_array_equal(given.is_whole, whole)


def test_intervals_that_cover_all_cycles_are_the_same_as_none():
    cycles = steady_cycles(5)
    assert exposure(cycles, observed_s=[[0, 6], [6, 100]]).is_always
    assert not exposure(cycles, observed_s=[[0, 6], [6.1, 100]]).is_always


def test_no_observation_at_all_is_no_exposure():
    given = exposure(steady_cycles(5), observed_s=np.empty((0, 2)))
    assert given.seconds.sum() == 0
    assert given.n_cycles == 0


def test_merging_joins_nested_overlapping_and_touching_intervals():
    merged = merged_intervals([[5, 6], [0, 3], [1, 2], [3, 4], [8, 9]])
    np.testing.assert_array_equal(merged, [[0, 4], [5, 6], [8, 9]])
    assert is_within(np.array([-1.0, 0.0, 4.0, 4.5, 8.5, 10.0]), merged).tolist() == [False, True, True, False,
                                                                                     True, False]
    np.testing.assert_allclose(observed_before(np.array([-1.0, 2.0, 4.5, 5.5, 99.0]), merged), [0, 2, 4, 4.5, 6])


def test_what_two_sets_of_intervals_share_equals_a_fine_clock():
    rng = np.random.default_rng(0)
    first, second = (merged_intervals(np.sort(rng.uniform(0, 50, (10, 2)), axis=1) // 0.5 * 0.5) for _ in range(2))
    shared = common_intervals(first, second)
    clock = np.arange(0, 50, 0.5) + 0.25
    np.testing.assert_array_equal(is_within(clock, shared), is_within(clock, first) & is_within(clock, second))
    assert common_intervals(first, np.empty((0, 2))).shape == (0, 2)


def test_each_resample_draws_as_many_observed_cycles_as_there_are():
    given = exposure(steady_cycles(10), observed_s=[[0, 12.0]])
    drawn = cycle_resamples(given, 50, np.random.default_rng(0))
    assert (drawn.weights.sum(axis=1) == 5).all()
    assert drawn.weights[:, 5:].sum() == 0
    np.testing.assert_allclose(drawn.seconds, drawn.weights @ given.seconds)


def test_backward_intervals_and_odd_bins_are_refused():
    with pytest.raises(ValueError, match="swap"):
        exposure(steady_cycles(2), observed_s=[[3, 1]])
    with pytest.raises(ValueError, match="even number, not 7"):
        exposure(steady_cycles(2), n_bins=7)
