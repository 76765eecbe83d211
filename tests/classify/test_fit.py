"""The profile drawn behind a histogram."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.classify.fit import fit

RATE = np.array([[2.0, 0.5, 0.5, 1.0], [0.5, 0.5, 2.0, 1.0]])
EVEN = np.log([0.5, 0.5])


def test_the_likelier_draw_makes_the_fit_and_its_gain_gives_the_units_own_number_of_spikes():
    exposure = np.array([[10.0, 10.0, 20.0, 20.0]])
    counts = 3.0 * RATE[:1] * exposure
    found = fit(counts, exposure, 1.0, RATE, EVEN)
    assert found.rate_hz == pytest.approx(3.0 * RATE[0])
    assert found.rate_hz @ exposure[0] == pytest.approx(counts.sum())


def test_draws_that_fit_alike_share_the_mean_and_span_the_band():
    counts = exposure = np.ones((1, 4))
    found = fit(counts, exposure, 0.0, RATE, EVEN)
    assert found.rate_hz == pytest.approx(RATE.mean(axis=0))
    assert np.all(found.low_hz <= found.rate_hz)
    assert np.all(found.rate_hz <= found.high_hz)
    assert (found.low_hz[0], found.high_hz[0]) == (0.5, 2.0)


def test_a_draw_without_weight_has_no_part():
    found = fit(np.ones((1, 4)), np.ones((1, 4)), 1.0, RATE, np.log([1.0, 1e-300]))
    assert found.rate_hz == pytest.approx(RATE[0])
