import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.builders import steady_cycles, varied_cycles
from unitclass.phase.warp import from_phase, from_three_part_phase, to_phase, to_three_part_phase
from unitclass.records import Cycles


def gappy_cycles():
    """Five cycles, a gap after the second, the end of inspiration of the fourth unknown."""
    return Cycles.plain(np.array([0.0, 2.0, 9.0, 11.0, 13.0]), np.array([0.5, 2.7, 9.4, np.nan, 14.5]),
                        np.array([2.0, 4.0, 11.0, 13.0, 15.0]))


def phase_by_hand(t, cycles):
    for c in range(cycles.n_cycles):
        on, off, end = cycles.onset_s[c], cycles.offset_s[c], cycles.end_s[c]
        if on <= t < end and np.isfinite(off):
            return ((t - on) / (off - on) if t < off else 1 + (t - off) / (end - off)), c
    return np.nan, -1


def test_warping_equals_a_plain_loop_over_spikes_and_cycles():
    rng = np.random.default_rng(1)
    for cycles in (gappy_cycles(), varied_cycles(40, rng)):
        times = rng.uniform(-2, cycles.end_s[-1] + 2, 500)
        phased = to_phase(times, cycles)
        phase, row = zip(*(phase_by_hand(t, cycles) for t in times), strict=True)
        np.testing.assert_allclose(phased.phase, phase, rtol=0, atol=1e-12)
        np.testing.assert_array_equal(phased.cycle, row)


def test_a_spike_on_a_mark_belongs_to_what_begins_there():
    phased = to_phase([0.0, 0.5, 2.0, 2.7, 4.0, 9.0], gappy_cycles())
    np.testing.assert_array_equal(phased.phase, [0, 1, 0, 1, np.nan, 0])
    np.testing.assert_array_equal(phased.cycle, [0, 0, 1, 1, -1, 2])


def test_spikes_in_gaps_before_after_and_in_cycles_without_offset_have_no_phase():
    phased = to_phase([-1.0, 5.0, 12.0, 15.0, 99.0], gappy_cycles())
    assert np.isnan(phased.phase).all()
    assert (phased.cycle == -1).all()


def test_no_cycles_and_no_spikes_are_answered_with_nothing():
    none = Cycles.plain(np.array([]), np.array([]), np.array([]))
    assert to_phase([1.0, 2.0], none).cycle.tolist() == [-1, -1]
    assert to_phase([], gappy_cycles()).phase.size == 0


def test_phases_never_reach_the_next_whole_number_by_rounding():
    cycles = steady_cycles(50, ti_s=0.1, te_s=0.3, start_s=1e6)
    just_before = np.concatenate([np.nextafter(cycles.offset_s, 0), np.nextafter(cycles.end_s, 0)])
    phased = to_phase(just_before, cycles)
    assert np.all(phased.phase[:50] < 1)
    assert np.all(phased.phase[50:] < 2)
    np.testing.assert_array_equal(phased.cycle, np.tile(np.arange(50), 2))


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(-1e4, 1e4), st.floats(0.1, 10))
def test_shifting_or_scaling_the_clock_leaves_phases_alone(seed, shift, scale):
    rng = np.random.default_rng(seed)
    cycles = varied_cycles(12, rng)
    times = rng.uniform(0, cycles.end_s[-1], 60)
    moved = Cycles.plain(*(shift + scale * m for m in (cycles.onset_s, cycles.offset_s, cycles.end_s)))
    first, second = to_phase(times, cycles), to_phase(shift + scale * times, moved)
    # A spike within rounding of a mark may fall to either side of it.
    clear = np.abs(first.phase - np.round(first.phase)) > 1e-6
    np.testing.assert_allclose(first.phase[clear], second.phase[clear], atol=1e-6)
    np.testing.assert_array_equal(first.cycle[clear], second.cycle[clear])


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_seconds_to_phase_and_back_is_the_identity_in_any_order(seed):
    rng = np.random.default_rng(seed)
    cycles = varied_cycles(15, rng)
    times = rng.permutation(rng.uniform(0, cycles.end_s[-1], 80))
    phased = to_phase(times, cycles)
    np.testing.assert_allclose(from_phase(phased.phase, phased.cycle, cycles), times, atol=1e-9)
    order = np.argsort(times)
    np.testing.assert_array_equal(to_phase(times[order], cycles).phase, phased.phase[order])


def test_the_three_part_phase_splits_expiration_at_the_end_of_post_inspiration():
    cycles = Cycles.plain(np.array([0.0, 4.0]), np.array([1.0, 5.0]), np.array([4.0, 8.0]))
    cycles = Cycles(**{**cycles.__dict__, "post_i_end_s": np.array([2.0, np.nan])})
    times = np.array([0.5, 1.5, 3.0, 4.5])
    phased = to_three_part_phase(times, cycles)
    np.testing.assert_array_equal(phased.phase, [0.5, 1.5, 2.5, np.nan])
    np.testing.assert_array_equal(phased.cycle, [0, 0, 0, -1])
    np.testing.assert_allclose(from_three_part_phase(phased.phase, phased.cycle, cycles), [0.5, 1.5, 3.0, np.nan])


@pytest.mark.parametrize("times", [[[1.0]], [1.0, np.nan], [np.inf]])
def test_times_that_are_no_row_of_finite_seconds_are_refused(times):
    with pytest.raises(ValueError, match="finite seconds"):
        to_phase(times, steady_cycles(2))


def test_overlapping_cycles_and_phases_out_of_range_are_refused():
    with pytest.raises(ValueError, match="ascend without overlap"):
        to_phase([1.0], Cycles.plain(np.array([0.0, 1.0]), np.array([0.5, 1.5]), np.array([2.0, 3.0])))
    with pytest.raises(ValueError, match=r"\[0, 2\)"):
        from_phase([2.0], [0], steady_cycles(1))
    with pytest.raises(ValueError, match="below 1"):
        from_phase([0.5], [1], steady_cycles(1))
