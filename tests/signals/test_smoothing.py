"""Smoothers against the plain mean of every window."""

import numpy as np
import pytest

from unitclass.signals.smoothing import boxcar


@pytest.mark.parametrize("n_samples", [1, 2, 5, 40])
@pytest.mark.parametrize("width", [3, 5, 7, 79, 81])
def test_a_moving_mean_is_cut_at_the_ends_and_not_padded(n_samples, width):
    values = np.random.default_rng(4).standard_normal(n_samples)
    half = width // 2
    expected = [values[max(0, i - half) : i + half + 1].mean() for i in range(n_samples)]
    assert np.allclose(boxcar(values, width), expected, rtol=1e-12, atol=1e-12)
