import numpy as np
import pytest

from tests.simulators.definition import N, agrees
from unitclass.simulate.curves import NERVES, TYPES, hurried, level_at, points, turned, varied

PHASE = (np.arange(2 * N) + 0.5) / N


@pytest.mark.parametrize("name", sorted(set(TYPES) - {"silent"}))
def test_every_cell_of_a_type_is_what_its_name_promises(name):
    rng = np.random.default_rng(1)
    for _ in range(50):
        curve = turned(TYPES[name], rng.uniform(0, 2)) if name == "tonic" else varied(TYPES[name], rng)
        assert agrees(name, level_at(curve, PHASE))


def test_the_curve_of_an_augmenting_inspiratory_cell_rises_through_inspiration():
    level = level_at(TYPES["ramp-I"], np.linspace(0.05, 0.95, 30))
    assert np.all(np.diff(level) > 0)


def test_the_curve_of_a_post_inspiratory_cell_only_falls_after_its_peak():
    level = level_at(TYPES["post-I"], np.linspace(1.03, 1.99, 60))
    assert np.all(np.diff(level) <= 0)
    assert level_at(TYPES["post-I"], np.linspace(0, 0.99, 30)).max() == 0


@pytest.mark.parametrize("curve", [*NERVES.values(), *TYPES.values()])
def test_curves_run_once_round_the_cycle(curve):
    phases = [phase for phase, _ in curve]
    assert phases == sorted(phases)
    assert (phases[0], phases[-1]) == (0, 2)
    assert all(0 <= level <= 1 for _, level in curve)


def test_points_are_read_as_written():
    assert points("0:1 0.5:.25 2:1") == ((0.0, 1.0), (0.5, 0.25), (2.0, 1.0))


def test_hurried_firing_keeps_its_milliseconds_when_expiration_is_long():
    onset = TYPES["pre-I"][-3][0]
    assert hurried(TYPES["pre-I"], 0.5)[-3][0] == pytest.approx(2 - (2 - onset) / 2)


def test_no_phase_means_no_activity():
    assert level_at(TYPES["con-E"], np.array([np.nan])) == 0
