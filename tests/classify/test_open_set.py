from __future__ import annotations

import numpy as np
import pytest
from scipy.special import logsumexp

from unitclass.classify.open_set import GRIDS, arbitrary_evidence, humped_profiles, other_evidence
from unitclass.classify.unit_counts import count_row, shape_dispersion, stacked

CENTRES = (np.arange(40) + 0.5) / 20


def unit(by_cycle: np.ndarray, seconds: float = 0.05):
    return stacked([count_row(by_cycle, np.full(by_cycle.shape, seconds))], by_cycle.shape[1])


def test_the_closed_evidence_equals_a_mean_over_profiles_drawn_from_the_prior():
    """Monte Carlo over Dirichlet profiles as the brute-force twin, on the grids themselves."""
    rng = np.random.default_rng(0)
    counts, exposure = np.zeros((1, 8)), np.full((1, 8), 0.5)
    counts[0, :3] = (4, 2, 1)
    ours = arbitrary_evidence(counts, exposure)[0]
    profiles = rng.dirichlet(np.full(8, 0.7), 400_000) + 1e-300
    brute = logsumexp(np.log(profiles / 0.5) @ counts[0]) - np.log(len(profiles))
    assert GRIDS[0] == 8, "eight bins hold the first grid and no other"
    assert ours == pytest.approx(brute, abs=0.05)


def test_a_cell_that_drifts_in_phase_is_better_told_by_thirds_than_as_a_whole():
    rng = np.random.default_rng(1)
    centre = np.linspace(0.2, 1.8, 60)[:, None]
    steady = rng.poisson(2 * np.exp(-0.5 * ((CENTRES - 1.0) / 0.15) ** 2), (60, 40))
    drifting = rng.poisson(2 * np.exp(-0.5 * ((CENTRES - centre) / 0.15) ** 2))
    halved = [u.weighed(np.full(u.counts.shape, 0.5)) for u in (unit(steady), unit(drifting))]
    gain = [other_evidence(u) - arbitrary_evidence(u.counts, u.exposure_s) for u in halved]
    assert gain[1][0] > gain[0][0] + 20


def test_humped_profiles_are_positive_with_mean_one():
    profiles = humped_profiles(40, 30)
    assert (profiles > 0).all()
    np.testing.assert_allclose(profiles.mean(axis=1), 1.0)


def test_dispersion_is_one_for_poisson_counts_whatever_the_gain_of_each_cycle():
    rng = np.random.default_rng(2)
    gain = rng.gamma(4, 0.25, (400, 1))
    counts = rng.poisson(2 * gain * (1 + np.cos(np.pi * CENTRES)))
    assert shape_dispersion(counts.astype(float), np.full(counts.shape, 0.05)) == pytest.approx(1.0, abs=0.05)


def test_dispersion_shows_bursts_that_come_and_go_in_phase():
    rng = np.random.default_rng(3)
    counts = 4.0 * rng.poisson(0.5, (400, 40))
    assert shape_dispersion(counts, np.full(counts.shape, 0.05)) == pytest.approx(4.0, rel=0.1)


def test_dispersion_does_not_take_a_drift_in_phase_for_bursts():
    rng = np.random.default_rng(4)
    centre = np.linspace(0.2, 1.8, 160)[:, None]
    drifting = rng.poisson(2 * np.exp(-0.5 * ((CENTRES - centre) / 0.2) ** 2)).astype(float)
    assert shape_dispersion(drifting, np.full(drifting.shape, 0.05)) < 1.5
