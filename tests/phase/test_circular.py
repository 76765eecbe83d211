"""Outside values: astropy 8.0.2, pycircstat2 0.1.15 and R 4.2.2 `circular` 0.4-95 on published data."""

from importlib import resources

import numpy as np
import pytest

from unitclass.phase.circular import (
    canonical_phase,
    equalised_turns,
    kuiper,
    rao_spacing,
    rayleigh_p,
    rayleigh_p_wilkie,
    resultant,
    watson,
)

PIGEONS = [20, 135, 145, 165, 170, 200, 300, 325, 335, 350, 350, 350, 355]  # Mardia & Jupp 2000, p. 99


def published(name):
    if name == "pigeons":
        return np.array(PIGEONS, dtype=float)
    pytest.importorskip("pycircstat2", reason="pycircstat2 0.1.15 carries the published angles")
    book, table = name.split("/")
    path = resources.files("pycircstat2").joinpath("data", book, f"{table}.csv")
    with path.open() as file:
        return np.genfromtxt(file, delimiter=",", skip_header=1)[:, 1]


# Zar, Biostatistical Analysis, data D1 and D7 of pycircstat2; Fisher 1993, data B3.
EXPECTED: dict[str, dict[str, float]] = {
    "zar/D1": dict(n=8, mean=98.98775, r=0.825218, z=5.44787, exact=0.00165512, wilkie=0.00185164, kuiper=2.13927,
                   u2=0.300876, u2_star=0.318932, rao=206.0),
    "zar/D7": dict(n=10, mean=94.0482, r=0.952137, z=9.06564, exact=6.149e-7, wilkie=5.304e-6, kuiper=2.78994,
                   u2=0.584781, u2_star=0.621843, rao=260.0),
    "pigeons": dict(n=13, mean=344.3297, r=0.215637, z=0.604490, exact=0.5554151, wilkie=0.5551509, kuiper=1.50468,
                    u2=0.136129, u2_star=0.136969, rao=161.9231),
    "fisher/B3": dict(n=76, mean=64.1713, r=0.497092, z=18.77964, exact=2.09e-9, wilkie=2.148e-9, kuiper=3.90105,
                      u2=1.192425, u2_star=1.203664, rao=174.5263),
}


@pytest.mark.parametrize("name", EXPECTED)
def test_published_samples_give_the_published_statistics(name):
    degrees, known = published(name), EXPECTED[name]
    found = resultant(np.deg2rad(degrees))
    assert found.n == known["n"]
    assert np.rad2deg(found.angle) == pytest.approx(known["mean"], abs=6e-5)
    assert found.length == pytest.approx(known["r"], abs=6e-7)
    assert found.n * found.length**2 == pytest.approx(known["z"], abs=6e-6)
    assert rayleigh_p(found.n, found.length) == pytest.approx(known["exact"], rel=1e-3)
    assert rayleigh_p_wilkie(found.n, found.length) == pytest.approx(known["wilkie"], rel=3e-4)
    turns = degrees / 360
    assert kuiper(turns).v_star == pytest.approx(known["kuiper"], abs=6e-6)
    assert watson(turns).u2 == pytest.approx(known["u2"], abs=6e-7)
    assert watson(turns).u2_star == pytest.approx(known["u2_star"], abs=6e-7)
    assert rao_spacing(turns) == pytest.approx(known["rao"], abs=6e-5)


def test_zar_prints_the_same_rayleigh_z():
    found = resultant(np.deg2rad([45, 55, 81, 96, 110, 117, 132, 154]))  # Zar, example 27.1
    assert round(found.n * found.length**2, 3) == 5.448


def test_kuiper_v_equals_astropys():
    stats = pytest.importorskip("astropy.stats")
    turns = np.random.default_rng(0).beta(2, 3, 50)
    v, p = stats.kuiper(turns)
    found = kuiper(turns)
    assert found.v == pytest.approx(v)
    assert found.p == pytest.approx(p, rel=0.15)  # both approximate; astropy's is for small n


def test_the_exact_rayleigh_probability_is_the_share_of_uniform_samples_as_concentrated():
    angles = np.random.default_rng(0).uniform(0, 2 * np.pi, (100_000, 6))
    lengths = np.abs(np.exp(1j * angles).mean(axis=1))
    for length in (0.3, 0.6, 0.8):
        assert rayleigh_p(6, length) == pytest.approx((lengths >= length).mean(), abs=0.005)


@pytest.mark.parametrize("n", [1, 2, 5, 8, 20, 76, 100, 101, 40_000])
def test_the_rayleigh_probability_never_leaves_0_to_1_and_falls_with_concentration(n):
    p = [rayleigh_p(n, length) for length in np.linspace(0, 1, 21)]
    assert all(0 <= value <= 1 for value in p)
    assert np.all(np.diff(p) <= 1e-8)
    assert rayleigh_p(n, 1.0) > 0 or n > 300


def test_exact_and_approximate_rayleigh_meet_where_one_takes_over():
    for length in (0.05, 0.15, 0.25):
        assert rayleigh_p(100, length) == pytest.approx(rayleigh_p_wilkie(100, length), rel=0.01)


def test_kuiper_and_watson_do_not_depend_on_the_origin():
    turns = np.random.default_rng(1).beta(2, 2, 40)
    moved = (turns + 0.37) % 1
    assert kuiper(moved).v == pytest.approx(kuiper(turns).v)
    assert watson(moved).u2 == pytest.approx(watson(turns).u2)
    assert rao_spacing(moved) == pytest.approx(rao_spacing(turns))


def test_uniform_turns_reject_at_the_nominal_rate():
    rng = np.random.default_rng(2)
    samples = rng.uniform(0, 1, (600, 50))
    assert np.mean([kuiper(s).p < 0.05 for s in samples]) == pytest.approx(0.05, abs=0.03)
    assert np.mean([watson(s).u2_star > 0.187 for s in samples]) == pytest.approx(0.05, abs=0.03)


def test_no_spikes_give_nan():
    assert np.isnan(resultant([]).length)
    assert np.isnan(rayleigh_p(0, np.nan))
    assert np.isnan(kuiper([]).p)
    assert np.isnan(watson([]).u2)
    assert np.isnan(rao_spacing([]))


def test_equalised_phase_of_steady_firing_is_uniform_when_phases_differ_in_length():
    exposure = np.repeat([0.1, 0.3], 20)
    phase = np.concatenate([np.linspace(0, 1, 1001)[:-1], np.repeat(np.linspace(1, 2, 1001)[:-1], 3)])
    turns = equalised_turns(phase, exposure)
    np.testing.assert_allclose(np.histogram(turns, 8, (0, 1))[0], 500, atol=4)
    assert resultant(2 * np.pi * turns).length < 0.002


def test_equalised_phase_turns_back_into_canonical_phase():
    exposure = np.random.default_rng(0).uniform(0.1, 1, 40)
    phase = np.array([0.0, 0.31, 0.999, 1.0, 1.7, 1.999])
    back = [canonical_phase(turn, exposure) for turn in equalised_turns(phase, exposure)]
    np.testing.assert_allclose(back, phase, atol=1e-9)
