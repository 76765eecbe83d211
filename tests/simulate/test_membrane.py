import numpy as np
import pytest

from unitclass.simulate.breathing import Pattern, breathe, phase_at
from unitclass.simulate.membrane import CELLS, MV_PER_COUNT, Constants, impale, integrate

STOP_S, RATE_HZ = 50.0, 8000.0


@pytest.fixture(scope="module")
def breaths():
    return breathe(Pattern(0.75, 1.55, sigh_every=0, doublet_share=0), 0.5, STOP_S, np.random.default_rng(1))


@pytest.fixture(scope="module", params=sorted(CELLS))
def cell(request, breaths):
    return impale("c", request.param, breaths, STOP_S, np.random.default_rng(2), rate_hz=RATE_HZ)


def _median_mv(cell, breaths, low, high):
    phase, _ = phase_at(breaths, np.arange(cell.counts.size) / RATE_HZ)
    return float(np.median(cell.counts[(phase >= low) & (phase < high)])) * MV_PER_COUNT


def test_a_cell_under_constant_drive_fires_at_the_interval_of_the_closed_form():
    # Leaky integrator without adaptation: T = tau' ln((V_inf - V_reset) / (V_inf - V_threshold)), with
    # tau' = tau / (1 + g) (textbook result; from memory), plus the time that the spike's form takes.
    plain = Constants(adaptation=0.0, after=0.0)
    g = 0.6
    v_inf = (plain.leak_mv + g * plain.e_mv) / (1 + g)
    climb_ms = plain.tau_ms / (1 + g) * np.log((v_inf - plain.reset_mv) / (v_inf - plain.threshold_mv))
    rate_hz = 50000.0
    drive = np.full(int(2 * rate_hz), g)
    _, spikes = integrate(drive, np.zeros_like(drive), rate_hz, plain)
    assert 1000 * np.diff(spikes).mean() == pytest.approx(climb_ms + 2.0, rel=0.01)


def test_adaptation_slows_a_steady_train_down():
    drive = np.full(int(2 * RATE_HZ), 0.8)
    _, spikes = integrate(drive, np.zeros_like(drive), RATE_HZ, Constants())
    intervals = np.diff(spikes)
    assert intervals[-5:].mean() > 1.5 * intervals[0]


def test_spikes_stand_high_and_steep_above_threshold(cell):
    mv = cell.counts * MV_PER_COUNT
    at = np.round(cell.spikes_s * RATE_HZ).astype(int)
    at = at[(at > 10) & (at < mv.size - 20)]
    peaks = np.array([mv[i : i + 12].max() for i in at])
    slopes = np.array([np.diff(mv[i - 4 : i + 6]).max() for i in at]) * RATE_HZ / 1000
    assert np.all(peaks > 5)
    assert np.all(slopes > 40)
    between = np.ones(mv.size, bool)
    for i in at:
        between[i - 8 : i + 40] = False
    assert mv[between].max() < -40


def test_a_post_inspiratory_cell_is_hyperpolarised_in_inspiration_and_fires_after_it(breaths):
    cell = impale("c", "post-I", breaths, STOP_S, np.random.default_rng(3))
    phase, _ = phase_at(breaths, cell.spikes_s)
    assert np.mean((phase > 1) & (phase < 1.5)) > 0.95
    assert _median_mv(cell, breaths, 0.2, 0.9) < _median_mv(cell, breaths, 1.7, 1.95) - 3
    assert _median_mv(cell, breaths, 1.05, 1.2) > _median_mv(cell, breaths, 1.7, 1.95) + 5


def test_an_early_inspiratory_cell_is_held_down_in_two_steps_and_declines(breaths):
    cell = impale("c", "early-I", breaths, STOP_S, np.random.default_rng(4))
    phase, _ = phase_at(breaths, cell.spikes_s)
    counts = [np.sum((phase > low) & (phase < low + 0.2)) for low in (0, 0.2, 0.4)]
    assert counts[0] > counts[1] > counts[2] > 0
    assert _median_mv(cell, breaths, 1.05, 1.25) < _median_mv(cell, breaths, 1.6, 1.8) - 2
    assert _median_mv(cell, breaths, 1.6, 1.8) < _median_mv(cell, breaths, 0.1, 0.5) - 5


def test_the_potential_swings_by_five_to_twenty_millivolts(cell, breaths):
    levels = [_median_mv(cell, breaths, low, low + 0.1) for low in np.arange(0, 2, 0.1)]
    assert 5 < max(levels) - min(levels) < 20
