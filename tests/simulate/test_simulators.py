"""The independent simulators themselves: what they promise the accuracy tests."""

import warnings

import numpy as np
import pytest

from tests.simulators import integrate_fire, rates, resampled
from tests.simulators.common import (
    CLEAN,
    TYPES,
    Preparation,
    breathing,
    clock,
    gains,
    preparation,
    recorded,
    renewal,
    worn,
)
from tests.simulators.definition import agrees, clean_profile
from tests.simulators.oracle import dispersion, halves, oracle
from tests.simulators.sessions import whole
from unitclass.records import REGIMES


@pytest.fixture(autouse=True)
def without_nitime_is_fine():
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="nitime")
        yield


def _cycles(n=60, seed=1):
    return breathing(n, Preparation(0.8, 1.8, 0.06, 0.08), np.random.default_rng(seed))


@pytest.mark.parametrize("module", [rates, resampled])
@pytest.mark.parametrize("regime", REGIMES)
def test_every_type_of_the_regime_comes_and_is_the_same_for_the_same_seed(module, regime):
    one, two = (module.simulate(1, n_cycles=12, regime=regime, rng=np.random.default_rng(3)) for _ in range(2))
    assert one.types == [*TYPES[regime], "other"]
    assert all(np.array_equal(a, b) for a, b in zip(one.trains, two.trains, strict=True))
    assert all(np.all(np.diff(train) >= 0) for train in one.trains)


@pytest.mark.parametrize("module", [rates, resampled])
def test_clean_units_keep_what_their_names_promise(module):
    units = module.simulate(12, rng=np.random.default_rng(4), cycles=_cycles(100), hardness=0.0,
                            peak_hz=(60.0, 100.0), with_other=False)
    kept = [agrees(name, clean_profile(train, units.cycles))
            for name, train in zip(units.types, units.trains, strict=True)]
    assert np.mean(kept) > 0.95


def test_integrate_and_fire_cells_become_every_type_they_were_wired_for():
    units = integrate_fire.simulate(2, rng=np.random.default_rng(5), cycles=_cycles(20))
    assert set(units.types) == {*TYPES["three-phase"], "other"}
    assert all(train.size > 5 for train in units.trains)


def test_integrate_and_fire_cells_rest_when_nothing_drives_them():
    at = clock(_cycles(5), integrate_fire.DT_S)
    cells = integrate_fire.wired(["con-I", "con-E"], ["tonic", "square-I", "square-E"],
                                 np.random.default_rng(6))
    trains = integrate_fire.integrate(cells, np.zeros((3, at.time_s.size)), np.ones((2, 5)), at,
                                      np.random.default_rng(7))
    assert all(train.size < 5 for train in trains)


def test_peak_rates_span_what_is_asked():
    units = rates.simulate(40, rng=np.random.default_rng(8), cycles=_cycles(), types=["con-I"], hardness=0.0,
                           peak_hz=(3.0, 100.0))
    mean = np.array([train.size for train in units.trains]) / units.cycles.ti_s.sum()
    assert mean.min() < 8
    assert mean.max() > 50


def test_wear_reaches_the_limits_and_not_beyond():
    rng = np.random.default_rng(9)
    drawn = [worn(rng) for _ in range(3000)]
    for name, limit in (("gain_cv", 0.4), ("missed", 0.15), ("foreign", 0.12), ("background", 0.25)):
        values = np.array([getattr(w, name) for w in drawn])
        assert 0.97 * limit < values.max() <= limit
    assert 0.48 < np.abs([w.drift for w in drawn]).max() <= 0.5


def test_gains_have_the_coefficient_of_variation_asked_for():
    wear = worn(np.random.default_rng(10), hardness=0)
    gain = gains(20000, type(wear)(**{**wear.__dict__, "gain_cv": 0.4}), np.random.default_rng(11))
    assert gain.mean() == pytest.approx(1.0, abs=0.03)
    assert gain.std() == pytest.approx(0.4, rel=0.1)


@pytest.mark.parametrize("order", [1.0, 4.0])
def test_a_gamma_renewal_has_the_interval_statistics_of_its_order(order):
    # CV of a gamma renewal process of order k is k^-1/2 (Shinomoto et al. 2003).
    cycles = _cycles(200)
    at = clock(cycles)
    train = renewal(np.full(at.time_s.size, 20.0), at, order, np.random.default_rng(12))
    intervals = np.diff(train)
    assert intervals.mean() == pytest.approx(0.05, rel=0.05)
    assert intervals.std() / intervals.mean() == pytest.approx(order**-0.5, rel=0.06)


def test_recording_loses_and_adds_the_shares_asked_for():
    cycles = _cycles(200)
    rng = np.random.default_rng(13)
    train = np.sort(rng.uniform(1.5, 400, 8000))
    foreign = np.sort(rng.uniform(1.5, 400, 9000))
    wear = type(CLEAN)(**{**CLEAN.__dict__, "missed": 0.15, "foreign": 0.12, "refractory_s": 0.0})
    seen = recorded(train, foreign, cycles, wear, rng)
    own = np.isin(seen, train)
    assert own.sum() / train.size == pytest.approx(0.85, abs=0.02)
    assert np.mean(~own) == pytest.approx(0.12, abs=0.005)


def test_resampled_intervals_have_mean_one_and_the_rate_asked_for():
    assert resampled.unit_intervals().mean() == pytest.approx(1.0, rel=0.01)
    at = clock(_cycles(200))
    train = resampled.retimed(np.full(at.time_s.size, 15.0), at, np.random.default_rng(14))
    assert train.size / (at.time_s[-1] - at.time_s[0]) == pytest.approx(15.0, rel=0.03)


def test_drifting_units_change_between_the_halves_and_steady_ones_do_not():
    cycles = _cycles(80)
    rng = np.random.default_rng(15)
    at = clock(cycles)
    shape = rates._drifting(rng)
    moving = renewal(40 * shape(at), at, 4.0, rng)
    steady = renewal(np.full(at.time_s.size, 10.0), at, 4.0, rng)
    for train, low, high in ((moving, -1.0, 0.5), (steady, 0.85, 1.0)):
        first, second = halves(train, cycles).reshape(2, -1)
        assert low <= np.dot(first, second) / np.linalg.norm(first) / np.linalg.norm(second) <= high


def test_dispersion_is_one_for_a_poisson_train():
    cycles = _cycles(200)
    at = clock(cycles)
    train = renewal(np.full(at.time_s.size, 20.0), at, 1.0, np.random.default_rng(16))
    assert dispersion(train, cycles) == pytest.approx(1.0, abs=0.1)


def test_the_oracle_names_nearly_all_units_of_its_own_simulator():
    cycles = _cycles()
    known = oracle("rates", cycles, "three-phase", np.random.default_rng(17), n_draws=150)
    units = rates.simulate(8, rng=np.random.default_rng(18), cycles=cycles, peak_hz=(10.0, 100.0))
    p = known.posterior(units.trains, cycles)
    assert p.sum(axis=1) == pytest.approx(1.0)
    named = known.names(units.trains, cycles)
    assert np.mean([a == b for a, b in zip(named, units.types, strict=True)]) > 0.9


def test_a_preparation_has_the_numbers_of_its_regime():
    rng = np.random.default_rng(19)
    slices = [preparation("one-phase", rng) for _ in range(200)]
    assert all(5 <= 60 / (p.ti_s + p.te_s) <= 20 for p in slices)
    assert all(0.1 <= p.te_cv <= 0.4 for p in slices)
    assert all(0.03 <= preparation("three-phase", rng).te_cv <= 0.10 for _ in range(200))


def test_a_whole_recording_has_its_nerves_and_units_on_one_clock():
    recording, units = whole("rates", "three-phase", 1, n_cycles=12, rng=np.random.default_rng(20), types=["post-I"])
    assert [nerve.role for nerve in recording.nerves] == ["phrenic", "vagus"]
    assert recording.reference == "PNA"
    chunk = next(iter(recording.nerves[0].reader.chunks()))
    assert np.isfinite(chunk.values).all()
    assert units.cycles.end_s[-1] < recording.stop_s
    assert np.array_equal(recording.units[0].train.read(), units.trains[0])
