import re
from decimal import Decimal
from importlib import resources

import numpy as np
import pytest
from threadpoolctl import threadpool_limits

from unitclass.phase.modulation import eta_squared
from unitclass.phase.shift_null import shift_null


def eta_by_hand(rates):
    grand = rates.mean()
    between = len(rates) * sum((column.mean() - grand) ** 2 for column in rates.T)
    return between / np.sum((rates - grand) ** 2)


@pytest.mark.parametrize("n_fractions", [8, 9, 20])
def test_the_null_equals_rolling_each_cycle_by_hand(n_fractions):
    rng = np.random.default_rng(0)
    counts = rng.poisson(2, (3, 700, n_fractions))
    seconds = rng.uniform(1, 3, 700)
    found = shift_null(counts, 4, seed=11, cycle_s=seconds)
    rates = counts / (seconds / n_fractions)[:, None]
    draws = np.random.default_rng(11)
    shifts = np.concatenate([draws.integers(0, n_fractions, (4, 512)), draws.integers(0, n_fractions, (4, 188))], axis=1)
    for unit in range(3):
        assert found.eta_squared[unit] == pytest.approx(eta_by_hand(rates[unit]), rel=1e-9)
        by_hand = [eta_by_hand(np.stack([np.roll(r, s) for r, s in zip(rates[unit], row, strict=True)]))
                   for row in shifts]
        np.testing.assert_allclose(found.null[unit], by_hand, rtol=1e-9)
        assert found.p[unit] == (1 + sum(v >= found.eta_squared[unit] for v in by_hand)) / 5


def test_removing_the_variance_between_cycles_leaves_that_within():
    rates = np.random.default_rng(0).gamma(2, 5, (40, 1)) * np.linspace(0.5, 1.5, 20)
    within = rates - rates.mean(axis=1, keepdims=True)
    between = 40 * np.sum((rates.mean(axis=0) - rates.mean()) ** 2)
    found = shift_null(rates[None], 10, 0)
    assert found.eta_squared_within[0] == pytest.approx(between / np.sum(within**2))
    assert found.eta_squared_within[0] > 2 * found.eta_squared[0]


def test_a_units_result_does_not_depend_on_the_others_or_on_the_number_of_threads():
    counts = np.random.default_rng(1).poisson(0.5, (70, 1100, 20))
    with threadpool_limits(1):
        alone = shift_null(counts[40:41], 200, 5)
        one = shift_null(counts, 200, 5)
    with threadpool_limits(2):
        two = shift_null(counts, 200, 5)
    np.testing.assert_array_equal(one.p, two.p)
    assert alone.p[0] == one.p[40]
    assert shift_null(counts[40:41], 200, 6).null[0, 0] != alone.null[0, 0]


def test_cycles_not_used_do_not_count():
    counts = np.random.default_rng(1).poisson(1.0, (1, 60, 20))
    used = np.arange(60) < 40
    padded = shift_null(np.where(used[:, None], counts, 0), 10, 0, used=used[None])
    assert padded.eta_squared[0] == pytest.approx(eta_by_hand(counts[0, :40].astype(float)))


def test_a_modulated_unit_gets_the_least_probability_and_a_flat_bursty_one_any():
    rng = np.random.default_rng(2)
    phasic = rng.poisson(np.tile([0.3] * 15 + [0.9] * 5, (1, 100, 1)))
    start = rng.integers(0, 20, (300, 60))
    burst = np.zeros((300, 60, 20), int)
    for step in range(3):
        np.add.at(burst, (np.arange(300)[:, None], np.arange(60), (start + step) % 20), rng.poisson(3, (300, 60)))
    assert shift_null(phasic, 200, 0).p[0] == pytest.approx(1 / 201)
    p = shift_null(burst, 200, 0).p
    assert (p < 0.05).mean() == pytest.approx(0.05, abs=0.035)
    assert p.mean() == pytest.approx(0.5, abs=0.06)


@pytest.mark.parametrize(("n", "mean", "high"), [(10, 0.096, 0.148), (50, 0.019, 0.030)])
def test_eta_squared_of_an_unmodulated_poisson_unit_is_biased_as_computed(n, mean, high):
    """E = (k - 1)/(n k - 1); mean and 95th percentile for 0.5 spikes a bin, k = 20, by simulation."""
    eta = shift_null(np.random.default_rng(0).poisson(0.5, (2000, n, 20)), 1, 0).eta_squared
    assert eta.mean() == pytest.approx(19 / (n * 20 - 1), rel=0.03)
    assert eta.mean() == pytest.approx(mean, rel=0.05)
    assert np.quantile(eta, 0.95) == pytest.approx(high, rel=0.05)


def nist(name):
    """Return the groups of a NIST Statistical Reference Dataset, (n, k), from SciPy's own tests."""
    folder = resources.files("scipy").joinpath("stats", "tests", "data", "nist_anova")
    if not folder.joinpath(f"{name}.dat").is_file():
        pytest.skip("this SciPy carries no NIST analysis-of-variance data")
    lines = folder.joinpath(f"{name}.dat").read_text().splitlines()
    first = int(re.search(r"lines\s+(\d+) to", next(x for x in lines if "Data" in x and "lines" in x)).group(1))
    rows = [line.split() for line in lines[first - 1 :] if line.strip()]
    group = np.array([int(g) for g, _ in rows])
    # In decimals, before any of them is rounded to a double: values near 1e12 leave three digits for the rest.
    least = min(Decimal(v) for _, v in rows)
    value = np.array([float(Decimal(v) - least) for _, v in rows])
    return np.stack([value[group == g] for g in np.unique(group)], axis=1)


@pytest.mark.parametrize(("name", "eta", "f", "rel"), [
    ("SiRstv", 0.190999039, 1.18046237, 1e-8), ("SmLs01", 0.482758621, 21.0, 1e-8),
    ("AtmWtAg", 0.257426545, 15.94673336, 1e-6), ("SmLs09", 0.470712773465067, 2001.0, 1e-8)])
def test_eta_squared_is_the_certified_one_of_nist(name, eta, f, rel):
    """NIST StRD one-way analysis of variance; SmLs09 (values near 1e12) is reached by centring first."""
    groups = nist(name)
    n, k = groups.shape
    found = eta_squared(groups)
    assert found == pytest.approx(eta, rel=rel)
    assert found / (1 - found) * (n * k - k) / (k - 1) == pytest.approx(f, rel=3 * rel)


def test_eta_squared_of_the_plant_growth_example():
    """R 4.2.2, data PlantGrowth (Dobson 1983): F 4.846, p .0159, eta squared .26415."""
    growth = np.array([
        [4.17, 5.58, 5.18, 6.11, 4.50, 4.61, 5.17, 4.53, 5.33, 5.14],
        [4.81, 4.17, 4.41, 3.59, 5.87, 3.83, 6.03, 4.89, 4.32, 4.69],
        [6.31, 5.12, 5.54, 5.50, 5.37, 5.29, 4.92, 6.15, 5.80, 5.26]]).T
    found = eta_squared(growth)
    assert found == pytest.approx(0.26415, abs=1e-5)
    assert found / (1 - found) * 27 / 2 == pytest.approx(4.846, abs=5e-4)


def test_silence_one_cycle_and_no_units_are_answered_with_nan_or_nothing():
    assert np.isnan(shift_null(np.zeros((1, 20, 20)), 10, 0).p).all()
    assert np.isnan(shift_null(np.ones((1, 1, 20)) * np.arange(20), 10, 0).p).all()
    assert shift_null(np.zeros((0, 20, 20)), 10, 0).p.size == 0


def test_counts_of_the_wrong_shape_and_no_shifts_are_refused():
    with pytest.raises(ValueError, match="units, cycles, fractions"):
        shift_null(np.zeros((20, 20)), 10, 0)
    with pytest.raises(ValueError, match="positive"):
        shift_null(np.zeros((1, 20, 20)), 0, 0)
