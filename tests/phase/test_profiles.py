from dataclasses import fields

import numpy as np
import pytest

import unitclass.phase.profiles as profiles
from tests.builders import phasic_spikes, steady_spikes, varied_cycles
from unitclass.phase.features import features
from unitclass.phase.histogram import phase_histogram, raster
from unitclass.phase.locked import locked_histogram
from unitclass.phase.modulation import modulation
from unitclass.settings import Settings


@pytest.fixture(scope="module")
def session():
    rng = np.random.default_rng(0)
    cycles = varied_cycles(60, rng)
    trains = [(phasic_spikes(cycles, lambda p: np.where(p < 1, 30.0, 1.0), rng), None),
              (steady_spikes(cycles, 10, rng), np.array([[0.0, 70.0], [90.0, 500.0]])),
              (np.array([]), None), (steady_spikes(cycles, 5, rng)[::-1], np.array([[-5.0, 1000.0]]))]
    return cycles, trains


def assert_same(first, second):
    for f in fields(first):
        np.testing.assert_array_equal(getattr(first, f.name), getattr(second, f.name), err_msg=f.name)


def test_many_units_at_once_get_what_each_gets_alone(session):
    cycles, trains = session
    settings = Settings()
    for (times, observed), found in zip(trains, profiles.unit_profiles(trains, cycles, settings=settings, seed=3),
                                        strict=True):
        histogram = phase_histogram(times, cycles, observed_s=observed, rng=np.random.default_rng(3))
        assert_same(found.histogram, histogram)
        assert_same(found.modulation, modulation(times, cycles, observed_s=observed, histogram=histogram,
                                                 settings=settings.modulation, seed=3))
        assert_same(found.features, features(times, cycles, observed_s=observed, histogram=histogram,
                                             settings=settings))
        for lock, locked in zip(("onset", "offset"), found.locked, strict=True):
            assert_same(locked, locked_histogram(times, cycles, lock, 1000, 20, observed_s=observed))
        assert found.by_phase.sum() == histogram.n_spikes
        np.testing.assert_allclose(found.exposure.seconds.sum(axis=0), histogram.exposure_s)
    assert_same(found.raster, raster(times, cycles))


def test_batches_change_nothing(session, monkeypatch):
    cycles, trains = session
    whole = list(profiles.unit_profiles(trains, cycles, settings=Settings(), seed=3))
    monkeypatch.setattr(profiles, "UNIT_CYCLES_AT_ONCE", 1)
    single = list(profiles.unit_profiles(iter(trains[::-1]), cycles, settings=Settings(), seed=3))[::-1]
    for a, b in zip(whole, single, strict=True):
        assert_same(a.modulation, b.modulation)
        assert_same(a.features, b.features)


def test_trains_are_drawn_as_needed(session, monkeypatch):
    cycles, trains = session
    monkeypatch.setattr(profiles, "UNIT_CYCLES_AT_ONCE", 5 * cycles.n_cycles)
    drawn = []
    many = (drawn.append(k) or trains[0] for k in range(100))
    next(profiles.unit_profiles(many, cycles, settings=Settings(), seed=0))
    assert len(drawn) == 5


def test_no_units_give_no_profiles(session):
    assert list(profiles.unit_profiles([], session[0], settings=Settings(), seed=0)) == []
