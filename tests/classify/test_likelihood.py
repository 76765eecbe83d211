from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import multinomial

from tests.classify.families import TIMING, in_and_ex
from unitclass.classify.draws import draw_families
from unitclass.classify.likelihood import evidence_share, family_evidence, log_likelihood
from unitclass.classify.posterior import probabilities, type_log_prior


def some_units(seed: int = 0) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    return rng.poisson(3.0, (5, 8)).astype(float), rng.uniform(0.5, 2, (5, 8)), rng.uniform(0.2, 3, (4, 8))


def test_differences_between_profiles_equal_scipys_multinomial():
    """SciPy's multinomial distribution as an independent oracle."""
    counts, exposure, rate = some_units()
    ours = log_likelihood(counts, exposure, rate)
    for u in range(5):
        theirs = [multinomial.logpmf(counts[u], int(counts[u].sum()), r * exposure[u] / (r @ exposure[u])) for r in rate]
        np.testing.assert_allclose(np.diff(ours[u]), np.diff(theirs), rtol=1e-9)


def test_differences_equal_independent_poisson_counts_at_the_fitted_gain():
    """Poisson counts at their best gain and a multinomial given the total are one likelihood (statsmodels)."""
    families = pytest.importorskip("statsmodels.genmod.families")
    counts, exposure, rate = some_units(1)
    ours = log_likelihood(counts, exposure, rate)
    for u in range(5):
        gain = counts[u].sum() / (rate @ exposure[u])
        theirs = [families.Poisson().loglike(counts[u], g * r * exposure[u]) for g, r in zip(gain, rate, strict=True)]
        np.testing.assert_allclose(np.diff(ours[u]), np.diff(theirs), rtol=1e-9)


def test_a_bin_never_observed_says_nothing():
    counts, exposure, rate = some_units()
    counts[:, 2], exposure[:, 2] = 0.0, 0.0
    changed = rate.copy()
    changed[:, 2] *= 7
    np.testing.assert_allclose(log_likelihood(counts, exposure, rate), log_likelihood(counts, exposure, changed))


def test_the_units_of_time_do_not_matter():
    counts, exposure, rate = some_units()
    ms = log_likelihood(counts, exposure * 1e3, rate)
    np.testing.assert_allclose(np.diff(ms, axis=1), np.diff(log_likelihood(counts, exposure, rate), axis=1))


def test_family_evidence_is_the_mean_likelihood_over_draws_by_brute_force():
    counts, exposure, _ = some_units()
    drawn = draw_families(in_and_ex(), TIMING, n_bins=8, n_draws=6)
    log_lik = log_likelihood(counts, exposure, drawn.rate)
    evidence = family_evidence(log_lik, drawn)
    for t, type_id in enumerate(drawn.types):
        brute = np.log(np.mean(np.exp(log_lik[:, drawn.rows(type_id)]), axis=1))
        np.testing.assert_allclose(evidence[:, t], brute, rtol=1e-9)


def test_two_types_without_freedom_have_the_posterior_of_bayes_rule():
    """With one curve each, the posterior is known in closed form."""
    drawn = draw_families(in_and_ex(), TIMING, n_bins=8, n_draws=3)
    counts, exposure = np.array([[2.0, 1, 0, 1, 0, 0, 1, 0]]), np.array([[0.25] * 4 + [0.5] * 4])
    log_lik = log_likelihood(counts, exposure, drawn.rate)
    prior = type_log_prior(in_and_ex(), {"three-phase": 1.0}, 1e-12)
    ours = probabilities(np.c_[family_evidence(log_lik, drawn), [-1e9]], prior, 1.0)[0]
    p_in, p_ex = (np.prod((drawn.rate[drawn.rows(t)][0] * exposure[0]
                           / (drawn.rate[drawn.rows(t)][0] @ exposure[0])) ** counts[0]) for t in drawn.types)
    assert ours[0] == pytest.approx(p_in / (p_in + p_ex), rel=1e-9)
    assert ours.sum() == pytest.approx(1.0)


def test_the_mean_over_draws_agrees_with_dense_quadrature_on_a_family_of_one_parameter():
    """Importance sampling by a Latin hypercube against a fine grid over the only free parameter."""
    from unitclass.classify.draws import draw_profiles
    from unitclass.classify.templates import TypeLibrary, family_from_mapping

    fixed = {"wiggle": [0, 0], "foreign": [0, 0], "harmonic": [0, 0], "step": [0.9, 0.9], "at": [0.5, 0.5]}
    family = family_from_mapping({"id": "x", "form": "cosine", "ranges": {**fixed, "depth": [0.1, 0.9]}}, where="")
    counts, exposure = np.array([[9.0, 8, 3, 2]]), np.ones((1, 4))
    drawn = draw_families(TypeLibrary("one", (family,)), TIMING, n_bins=4, n_draws=400)
    ours = family_evidence(log_likelihood(counts, exposure, drawn.rate), drawn)[0, 0]
    grid = []
    for depth in np.linspace(0.1, 0.9, 801):
        one = family_from_mapping({"id": "x", "form": "cosine", "ranges": {**fixed, "depth": [depth, depth]}}, where="")
        grid.append(log_likelihood(counts, exposure, draw_profiles(one, TIMING, n_bins=4, n_draws=1))[0, 0])
    assert ours == pytest.approx(np.log(np.mean(np.exp(grid))), abs=0.01)


def test_evidence_saturates_at_the_concentration_and_bursty_trains_count_less():
    counts, seconds = np.array([[0.25], [25000.0]]) * np.ones(40), np.full((2, 40), 3.0)
    effective = (counts * evidence_share(counts, seconds, np.ones(2), 300.0)).sum(axis=1)
    assert effective[0] == pytest.approx(10, rel=0.05)
    assert effective[1] == pytest.approx(300, rel=0.01)
    assert (evidence_share(counts, seconds, np.full(2, 3.0), 300.0)[0] < 0.4).all()


def test_evidence_on_even_bins_is_the_likelihood_raised_to_one_power():
    counts, exposure, rate = some_units()
    even = np.full(exposure.shape, 0.7)
    share = evidence_share(counts, even, np.full(len(counts), 2.0), 50.0)
    power = 1.0 / (2.0 + counts.sum(axis=1, keepdims=True) / 50.0)
    ours = log_likelihood(counts * share, even * share, rate)
    np.testing.assert_allclose(np.diff(ours), np.diff(power * log_likelihood(counts, even, rate)), atol=1e-9)


def test_a_short_inspiration_says_as_much_of_a_busy_cell_as_a_long_one():
    """Doubt about a shape is doubt per bin: a rest of a third of a second in six is seen as one of two in four."""
    rate = np.r_[np.full(20, 0.1), np.ones(20)]
    rival = np.r_[np.full(20, 0.4), np.ones(20)]
    odds = []
    for ti_s, te_s in ((2.0, 2.0), (0.35, 5.65)):
        seconds = np.repeat([ti_s / 20, te_s / 20], 20)[None] * 100
        counts = 40.0 * rate * seconds
        share = evidence_share(counts, seconds, np.ones(1), 300.0)
        both = log_likelihood(counts * share, seconds * share, np.stack([rate, rival]))[0]
        odds.append(both[0] - both[1])
    assert odds[1] > 0.5 * odds[0] > 5
