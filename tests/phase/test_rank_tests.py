import numpy as np
import pytest

from unitclass.phase.rank_tests import friedman_test, sign_test

# Hollander & Wolfe 1973, p. 140: times of 22 players rounding first base by three methods.
ROUNDING = np.array([
    5.40, 5.50, 5.55, 5.85, 5.70, 5.75, 5.20, 5.60, 5.50, 5.55, 5.50, 5.40, 5.90, 5.85, 5.70, 5.45, 5.55, 5.60,
    5.40, 5.40, 5.35, 5.45, 5.50, 5.35, 5.25, 5.15, 5.00, 5.85, 5.80, 5.70, 5.25, 5.20, 5.10, 5.65, 5.55, 5.45,
    5.60, 5.35, 5.45, 5.05, 5.00, 4.95, 5.50, 5.50, 5.40, 5.45, 5.55, 5.50, 5.55, 5.55, 5.35, 5.45, 5.50, 5.55,
    5.50, 5.45, 5.25, 5.65, 5.60, 5.40, 5.70, 5.65, 5.55, 6.30, 6.30, 6.25]).reshape(22, 3)


def test_friedman_gives_hollander_and_wolfes_values():
    found = friedman_test(ROUNDING)
    assert found.chi2 == pytest.approx(11.142857, abs=1e-6)
    assert found.p == pytest.approx(0.003805, abs=1e-6)
    assert found.w == pytest.approx(0.253247, abs=1e-6)


def test_friedman_on_tied_counts_equals_scipys():
    stats = pytest.importorskip("scipy.stats")
    rng = np.random.default_rng(0)
    for counts in (rng.poisson(0.7, (60, 20)), rng.poisson(400, (30, 12))):
        found, expected = friedman_test(counts), stats.friedmanchisquare(*counts.T)
        assert found.chi2 == pytest.approx(expected.statistic)
        assert found.p == pytest.approx(expected.pvalue)


def test_the_sign_test_equals_scipys_binomial_test_without_ties():
    binomtest = pytest.importorskip("scipy.stats").binomtest
    first, second = np.random.default_rng(0).poisson([[3.0], [4.0]], (2, 50))
    untied = first != second
    expected = binomtest(int((first > second).sum()), int(untied.sum())).pvalue
    assert sign_test(first, second) == pytest.approx(expected)
    assert sign_test(np.ones(4), np.ones(4) * 2) == 0.125
    assert sign_test(np.array([1.0, 2.0]), np.array([2.0, 1.0])) == 1.0


def test_nothing_but_ties_cannot_be_told():
    assert np.isnan(sign_test(np.ones(5), np.ones(5)))
    assert np.isnan(friedman_test(np.zeros((5, 4), int)).p)
    assert np.isnan(friedman_test(np.zeros((0, 4), int)).p)
