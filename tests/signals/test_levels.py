"""Floors and burst levels against a walk over the windows one by one."""

import numpy as np
import pytest

from unitclass.signals.levels import COARSE_HZ, FLOOR_PERCENT, FLOOR_WINDOW_S, first_floor, floor_between

RATE_HZ = COARSE_HZ


def _wandering(n_samples, missing, seed=3):
    rng = np.random.default_rng(seed)
    values = 5 + rng.standard_normal(n_samples).cumsum() / 50
    values[rng.random(n_samples) < missing] = np.nan
    return values


@pytest.mark.parametrize("missing", [0.0, 0.4])
def test_the_floor_of_one_window_is_numpys_percentile_of_what_is_there(missing):
    trace = _wandering(round(FLOOR_WINDOW_S * RATE_HZ), missing)
    assert np.allclose(first_floor(trace, RATE_HZ), np.nanpercentile(trace, FLOOR_PERCENT), rtol=1e-12)


def test_the_floor_between_bursts_is_the_median_outside_them():
    trace = _wandering(500, 0.1)
    in_burst = np.arange(500) % 50 < 20
    expected = np.nanmedian(trace[~in_burst])
    assert np.allclose(floor_between(trace, in_burst, RATE_HZ, 10.0), expected, rtol=1e-12)


def test_a_window_with_hardly_a_sample_takes_its_neighbours_floor():
    trace = np.full(9000, 2.0)
    trace[4000:6000] = np.nan
    assert np.allclose(first_floor(trace, RATE_HZ), 2.0)


def test_a_trace_without_a_single_finite_sample_has_a_floor_of_zero():
    assert not first_floor(np.full(300, np.nan), RATE_HZ).any()
