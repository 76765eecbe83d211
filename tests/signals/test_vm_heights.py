"""Dominant heights and the level at which an event counts."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import norm

from unitclass.signals.vm_heights import dominant_size, group_limits, threshold_z


def normal(mean: float, sd: float, n: int, seed: int = 0) -> np.ndarray:
    return np.random.default_rng(seed).normal(mean, sd, n)


def test_the_tallest_group_is_dominant_and_its_limit_parts_it_from_the_rest() -> None:
    size, limit = dominant_size(np.concatenate([normal(60, 3, 200), normal(12, 1, 900)]))
    assert size == pytest.approx(60, abs=1)
    assert 16 < limit < 50


def test_one_group_has_nothing_below_it() -> None:
    size, limit = dominant_size(normal(60, 6, 500))
    assert size == pytest.approx(60, abs=1)
    assert limit == 0.0


def test_a_burst_that_shrinks_step_by_step_is_one_group() -> None:
    sizes = np.concatenate([60 * 0.85**k + normal(0, 0.6, 50, seed=k) for k in range(8)])
    assert group_limits(sizes) == []


def test_a_handful_of_taller_artefacts_is_not_the_cell() -> None:
    size, _ = dominant_size(np.concatenate([normal(90, 1, 4), normal(30, 2, 1000)]))
    assert size == pytest.approx(30, abs=1)


def test_twenty_tall_spikes_among_thousands_of_spikelets_are_the_cell() -> None:
    size, _ = dominant_size(np.concatenate([normal(60, 2, 25), normal(10, 1, 5000)]))
    assert size == pytest.approx(60, abs=2)


def test_no_events_have_no_size() -> None:
    assert dominant_size(np.empty(0)) == (0.0, 0.0)


def test_far_out_of_the_noise_the_level_is_one_chance_crossing_in_a_thousand_seconds() -> None:
    z = threshold_z(40.0, 10.0)
    assert 1500 * norm.sf(z) <= 1e-3 < 1500 * norm.sf(z - 0.1)


@pytest.mark.parametrize(("dominant_z", "rate_hz"), [(6.0, 12.0), (7.0, 3.0)])
def test_near_the_noise_the_level_makes_the_fewest_mistakes(dominant_z: float, rate_hz: float) -> None:
    z = threshold_z(dominant_z, rate_hz)
    levels = np.linspace(3.4, 6, 500)
    mistakes = 1500 * norm.sf(levels) + rate_hz * norm.cdf(levels - dominant_z)
    chosen = 1500 * norm.sf(z) + rate_hz * norm.cdf(z - dominant_z)
    assert chosen <= 1.05 * mistakes.min()
