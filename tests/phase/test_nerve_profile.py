import numpy as np
import pytest

from tests.builders import steady_cycles, varied_cycles
from unitclass.phase.nerve_profile import nerve_profile
from unitclass.phase.warp import to_phase
from unitclass.records import Cycles, Envelope


def envelope_of(cycles, shape, *, rate_hz=500.0):
    times = np.arange(0, cycles.end_s[-1], 1 / rate_hz)
    values = shape(to_phase(times, cycles).phase)
    return Envelope("PNA", "phrenic", "V", 0.0, rate_hz, values.astype(np.float32))


def test_a_nerve_that_follows_phase_gives_that_shape_back_however_cycles_vary():
    cycles = varied_cycles(600, np.random.default_rng(0))
    profile = nerve_profile(envelope_of(cycles, lambda p: np.where(p < 1, p, 0.0)), cycles, n_bins=40)
    middles = (np.arange(40) + 0.5) / 20
    np.testing.assert_allclose(profile.mean, np.where(middles < 1, middles, 0.0), atol=0.02)
    assert (profile.name, profile.role, profile.unit) == ("PNA", "phrenic", "V")


def test_gaps_and_time_beyond_the_recording_are_left_out():
    cycles = steady_cycles(20)
    values = np.full(30 * 100, 2.0, dtype=np.float32)
    values[500:1500] = np.nan
    profile = nerve_profile(Envelope("a", "vagus", "V", 0.0, 100.0, values), cycles)
    np.testing.assert_allclose(profile.mean, 2.0)


def test_a_nerve_that_was_never_there_has_no_profile():
    flat = Envelope("a", "vagus", "V", 0.0, 100.0, np.full(100, np.nan, dtype=np.float32))
    assert np.isnan(nerve_profile(flat, steady_cycles(3)).mean).all()
    none = np.array([])
    assert np.isnan(nerve_profile(flat, Cycles.plain(none, none, none), n_bins=8).mean).all()


def test_an_odd_number_of_bins_is_refused():
    with pytest.raises(ValueError, match="even"):
        nerve_profile(envelope_of(steady_cycles(2), np.nan_to_num), steady_cycles(2), n_bins=5)
